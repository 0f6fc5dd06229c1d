/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_TOUR_SEARCH_H
#define AW_PLAN_TOUR_SEARCH_H

#include "plan/tour_array.h"
#include "plan/tour_problem.h"

/* The stages of the tour engine (internal to it). Orders are permutations of the problem's nodes, n of them. */

/* Nearest neighbour: from the fixed beginning, or stop 0, always to the cheapest stop not yet visited. */
guint32 *aw_tour_start_nearest(const AwTourProblem *problem, AwProgress *progress, GError **error);

/* Greedy edges: the cheapest edges first that leave a path through every node, joined at the end. */
guint32 *aw_tour_start_greedy(const AwTourProblem *problem, AwProgress *progress, GError **error);

/* 2-opt: turns stretches of the tour round while that saves cost. */
gboolean aw_tour_two_opt(const AwTourProblem *problem, AwTourArray *tour, AwProgress *progress, GError **error);

/* Or-opt: moves runs of one to three nodes elsewhere, together with 2-opt, while that saves cost. */
gboolean aw_tour_or_opt(const AwTourProblem *problem, AwTourArray *tour, AwProgress *progress, GError **error);

/* When the chained search ends. */
typedef struct {
  guint64 seed;
  gint64 n_steps;  /* at most so many steps */
  gint64 until_us; /* > 0: until this monotonic time instead */
  double speed;    /* um/s: stop when a step's gain is worth less than its nominal time; 0 never */
  gint64 n_used;   /* out: steps made */
} AwTourChainLimits;

/* How many steps serve n stops by default. */
gint64 aw_tour_default_steps(gsize n);

/* The deep search, then steps of the chained search (tour_chain.c). */
gboolean aw_tour_chain(const AwTourProblem *problem, AwTourArray *tour, AwTourChainLimits *limits, AwProgress *progress,
                       GError **error);

#define AW_TOUR_MAX_EXACT 10

/**
 * The best order of at most AW_TOUR_MAX_EXACT stops, by dynamic programming over subsets. `order` has room for
 * n stops.
 */
void aw_tour_exact(const AwStop *stops, guint n, const AwTourSettings *settings, guint32 *order);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_TOUR_PROBLEM_H
#define AW_PLAN_TOUR_PROBLEM_H

#include <math.h>

#include "plan/tour.h"
#include "plan/tour_tree.h"

#define AW_TOUR_NONE G_MAXUINT32
#define AW_TOUR_MAX_NEAR 10 /* neighbours kept per node */
#define AW_TOUR_SURE_NEAR 5 /* of these, so many are the very nearest */

/**
 * AwTourProblem: every kind of tour as one closed tour of nodes (internal to the tour engine).
 *
 * Nodes 0 ... n_points-1 are the places of the stops and those outside the list, in the slot order of `tree`. An open
 * tour has one more node, the dummy, which costs nothing to reach: the tour begins after it and ends before it. A fixed
 * end is an edge to the dummy that can never be taken away (it costs minus infinity in aw_tour_problem_cost).
 */
typedef struct {
  guint32 n, n_points, n_stops;
  AwTourTree *tree;
  AwStop *at;            /* n coordinates by node; the dummy's mean nothing */
  const AwStop **origin; /* the caller's point of each node; NULL for the dummy */
  guint32 *stop;         /* index among the caller's stops; AW_TOUR_NONE for places and the dummy */
  guint32 *same;         /* n_stops: the next stop at the same place; AW_TOUR_NONE at the end */
  double inside;         /* cost of going on to the stops at the same place */
  guint32 dummy;         /* AW_TOUR_NONE in a closed tour */
  guint32 head, tail;    /* nodes tied to the dummy: fixed first and last; AW_TOUR_NONE */
  AwTourCost cost;
  gpointer cost_data;
  gboolean asymmetric;
  double unit, per_unit; /* rounding of distances and its inverse; 0 for none */
  double least_gain;     /* a smaller gain is rounding noise */
  guint n_near;          /* neighbours per node, at most AW_TOUR_MAX_NEAR */
  guint32 *near;         /* n x n_near neighbours by rising cost */
  double *near_cost;     /* their costs */
} AwTourProblem;

/* Settings were checked by the caller. NULL with AW_ERROR_MEMORY. */
AwTourProblem *aw_tour_problem_new(const AwStop *stops, guint32 n_stops, const AwTourSettings *settings,
                                   GError **error);
void aw_tour_problem_free(AwTourProblem *problem);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTourProblem, aw_tour_problem_free)

/* Fills near and near_cost (tour_near.c). */
gboolean aw_tour_problem_find_near(AwTourProblem *problem, GError **error);

/* Straight distance, rounded to a multiple of unit when unit > 0. */
static inline double aw_tour_distance(const AwStop *a, const AwStop *b, double unit, double per_unit)
{
  double dx = a->x - b->x, dy = a->y - b->y, d = sqrt(dx * dx + dy * dy);
  return unit > 0 ? unit * (double)(gint64)(d * per_unit + 0.5) : d;
}

double aw_tour_problem_called_cost(const AwTourProblem *problem, guint32 a, guint32 b);

/**
 * The cost of the edge between nodes a and b, the same in both directions: distance, or the mean of the cost function
 * there and back.
 */
static inline double aw_tour_problem_cost(const AwTourProblem *problem, guint32 a, guint32 b)
{
  if (G_UNLIKELY(a == problem->dummy || b == problem->dummy)) {
    guint32 other = a == problem->dummy ? b : a;
    return other == problem->head || other == problem->tail ? -INFINITY : 0.0;
  }
  if (problem->cost)
    return aw_tour_problem_called_cost(problem, a, b);
  return aw_tour_distance(&problem->at[a], &problem->at[b], problem->unit, problem->per_unit);
}

/* Half of what a to b costs more than b to a; 0 for symmetric costs. */
double aw_tour_problem_skew(const AwTourProblem *problem, guint32 a, guint32 b);

/**
 * The true cost of going through all n nodes in `order` (a closed tour of nodes), in the cheaper of the two
 * directions that the ends allow; *backwards tells which.
 */
double aw_tour_problem_total(const AwTourProblem *problem, const guint32 *order, gboolean *backwards);

/* Writes the stops in visiting order, n_stops of them, beginning at a place that depends on the tour alone. */
void aw_tour_problem_read(const AwTourProblem *problem, const guint32 *order, guint32 *stops);

#endif

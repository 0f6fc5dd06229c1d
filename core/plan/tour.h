/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_TOUR_H
#define AW_PLAN_TOUR_H

#include <glib.h>

#include "base/progress.h"

/* A stop of a tour; which coordinate frame it is in is the caller's business, hence plain x and y. */
typedef struct {
  double x, y; /* um */
} AwStop;

/**
 * The cost of moving from stop `from` to stop `to`: pointers into the caller's stops, or its places outside the list.
 * May differ by direction (backlash). Finite and never negative. NULL asks for the straight distance, for which the
 * search uses its fastest form.
 */
typedef double (*AwTourCost)(const AwStop *from, const AwStop *to, gpointer data);

typedef struct {
  gboolean closed;         /* return to the first stop */
  gint64 first, last;      /* index of a fixed first or last stop of an open tour; -1 leaves it free */
  const AwStop *from, *to; /* a place outside the list where the stage starts or must end; NULL for none */
  AwTourCost cost;         /* NULL: distance */
  gboolean asymmetric;     /* cost(a, b) may differ from cost(b, a) */
  gpointer cost_data;
  double speed_um_per_s; /* what a saved um is worth to the anytime rule (1 when cost is in s); 0: steps alone */
  gint64 n_steps;        /* improvement steps after the local search; -1 is the default number, 0 none */
  double budget_s;       /* > 0: search for that long instead of n_steps (not repeatable) */
  guint64 seed;
  double unit; /* > 0: each distance is rounded to the nearest multiple (TSPLIB: 1); 0 no rounding */
} AwTourSettings;

typedef struct {
  guint32 *order; /* n stop indices in visiting order, owned */
  gsize n;
  double unsorted; /* length (or cost) in the order given */
  double nearest;  /* after nearest neighbour */
  double two_opt;  /* after 2-opt */
  double final;
  gint64 n_steps_used;
} AwTour;

void aw_tour_free(AwTour *tour);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTour, aw_tour_free)

/**
 * aw_tour_find: orders n stops (1 ... AW_MAX_NUCLEI) so that the whole cost is small; up to 10 stops are solved
 * outright. Repeats exactly for a seed unless budget_s > 0. Method and sources: docs/methods-tour.md.
 *
 * progress: may be NULL. Free the result with aw_tour_free.
 * AW_ERROR_EMPTY without stops; AW_ERROR_RANGE for a coordinate beyond AW_MAX_COORDINATE_UM or not a number, an index
 * out of the list, too many stops, a cost that is no number >= 0; AW_ERROR_STATE for a closed tour with fixed ends or
 * places, both a fixed stop and a place for one end, or one stop for both ends; AW_ERROR_MEMORY, AW_ERROR_CANCELLED.
 */
AwTour *aw_tour_find(const AwStop *stops, gsize n, const AwTourSettings *settings, AwProgress *progress,
                     GError **error);

/* The cost of visiting the stops in `order` under the same settings. */
double aw_tour_cost(const AwStop *stops, gsize n, const guint32 *order, const AwTourSettings *settings);

#endif

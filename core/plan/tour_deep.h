/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_TOUR_DEEP_H
#define AW_PLAN_TOUR_DEEP_H

#include "plan/tour_array.h"
#include "plan/tour_queue.h"

/**
 * AwTourDeep: the deep local search, sequential exchanges of up to AW_TOUR_MAX_DEPTH edges (internal to the tour
 * engine).
 */
#define AW_TOUR_MAX_DEPTH 4

typedef struct {
  const AwTourProblem *p;
  AwTourArray *tour;
  AwTourQueue queue;
  gboolean forward; /* the first edge given up leads onwards along the tour */
  AwTourExchange x; /* the exchange under construction */
} AwTourDeep;

/* Improves the tour from at most max_nodes waiting nodes, in turn. Returns what was saved. */
double aw_tour_deep_run(AwTourDeep *s, guint64 max_nodes);

/* Improves the tour from node v once; returns what was saved, 0 when nothing. */
double aw_tour_deep_improve(AwTourDeep *s, guint32 v);

#endif

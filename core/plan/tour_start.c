/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/limits.h"
#include "plan/tour_search.h"

/* The nearest-neighbour tour (Bentley, ORSA J. Computing 4:387, 1992): what a careful person would drive by hand, and
 * the measure for everything after it. */

/* The cheapest of the surely nearest neighbours of v that is still there, else the nearest point that is. */
static guint32 step_from(const AwTourProblem *p, AwTourTree *tree, guint32 v)
{
  const guint32 *near = p->near + (gsize)v * p->n_near;
  for (guint i = 0; i < MIN(p->n_near, AW_TOUR_SURE_NEAR); i++)
    if (!tree->gone[near[i]])
      return near[i];
  guint32 found = AW_TOUR_NONE;
  aw_tour_tree_nearest(tree, v, v, 1, &found);
  return found;
}

/* The fixed beginning, else the first stop of the list that is not the fixed end. */
static guint32 first_node(const AwTourProblem *p)
{
  if (p->head != AW_TOUR_NONE || p->n_points == 1)
    return p->head != AW_TOUR_NONE ? p->head : 0;
  guint32 wanted = p->tail != AW_TOUR_NONE && p->stop[p->tail] == 0, v = 0;
  while (p->stop[v] != wanted)
    v++;
  return v;
}

guint32 *aw_tour_start_nearest(const AwTourProblem *p, AwProgress *progress, GError **error)
{
  g_autofree guint32 *order = aw_try_alloc(p->n, sizeof *order, "a tour", error);
  if (!order)
    return NULL;
  guint32 n = 0, n_walk = p->n_points;
  if (p->dummy != AW_TOUR_NONE)
    order[n++] = p->dummy;
  if (p->tail != AW_TOUR_NONE && p->n_points > 1) {
    aw_tour_tree_remove(p->tree, p->tail);
    n_walk--;
  }
  guint32 v = first_node(p);
  for (guint32 i = 0; i < n_walk; i++) {
    if (i % 65536 == 65535 && aw_progress_stopped(progress, error))
      return NULL;
    order[n++] = v;
    aw_tour_tree_remove(p->tree, v);
    if (i + 1 < n_walk)
      v = step_from(p, p->tree, v);
  }
  if (n < p->n)
    order[n++] = p->tail;
  return g_steal_pointer(&order);
}

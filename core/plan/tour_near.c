/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/limits.h"
#include "plan/tour_problem.h"

/* Neighbour lists (Johnson & McGeoch 1997): a good tour uses short edges, so that the searches try no others. Nearest
 * points alone fail on lattices and at the rims of clusters, where all of them lie on one side; the two nearest of
 * each quadrant come first after the very nearest. */

#define LOOKED_AT 20 /* nearest points from which the list is chosen */
#define SURE 5       /* so many nearest are always taken */

typedef struct {
  guint32 node;
  double cost;
  gboolean taken;
} Candidate;

static guint quadrant(const AwStop *a, const AwStop *b)
{
  double dx = b->x - a->x, dy = b->y - a->y;
  return dx > 0 && dy >= 0 ? 0 : dx <= 0 && dy > 0 ? 1 : dx < 0 ? 2 : 3;
}

/* Candidates come in by rising cost; marks those to keep. */
static void take_some(const AwTourProblem *p, guint32 v, Candidate *some, guint n_some)
{
  guint n_taken = 0, n_in[4] = { 0 };
  for (guint i = 0; i < n_some && i < SURE && n_taken < p->n_near; i++) {
    some[i].taken = TRUE;
    n_in[quadrant(&p->at[v], &p->at[some[i].node])]++;
    n_taken++;
  }
  for (guint i = 0; i < n_some && n_taken < p->n_near; i++) {
    guint q = quadrant(&p->at[v], &p->at[some[i].node]);
    if (some[i].taken || n_in[q] >= 2)
      continue;
    some[i].taken = TRUE;
    n_in[q]++;
    n_taken++;
  }
  for (guint i = 0; i < n_some && n_taken < p->n_near; i++)
    if (!some[i].taken) {
      some[i].taken = TRUE;
      n_taken++;
    }
}

static void list_node(AwTourProblem *p, guint32 v)
{
  guint32 slots[AW_TOUR_TREE_MAX_K];
  Candidate some[AW_TOUR_TREE_MAX_K];
  guint n_some = aw_tour_tree_nearest(p->tree, v, v, LOOKED_AT, slots);
  for (guint i = 0; i < n_some; i++) {
    Candidate c = { slots[i], aw_tour_problem_cost(p, v, slots[i]), FALSE };
    guint j = i;
    for (; j > 0 && some[j - 1].cost > c.cost; j--)
      some[j] = some[j - 1];
    some[j] = c;
  }
  take_some(p, v, some, n_some);
  gsize k = (gsize)v * p->n_near;
  for (guint i = 0; i < n_some; i++)
    if (some[i].taken) {
      p->near[k] = some[i].node;
      p->near_cost[k++] = some[i].cost;
    }
}

/* Every node is as near to the dummy as any other; its list is a sample spread over the plane. */
static void list_dummy(AwTourProblem *p)
{
  for (guint i = 0; i < p->n_near; i++) {
    gsize k = (gsize)p->dummy * p->n_near + i;
    p->near[k] = (guint32)((guint64)p->n_points * i / p->n_near);
    p->near_cost[k] = aw_tour_problem_cost(p, p->dummy, p->near[k]);
  }
}

gboolean aw_tour_problem_find_near(AwTourProblem *p, GError **error)
{
  p->n_near = MIN(AW_TOUR_MAX_NEAR, p->n_points - 1);
  gsize n = (gsize)p->n * p->n_near;
  if (!(p->near = aw_try_alloc(n, sizeof *p->near, "the neighbour lists of a tour", error)) ||
      !(p->near_cost = aw_try_alloc(n, sizeof *p->near_cost, "the neighbour lists of a tour", error)))
    return FALSE;
  for (guint32 v = 0; v < p->n_points; v++)
    list_node(p, v);
  if (p->dummy != AW_TOUR_NONE)
    list_dummy(p);
  return TRUE;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/limits.h"
#include "plan/tour_problem.h"

/* Neighbour lists (Johnson & McGeoch 1997): a good tour uses short edges, so that the searches try no others. Nearest
 * points alone fail on lattices and at the rims of clusters, where all of them lie on one side; the two nearest of
 * each quadrant come first after the very nearest. */

#define LOOKED_AT 12      /* nearest points from which the list is chosen */
#define LOOKED_AT_COST 24 /* the same where another cost than distance ranks them */
#define IN_QUADRANT 2
#define MAX_POOL (LOOKED_AT_COST + 4 * IN_QUADRANT)

typedef struct {
  guint32 node;
  double cost;
  guint quadrant;
  gboolean taken;
} Candidate;

typedef struct {
  Candidate items[MAX_POOL]; /* by rising cost */
  guint n, n_in[4];
} Pool;

static void put(const AwTourProblem *p, guint32 v, guint32 w, Pool *pool)
{
  for (guint i = 0; i < pool->n; i++)
    if (pool->items[i].node == w)
      return;
  Candidate c = { w, aw_tour_problem_cost(p, v, w), 0, FALSE };
  const AwStop *a = &p->tree->at[v], *b = &p->tree->at[w];
  c.quadrant = aw_tour_tree_quadrant(b->x - a->x, b->y - a->y);
  pool->n_in[c.quadrant]++;
  guint j = pool->n++;
  for (; j > 0 && pool->items[j - 1].cost > c.cost; j--)
    pool->items[j] = pool->items[j - 1];
  pool->items[j] = c;
}

static void gather(const AwTourProblem *p, guint32 v, Pool *pool)
{
  guint32 slots[LOOKED_AT_COST];
  guint wanted = p->cost ? LOOKED_AT_COST : LOOKED_AT;
  guint n = aw_tour_tree_nearest(p->tree, v, v, wanted, slots);
  for (guint i = 0; i < n; i++)
    put(p, v, slots[i], pool);
  for (guint q = 0; q < 4 && n == wanted; q++) {
    if (pool->n_in[q] >= IN_QUADRANT)
      continue;
    guint n_more = aw_tour_tree_nearest_in(p->tree, v, q, IN_QUADRANT, slots);
    for (guint i = 0; i < n_more; i++)
      put(p, v, slots[i], pool);
  }
}

/* Marks the nearest, then the nearest of each quadrant, then whatever is left, until the list is full. */
static void take_some(const AwTourProblem *p, Pool *pool)
{
  guint n_taken = 0, n_in[4] = { 0 };
  for (guint turn = 0; turn < 3; turn++)
    for (guint i = 0; i < pool->n && n_taken < p->n_near; i++) {
      Candidate *c = &pool->items[i];
      if (c->taken || (turn == 0 && i >= AW_TOUR_SURE_NEAR) || (turn == 1 && n_in[c->quadrant] >= IN_QUADRANT))
        continue;
      c->taken = TRUE;
      n_in[c->quadrant]++;
      n_taken++;
    }
}

static void list_node(AwTourProblem *p, guint32 v)
{
  Pool pool = { .n = 0 };
  gather(p, v, &pool);
  take_some(p, &pool);
  gsize k = (gsize)v * p->n_near;
  for (guint i = 0; i < pool.n; i++)
    if (pool.items[i].taken) {
      p->near[k] = pool.items[i].node;
      p->near_cost[k++] = pool.items[i].cost;
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

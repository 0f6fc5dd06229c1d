/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/tour_queue.h"
#include "plan/tour_search.h"

/* 2-opt with neighbour lists and don't-look bits (Bentley 1992; Johnson & McGeoch 1997) and Or-opt (Or 1976): runs of
 * one to three nodes are moved to a better place, either way round. A node is looked at again only when one of its
 * edges changed. */

#define MAX_RUN 3

typedef struct {
  const AwTourProblem *p;
  AwTourArray *tour;
  AwTourQueue queue;
} Local;

static inline guint32 neighbour(const Local *s, guint32 v, gboolean forward)
{
  return forward ? aw_tour_array_next(s->tour, v) : aw_tour_array_before(s->tour, v);
}

static gboolean exchange(Local *s, AwTourExchange *x)
{
  aw_tour_exchange_chain(x);
  if (!aw_tour_array_exchange(s->tour, x))
    return FALSE;
  for (guint i = 0; i < 2 * x->k; i++)
    aw_tour_queue_push(&s->queue, x->t[i]);
  return TRUE;
}

/* Replaces the edges a-b and c-d, where b and d follow in the same direction, by a-c and b-d. */
static gboolean turn_stretch(Local *s, guint32 a)
{
  const AwTourProblem *p = s->p;
  const gsize at = (gsize)a * p->n_near;
  for (guint way = 0; way < 2; way++) {
    guint32 b = neighbour(s, a, !way);
    double ab = aw_tour_problem_cost(p, a, b);
    for (guint i = 0; i < p->n_near && p->near_cost[at + i] < ab; i++) {
      guint32 c = p->near[at + i], d = neighbour(s, c, !way);
      double gain = ab - p->near_cost[at + i] + aw_tour_problem_cost(p, c, d) - aw_tour_problem_cost(p, b, d);
      if (gain > p->least_gain && exchange(s, &(AwTourExchange){ .k = 2, .t = { d, c, a, b } }))
        return TRUE;
    }
  }
  return FALSE;
}

/* Puts the run from a to z, between before and after, next to c, a neighbour of a, on either side of c. */
static gboolean put_run(Local *s, guint32 a, guint32 z, guint32 before, guint32 after, guint32 c, double saved)
{
  const AwTourProblem *p = s->p;
  for (guint way = 0; way < 2; way++) {
    guint32 d = neighbour(s, c, way);
    if (d == a || d == z)
      continue;
    double gain = saved + aw_tour_problem_cost(p, c, d) - aw_tour_problem_cost(p, z, d);
    if (gain > p->least_gain && exchange(s, &(AwTourExchange){ .k = 3, .t = { after, z, d, c, a, before } }))
      return TRUE;
  }
  return FALSE;
}

/* Tries every run that begins at a and goes up to MAX_RUN nodes in one direction. */
static gboolean move_run(Local *s, guint32 a)
{
  const AwTourProblem *p = s->p;
  const gsize at = (gsize)a * p->n_near;
  for (guint way = 0; way < 2; way++) {
    guint32 before = neighbour(s, a, !way), run[MAX_RUN], after = a;
    double before_a = aw_tour_problem_cost(p, before, a);
    for (guint n = 1; n <= MAX_RUN; n++) {
      run[n - 1] = after;
      after = neighbour(s, after, way);
      if (after == before || neighbour(s, after, way) == before)
        break;
      double out = before_a + aw_tour_problem_cost(p, run[n - 1], after) - aw_tour_problem_cost(p, before, after);
      for (guint i = 0; i < p->n_near && p->near_cost[at + i] < out; i++) {
        guint32 c = p->near[at + i];
        gboolean inside = c == run[0] || (n > 1 && c == run[1]) || (n > 2 && c == run[2]);
        if (!inside && put_run(s, a, run[n - 1], before, after, c, out - p->near_cost[at + i]))
          return TRUE;
      }
    }
  }
  return FALSE;
}

static gboolean run_queue(Local *s, gboolean runs, AwProgress *progress, GError **error)
{
  for (guint32 i = 0; i < s->p->n; i++)
    aw_tour_queue_push(&s->queue, s->tour->order[i]);
  for (guint64 n = 1; s->queue.n; n++) {
    if (n % 16384 == 0 && aw_progress_stopped(progress, error))
      return FALSE;
    guint32 v = aw_tour_queue_pop(&s->queue);
    while (turn_stretch(s, v) || (runs && move_run(s, v)))
      ;
  }
  return TRUE;
}

static gboolean run_local(const AwTourProblem *p, AwTourArray *tour, gboolean runs, AwProgress *progress,
                          GError **error)
{
  Local s = { .p = p, .tour = tour };
  if (p->n < 5)
    return TRUE;
  gboolean done = aw_tour_queue_init(&s.queue, p->n, error) && run_queue(&s, runs, progress, error);
  aw_tour_queue_clear(&s.queue);
  return done;
}

gboolean aw_tour_two_opt(const AwTourProblem *p, AwTourArray *tour, AwProgress *progress, GError **error)
{
  return run_local(p, tour, FALSE, progress, error);
}

gboolean aw_tour_or_opt(const AwTourProblem *p, AwTourArray *tour, AwProgress *progress, GError **error)
{
  return run_local(p, tour, TRUE, progress, error);
}

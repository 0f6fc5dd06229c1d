/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/tour_deep.h"

/* Sequential edge exchange of variable depth (Lin & Kernighan, Operations Research 21:498, 1973). An edge t0-t1 is
 * given up, t1 is joined to a near t2, one of the two edges of t2, t2-t3, is given up, and so on; the sum of what was
 * saved must stay positive. Whenever joining the loose end to t0 saves something, the exchange is made if it leaves
 * one tour. Nothing is written before that: whether the pieces join into one tour is seen from the order of the cuts
 * alone (Helsgaun, Math. Programming Computation 1:119, 2009), so that the many failing attempts cost no more than
 * their distances. */

static const guint breadth[AW_TOUR_MAX_DEPTH] = { 0, 10, 5, 3 };

static gboolean is_cut(const AwTourExchange *x, guint k, guint32 a, guint32 b)
{
  for (guint i = 0; i < k; i++)
    if ((x->t[2 * i] == a && x->t[2 * i + 1] == b) || (x->t[2 * i] == b && x->t[2 * i + 1] == a))
      return TRUE;
  return FALSE;
}

static gboolean make(AwTourDeep *s, guint k)
{
  s->x.k = k;
  aw_tour_exchange_chain(&s->x);
  return aw_tour_array_exchange(s->tour, &s->x);
}

/* k edges are given up, `saved` is their cost less that of the k - 1 new ones; the loose end is t[2k - 1]. */
static double extend(AwTourDeep *s, guint k, double saved)
{
  const AwTourProblem *p = s->p;
  guint32 *t = s->x.t, loose = t[2 * k - 1];
  const gsize at = (gsize)loose * p->n_near;
  guint width = MIN(breadth[k], p->n_near);
  guint32 next = aw_tour_array_next(s->tour, loose), before = aw_tour_array_before(s->tour, loose);
  for (guint i = 0; i < width; i++) {
    double left = saved - p->near_cost[at + i];
    if (left <= p->least_gain)
      break;
    guint32 a = p->near[at + i];
    if (a == next || a == before)
      continue;
    for (guint way = 0; way < 2; way++) {
      guint32 b = way ? aw_tour_array_next(s->tour, a) : aw_tour_array_before(s->tour, a);
      if (is_cut(&s->x, k, a, b))
        continue;
      double open = left + aw_tour_problem_cost(p, a, b), gain = open - aw_tour_problem_cost(p, b, t[0]);
      t[2 * k] = a;
      t[2 * k + 1] = b;
      gboolean can_close = k > 1 || (way == 1) == s->forward; /* two cuts close in one way only */
      if (gain > p->least_gain && can_close && make(s, k + 1))
        return gain;
      if (k + 1 < AW_TOUR_MAX_DEPTH) {
        gain = extend(s, k + 1, open);
        if (gain > 0)
          return gain;
      }
    }
  }
  return 0;
}

double aw_tour_deep_improve(AwTourDeep *s, guint32 v)
{
  for (guint way = 0; way < 2; way++) {
    guint32 w = way ? aw_tour_array_next(s->tour, v) : aw_tour_array_before(s->tour, v);
    s->x.t[0] = v;
    s->x.t[1] = w;
    s->forward = way;
    double gain = extend(s, 1, aw_tour_problem_cost(s->p, v, w));
    if (gain > 0) {
      for (guint i = 0; i < 2 * s->x.k; i++)
        aw_tour_queue_push(&s->queue, s->x.t[i]);
      return gain;
    }
  }
  return 0;
}

double aw_tour_deep_run(AwTourDeep *s, guint64 max_nodes)
{
  double saved = 0, gain;
  for (; s->queue.n && max_nodes; max_nodes--) {
    guint32 v = aw_tour_queue_pop(&s->queue);
    while ((gain = aw_tour_deep_improve(s, v)) > 0)
      saved += gain;
  }
  return saved;
}

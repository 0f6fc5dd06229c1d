/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/random.h"
#include "plan/tour_deep.h"
#include "plan/tour_search.h"

/* Chained local search (Martin, Otto & Felten, Complex Systems 5:299, 1991; for large tours Applegate, Cook & Rohe,
 * INFORMS J. Computing 15:82, 2003): a kick exchanges four edges that lie close together in the one way that no short
 * sequence undoes, the deep search repairs the tour around it, and the result is kept unless it is longer. */

#define SPAN 50

typedef struct {
  AwTourDeep deep;
  AwRandom random;
} Chain;

/* Cuts four edges within SPAN positions and joins the pieces A B C D as A D C B. Returns what it saved. */
static double kick(Chain *c)
{
  const AwTourProblem *p = c->deep.p;
  AwTourArray *tour = c->deep.tour;
  AwTourExchange x = { .k = 4, .link = { 5, 6, 3, 2, 7, 0, 1, 4 } };
  guint32 span = MIN(SPAN, (p->n - 2) / 3);
  guint32 at = aw_random_below(&c->random, p->n);
  double saved = 0;
  for (guint i = 0; i < 4; i++) {
    guint32 a = tour->order[at], b = aw_tour_array_next(tour, a);
    x.t[2 * i] = a;
    x.t[2 * i + 1] = b;
    saved += aw_tour_problem_cost(p, a, b);
    at = (guint32)(((guint64)at + 1 + aw_random_below(&c->random, span)) % p->n);
  }
  if (isinf(saved))
    return -INFINITY;
  for (guint i = 0; i < 8; i++)
    if (i < x.link[i])
      saved -= aw_tour_problem_cost(p, x.t[i], x.t[x.link[i]]);
  if (!aw_tour_array_exchange(tour, &x))
    return -INFINITY;
  for (guint i = 0; i < 8; i++)
    aw_tour_queue_push(&c->deep.queue, x.t[i]);
  return saved;
}

static void step(Chain *c)
{
  AwTourArray *tour = c->deep.tour;
  g_array_set_size(tour->journal, 0);
  double saved = kick(c);
  if (isinf(saved))
    return;
  saved += aw_tour_deep_run(&c->deep);
  if (saved < 0)
    aw_tour_array_undo(tour);
}

gboolean aw_tour_chain(const AwTourProblem *p, AwTourArray *tour, AwTourChainLimits *limits, AwProgress *progress,
                       GError **error)
{
  Chain c = { .deep = { .p = p, .tour = tour }, .random = aw_random_stream(limits->seed, p->n) };
  if (!aw_tour_queue_init(&c.deep.queue, p->n, error)) {
    aw_tour_queue_clear(&c.deep.queue);
    return FALSE;
  }
  for (guint32 i = 0; i < p->n; i++)
    aw_tour_queue_push(&c.deep.queue, tour->order[i]);
  aw_tour_deep_run(&c.deep);
  tour->journal = g_array_new(FALSE, FALSE, sizeof(guint32));
  gboolean stopped = FALSE;
  while (!stopped &&
         (limits->until_us ? g_get_monotonic_time() < limits->until_us : limits->n_used < limits->n_steps)) {
    for (guint i = 0; i < 64 && (limits->until_us || limits->n_used < limits->n_steps); i++) {
      step(&c);
      limits->n_used++;
    }
    stopped = aw_progress_stopped(progress, error);
  }
  aw_tour_queue_clear(&c.deep.queue);
  return !stopped;
}

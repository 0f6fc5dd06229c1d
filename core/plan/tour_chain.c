/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "base/random.h"
#include "plan/tour_deep.h"
#include "plan/tour_search.h"

/* Chained local search (Martin, Otto & Felten, Complex Systems 5:299, 1991; for large tours Applegate, Cook & Rohe,
 * INFORMS J. Computing 15:82, 2003): a kick exchanges four edges that lie close together in the one way that no short
 * sequence undoes, the deep search repairs the tour around it, and the result is kept unless it is longer. */

#define SPAN 30             /* edges of one kick are at most so far apart along the tour */
#define STRIDE 10           /* nodes from one kick to the next */
#define WINDOW 100          /* nodes among which the kick is drawn */
#define BATCH 64            /* steps between looks at clock and cancel */
#define MIN_ROUND 1000      /* steps between looks at what was gained */
#define START_HEAT 0.1      /* of the mean cost of an edge */
#define NOMINAL_STEP_S 3e-5 /* what one step is taken to cost, so that results do not depend on the machine */

typedef struct {
  AwTourDeep deep;
  AwRandom random;
  guint32 site;             /* where the kicks are at: they sweep over the nodes, which keeps memory near */
  double heat;              /* how much worse a tour may become */
  double total;             /* true cost now */
  double round_saved;       /* best_saved when the present round of the anytime rule began */
  gint64 round_begun;       /* and the steps made by then */
  double saved, best_saved; /* since the first kick, now and at the best */
  guint32 *best;            /* the order at the best */
} Chain;

gint64 aw_tour_default_steps(gsize n)
{
  return (gint64)MIN(8 * n, 8000 + n / 4);
}

static guint32 next_site(Chain *c)
{
  guint32 n = c->deep.p->n;
  c->site = (guint32)(((guint64)c->site + STRIDE) % n);
  return (guint32)(((guint64)c->site + aw_random_below(&c->random, MIN(WINDOW, n))) % n);
}

/* Cuts four edges a little apart and joins the pieces A B C D as A D C B. Returns what it saved, minus infinity when
 * nothing was done. */
static double kick(Chain *c)
{
  const AwTourProblem *p = c->deep.p;
  AwTourArray *tour = c->deep.tour;
  AwTourExchange x = { .k = 4, .link = { 5, 6, 3, 2, 7, 0, 1, 4 } };
  guint32 span = MIN(SPAN, (p->n - 2) / 3), at = tour->pos[next_site(c)];
  double saved = 0;
  for (guint i = 0; i < 4; i++) {
    guint32 a = tour->order[at], b = aw_tour_array_next(tour, a);
    x.t[2 * i] = a;
    x.t[2 * i + 1] = b;
    saved += aw_tour_problem_cost(p, a, b);
    at = (guint32)(((guint64)at + 1 + aw_random_below(&c->random, span)) % p->n);
  }
  for (guint i = 0; i < 8; i++)
    if (i < x.link[i])
      saved -= aw_tour_problem_cost(p, x.t[i], x.t[x.link[i]]);
  if (!isfinite(saved) || !aw_tour_array_exchange(tour, &x))
    return -INFINITY;
  for (guint i = 0; i < 8; i++)
    aw_tour_queue_push(&c->deep.queue, x.t[i]);
  return saved;
}

static double whole(const Chain *c)
{
  gboolean backwards;
  return aw_tour_problem_total(c->deep.p, c->deep.tour->order, &backwards);
}

/* One kick and its repair. The deep search sees the mean cost of the two directions; whether its result is kept is
 * decided by the true cost. A worse tour is kept with a chance that falls with the loss and with time. Returns what was
 * saved. */
static double step(Chain *c)
{
  AwTourArray *tour = c->deep.tour;
  g_array_set_size(tour->journal, 0);
  double saved = kick(c);
  if (!isfinite(saved))
    return 0;
  saved += aw_tour_deep_run(&c->deep, G_MAXUINT64);
  if (c->deep.p->asymmetric)
    saved = c->total - whole(c);
  if (saved >= 0 || saved > c->heat * log(1 - aw_random_unit(&c->random)))
    return saved;
  aw_tour_array_undo(tour);
  return 0;
}

static double done_frac(const AwTourChainLimits *limits, gint64 begun_us)
{
  if (!limits->until_us)
    return limits->n_steps > 0 ? (double)limits->n_used / (double)limits->n_steps : 1;
  gint64 whole_us = limits->until_us - begun_us;
  return whole_us > 0 ? (double)(g_get_monotonic_time() - begun_us) / (double)whole_us : 1;
}

static void batch(Chain *c, AwTourChainLimits *limits)
{
  for (guint i = 0; i < BATCH && (limits->until_us || limits->n_used < limits->n_steps); i++) {
    double saved = step(c);
    c->saved += saved;
    c->total -= saved;
    limits->n_used++;
  }
  if (c->saved <= c->best_saved)
    return;
  c->best_saved = c->saved;
  memcpy(c->best, c->deep.tour->order, c->deep.p->n * sizeof *c->best);
}

/* The anytime rule: over when the last round of steps saved less stage time than such a round is taken to cost. */
static gboolean is_worth_it(Chain *c, const AwTourChainLimits *limits)
{
  gint64 round = MAX(MIN_ROUND, c->deep.p->n / 2);
  if (limits->speed <= 0 || limits->n_used - c->round_begun < round)
    return TRUE;
  double gain_s = (c->best_saved - c->round_saved) / limits->speed;
  gboolean worth = gain_s >= NOMINAL_STEP_S * (double)(limits->n_used - c->round_begun);
  c->round_begun = limits->n_used;
  c->round_saved = c->best_saved;
  return worth;
}

static gboolean run(Chain *c, AwTourChainLimits *limits, AwProgress *progress, GError **error)
{
  gint64 begun_us = g_get_monotonic_time();
  c->total = whole(c);
  double frac, heat = START_HEAT * c->total / c->deep.p->n;
  while ((frac = done_frac(limits, begun_us)) < 1 && is_worth_it(c, limits)) {
    c->heat = heat * (1 - frac);
    batch(c, limits);
    aw_progress_report(progress, "tour", 0.3 + 0.7 * frac);
    if (aw_progress_stopped(progress, error))
      return FALSE;
  }
  memcpy(c->deep.tour->order, c->best, c->deep.p->n * sizeof *c->best);
  return TRUE;
}

/* The deep search from every node, before the first kick. */
static gboolean run_deep(Chain *c, const AwTourChainLimits *limits, AwProgress *progress, GError **error)
{
  for (guint32 v = 0; v < c->deep.p->n; v++)
    aw_tour_queue_push(&c->deep.queue, v);
  while (c->deep.queue.n && !(limits->until_us && g_get_monotonic_time() >= limits->until_us)) {
    aw_tour_deep_run(&c->deep, 4096);
    if (aw_progress_stopped(progress, error))
      return FALSE;
  }
  while (c->deep.queue.n)
    aw_tour_queue_pop(&c->deep.queue);
  return TRUE;
}

gboolean aw_tour_chain(const AwTourProblem *p, AwTourArray *tour, AwTourChainLimits *limits, AwProgress *progress,
                       GError **error)
{
  Chain c = { .deep = { .p = p, .tour = tour }, .random = aw_random_stream(limits->seed, p->n) };
  gboolean done = aw_tour_queue_init(&c.deep.queue, p->n, error);
  g_autofree guint32 *best = c.best = done ? aw_try_alloc(p->n, sizeof *best, "a tour", error) : NULL;
  done = best && run_deep(&c, limits, progress, error);
  if (done) {
    memcpy(best, tour->order, p->n * sizeof *best);
    tour->journal = g_array_new(FALSE, FALSE, sizeof(guint32));
    done = run(&c, limits, progress, error);
  }
  aw_tour_queue_clear(&c.deep.queue);
  return done;
}

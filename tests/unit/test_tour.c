/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/error.h"
#include "base/random.h"
#include "plan/tour.h"

#define MAX_N 9

typedef enum { OPEN, CLOSED, FIRST, LAST, BOTH, FROM, TO, PLACES, FIRST_TO, N_MODES } Mode;

static const AwStop place_a = { -30, 71 }, place_b = { 140, 12 };

static AwTourSettings settings_for(Mode mode, gsize n)
{
  AwTourSettings set = { .closed = mode == CLOSED, .first = -1, .last = -1, .n_steps = -1, .seed = 1 };
  if (mode == FIRST || mode == BOTH || mode == FIRST_TO)
    set.first = (gint64)(n / 2);
  if (mode == LAST || mode == BOTH)
    set.last = n > 1 ? (gint64)(n / 2 + 1) % (gint64)n : 0;
  if (mode == FROM || mode == PLACES)
    set.from = &place_a;
  if (mode == TO || mode == PLACES || mode == FIRST_TO)
    set.to = &place_b;
  return set;
}

static AwStop *random_stops(gsize n, guint64 seed, double side)
{
  AwStop *stops = g_new(AwStop, n);
  AwRandom r = aw_random_stream(seed, n);
  for (gsize i = 0; i < n; i++) {
    stops[i].x = side * aw_random_unit(&r);
    stops[i].y = side * aw_random_unit(&r);
  }
  return stops;
}

/* A move in time with a backlash: going left or down costs an overshoot. */
static double backlash_cost(const AwStop *from, const AwStop *to, gpointer data)
{
  double dx = to->x - from->x, dy = to->y - from->y, extra = *(const double *)data;
  return fmax(fabs(dx), 2 * fabs(dy)) + (dx < 0 ? extra : 0) + (dy < 0 ? 1.7 * extra : 0);
}

static gboolean keeps_ends(const guint32 *order, gsize n, const AwTourSettings *set)
{
  return (set->first < 0 || order[0] == set->first) && (set->last < 0 || order[n - 1] == set->last);
}

/* Heap's algorithm over all orders. */
static void all_orders(const AwStop *stops, guint32 *order, gsize n, gsize k, const AwTourSettings *set, double *best)
{
  if (k <= 1) {
    if (keeps_ends(order, n, set))
      *best = fmin(*best, aw_tour_cost(stops, n, order, set));
    return;
  }
  for (gsize i = 0; i < k; i++) {
    all_orders(stops, order, n, k - 1, set, best);
    gsize j = k % 2 ? 0 : i;
    guint32 t = order[j];
    order[j] = order[k - 1];
    order[k - 1] = t;
  }
}

static double exhaustive(const AwStop *stops, gsize n, const AwTourSettings *set)
{
  guint32 order[MAX_N];
  double best = INFINITY;
  for (gsize i = 0; i < n; i++)
    order[i] = (guint32)i;
  all_orders(stops, order, n, n, set, &best);
  return best;
}

static void assert_permutation(const AwTour *tour, gsize n, const AwTourSettings *set)
{
  g_autofree guint8 *seen = g_malloc0(n);
  g_assert_cmpuint(tour->n, ==, n);
  for (gsize i = 0; i < n; i++) {
    g_assert_cmpuint(tour->order[i], <, n);
    g_assert_cmpuint(seen[tour->order[i]]++, ==, 0);
  }
  g_assert_true(keeps_ends(tour->order, n, set));
}

static AwTour *find(const AwStop *stops, gsize n, const AwTourSettings *set)
{
  GError *error = NULL;
  AwTour *tour = aw_tour_find(stops, n, set, NULL, &error);
  g_assert_no_error(error);
  assert_permutation(tour, n, set);
  g_assert_cmpfloat_with_epsilon(tour->final, aw_tour_cost(stops, n, tour->order, set), 1e-9 * (1 + tour->final));
  g_assert_cmpfloat(tour->two_opt, <=, tour->nearest * (1 + 1e-12));
  g_assert_cmpfloat(tour->final, <=, tour->two_opt * (1 + 1e-12));
  return tour;
}

static void compare_with_exhaustive(double extra, gsize max_n)
{
  for (gsize n = 1; n <= max_n; n++)
    for (Mode mode = OPEN; mode < N_MODES; mode++) {
      AwTourSettings set = settings_for(mode, n);
      if (extra >= 0) {
        set.cost = backlash_cost;
        set.asymmetric = extra > 0;
        set.cost_data = &extra;
      }
      g_autofree AwStop *stops = random_stops(n, 40 + mode, 100);
      g_autoptr(AwTour) tour = find(stops, n, &set);
      g_assert_cmpfloat_with_epsilon(tour->final, exhaustive(stops, n, &set), 1e-9);
    }
}

static void test_exhaustive(void)
{
  compare_with_exhaustive(-1, 8);
}

static void test_exhaustive_nine(void)
{
  for (Mode mode = OPEN; mode < N_MODES; mode++) {
    AwTourSettings set = settings_for(mode, MAX_N);
    g_autofree AwStop *stops = random_stops(MAX_N, 90 + mode, 100);
    g_autoptr(AwTour) tour = find(stops, MAX_N, &set);
    g_assert_cmpfloat_with_epsilon(tour->final, exhaustive(stops, MAX_N, &set), 1e-9);
  }
}

static void test_exhaustive_time(void)
{
  compare_with_exhaustive(0, 8);
}

static void test_exhaustive_backlash(void)
{
  compare_with_exhaustive(13, 8);
}

static void test_exhaustive_backlash_nine(void)
{
  double extra = 21;
  for (Mode mode = OPEN; mode <= CLOSED; mode++) {
    AwTourSettings set = settings_for(mode, MAX_N);
    set.cost = backlash_cost;
    set.asymmetric = TRUE;
    set.cost_data = &extra;
    g_autofree AwStop *stops = random_stops(MAX_N, 60 + mode, 100);
    g_autoptr(AwTour) tour = find(stops, MAX_N, &set);
    g_assert_cmpfloat_with_epsilon(tour->final, exhaustive(stops, MAX_N, &set), 1e-9);
  }
}

/* A searched tour never costs more than the same tour run backwards. */
static void test_backlash(void)
{
  double extra = 13;
  for (Mode mode = OPEN; mode < N_MODES; mode++) {
    AwTourSettings set = settings_for(mode, 60);
    set.cost = backlash_cost;
    set.asymmetric = TRUE;
    set.cost_data = &extra;
    set.n_steps = 3000;
    g_autofree AwStop *stops = random_stops(60, 70 + mode, 1000);
    g_autoptr(AwTour) tour = find(stops, 60, &set);
    g_autofree guint32 *turned = g_new(guint32, 60);
    for (gsize i = 0; i < 60; i++)
      turned[i] = tour->order[59 - i];
    if (keeps_ends(turned, 60, &set) && !set.from && !set.to)
      g_assert_cmpfloat(tour->final, <=, aw_tour_cost(stops, 60, turned, &set) + 1e-9);
  }
}

/* The anytime rule ends early when a saved um is worth little, and repeats. */
static void test_anytime(void)
{
  AwTourSettings set = settings_for(OPEN, 1000);
  g_autofree AwStop *stops = random_stops(1000, 9, 10000);
  set.n_steps = 30000;
  g_autoptr(AwTour) patient = find(stops, 1000, &set);
  set.speed_um_per_s = 1e7;
  g_autoptr(AwTour) hasty = find(stops, 1000, &set);
  g_autoptr(AwTour) again = find(stops, 1000, &set);
  g_assert_cmpint(patient->n_steps_used, ==, 30000);
  g_assert_cmpint(hasty->n_steps_used, <, 10000);
  g_assert_cmpint(hasty->n_steps_used, ==, again->n_steps_used);
  g_assert_cmpmem(hasty->order, 1000 * sizeof *hasty->order, again->order, 1000 * sizeof *again->order);
}

static void test_budget(void)
{
  AwTourSettings set = settings_for(OPEN, 300);
  g_autofree AwStop *stops = random_stops(300, 10, 1000);
  set.budget_s = 0.05;
  g_autoptr(AwTour) tour = find(stops, 300, &set);
  g_assert_cmpint(tour->n_steps_used, >, 0);
}

static void test_modes(void)
{
  for (Mode mode = OPEN; mode < N_MODES; mode++)
    for (gsize n = 11; n < 400; n = n * 3 / 2) {
      AwTourSettings set = settings_for(mode, n);
      g_autofree AwStop *stops = random_stops(n, mode, 1000);
      g_autoptr(AwTour) tour = find(stops, n, &set);
      g_assert_cmpfloat(tour->final, <, tour->unsorted);
    }
}

static void test_same_place(void)
{
  for (gsize n = 1; n < 300; n = 2 * n + 1)
    for (Mode mode = OPEN; mode < N_MODES; mode++) {
      AwTourSettings set = settings_for(mode, n);
      g_autofree AwStop *stops = g_new(AwStop, n);
      for (gsize i = 0; i < n; i++)
        stops[i] = (AwStop){ 7, 7 };
      g_autoptr(AwTour) tour = find(stops, n, &set);
      if (!set.from && !set.to)
        g_assert_cmpfloat(tour->final, ==, 0);
    }
}

/* 40 spots with 25 stops each: the tour is no longer than one over the spots alone. */
static void test_duplicates(void)
{
  AwTourSettings set = settings_for(CLOSED, 40);
  g_autofree AwStop *spots = random_stops(40, 5, 100);
  g_autofree AwStop *stops = g_new(AwStop, 1000);
  for (gsize i = 0; i < 1000; i++)
    stops[i] = spots[i % 40];
  g_autoptr(AwTour) few = find(spots, 40, &set);
  g_autoptr(AwTour) many = find(stops, 1000, &set);
  g_assert_cmpfloat(many->final, <=, few->final * 1.05);
}

static void test_line(void)
{
  AwTourSettings set = settings_for(OPEN, 500);
  g_autofree AwStop *stops = random_stops(500, 6, 100);
  double lo = 100, hi = 0;
  for (gsize i = 0; i < 500; i++) {
    stops[i].y = 3;
    lo = fmin(lo, stops[i].x);
    hi = fmax(hi, stops[i].x);
  }
  g_autoptr(AwTour) tour = find(stops, 500, &set);
  g_assert_cmpfloat_with_epsilon(tour->final, hi - lo, 1e-9);
}

static void test_repeats(void)
{
  AwTourSettings set = settings_for(OPEN, 700);
  g_autofree AwStop *stops = random_stops(700, 8, 1000);
  g_autoptr(AwTour) a = find(stops, 700, &set);
  g_autoptr(AwTour) b = find(stops, 700, &set);
  g_assert_cmpmem(a->order, 700 * sizeof *a->order, b->order, 700 * sizeof *b->order);
}

static void assert_refused(const AwStop *stops, gsize n, const AwTourSettings *set, AwErrorCode code, const char *word)
{
  g_autoptr(GError) error = NULL;
  g_assert_null(aw_tour_find(stops, n, set, NULL, &error));
  g_assert_error(error, AW_ERROR, (int)code);
  g_assert_nonnull(strstr(error->message, word));
}

static void test_refused(void)
{
  AwStop stops[3] = { { 0, 0 }, { 1, 0 }, { 2, 5 } };
  AwTourSettings set = settings_for(OPEN, 3);
  assert_refused(stops, 0, &set, AW_ERROR_EMPTY, "no stop");
  assert_refused(stops, 10000001, &set, AW_ERROR_RANGE, "10000000");
  set.first = 3;
  assert_refused(stops, 3, &set, AW_ERROR_RANGE, "first stop has index 3");
  set.first = set.last = 1;
  assert_refused(stops, 3, &set, AW_ERROR_STATE, "same stop");
  set.from = &place_a;
  assert_refused(stops, 3, &set, AW_ERROR_STATE, "not at both");
  set = settings_for(LAST, 3);
  set.to = &place_a;
  assert_refused(stops, 3, &set, AW_ERROR_STATE, "not at both");
  set.closed = TRUE;
  assert_refused(stops, 3, &set, AW_ERROR_STATE, "closed");
  set = settings_for(FROM, 3);
  AwStop nowhere = { INFINITY, 0 };
  set.from = &nowhere;
  assert_refused(stops, 3, &set, AW_ERROR_RANGE, "before the first stop");
  set = settings_for(CLOSED, 3);
  stops[1].y = NAN;
  assert_refused(stops, 3, &set, AW_ERROR_RANGE, "stop 2");
  stops[1].y = 2e7;
  assert_refused(stops, 3, &set, AW_ERROR_RANGE, "20000000");
}

static double not_a_number(const AwStop *from, const AwStop *to, gpointer data)
{
  (void)data;
  return from->x < to->x ? NAN : 1;
}

static void test_bad_cost(void)
{
  AwStop stops[3] = { { 0, 0 }, { 1, 0 }, { 2, 5 } };
  AwTourSettings set = settings_for(OPEN, 3);
  set.cost = not_a_number;
  assert_refused(stops, 3, &set, AW_ERROR_RANGE, "cost of a move");
}

static void test_cancel(void)
{
  g_autofree AwStop *stops = random_stops(70000, 3, 1000);
  AwTourSettings set = settings_for(OPEN, 70000);
  AwProgress progress = { .cancelled = 1 };
  g_autoptr(GError) error = NULL;
  g_assert_null(aw_tour_find(stops, 70000, &set, &progress, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_CANCELLED);
}

static void cancel_late(const char *what, double done_frac, gpointer data)
{
  g_assert_cmpstr(what, ==, "tour");
  if (done_frac > 0.4)
    aw_progress_cancel(data);
}

/* Stopped between kicks, on the word of the report itself. */
static void test_cancel_late(void)
{
  g_autofree AwStop *stops = random_stops(500, 3, 1000);
  AwTourSettings set = settings_for(OPEN, 500);
  AwProgress progress = { .report = cancel_late };
  progress.data = &progress;
  g_autoptr(GError) error = NULL;
  g_assert_null(aw_tour_find(stops, 500, &set, &progress, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_CANCELLED);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/plan/tour/exhaustive", test_exhaustive);
  g_test_add_func("/plan/tour/exhaustive-nine", test_exhaustive_nine);
  g_test_add_func("/plan/tour/exhaustive-time", test_exhaustive_time);
  g_test_add_func("/plan/tour/exhaustive-backlash", test_exhaustive_backlash);
  g_test_add_func("/plan/tour/exhaustive-backlash-nine", test_exhaustive_backlash_nine);
  g_test_add_func("/plan/tour/backlash", test_backlash);
  g_test_add_func("/plan/tour/anytime", test_anytime);
  g_test_add_func("/plan/tour/budget", test_budget);
  g_test_add_func("/plan/tour/modes", test_modes);
  g_test_add_func("/plan/tour/same-place", test_same_place);
  g_test_add_func("/plan/tour/duplicates", test_duplicates);
  g_test_add_func("/plan/tour/line", test_line);
  g_test_add_func("/plan/tour/repeats", test_repeats);
  g_test_add_func("/plan/tour/refused", test_refused);
  g_test_add_func("/plan/tour/bad-cost", test_bad_cost);
  g_test_add_func("/plan/tour/cancel", test_cancel);
  g_test_add_func("/plan/tour/cancel-late", test_cancel_late);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdlib.h>
#include <time.h>

#include "base/random.h"
#include "base/text.h"
#include "plan/tour_search.h"

/* Times and lengths of tours over random points in a square, as ratios within one run. `bench_tour N...` takes other
 * numbers of points. Lengths are compared with the Held-Karp estimate for such points (Johnson, McGeoch & Rothberg,
 * SODA 1996; the optimum lies about 0.7 % above it). */

static double now_s(void)
{
  struct timespec t;
  clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static double held_karp(double n, double area)
{
  return sqrt(n * area) * (0.70805 + 0.52229 / sqrt(n) + 1.31572 / n - 3.07474 / (n * sqrt(n)));
}

static AwStop *random_stops(guint32 n, double side)
{
  AwStop *stops = g_new(AwStop, n);
  AwRandom r = aw_random_stream(1, n);
  for (guint32 i = 0; i < n; i++) {
    stops[i].x = side * aw_random_unit(&r);
    stops[i].y = side * aw_random_unit(&r);
  }
  return stops;
}

/* Nearest neighbour and 2-opt alone, their neighbour lists included. */
static double time_two_opt(const AwStop *stops, guint32 n, const AwTourSettings *set)
{
  gboolean backwards;
  double begun = now_s();
  g_autoptr(AwTourProblem) p = aw_tour_problem_new(stops, n, set, NULL);
  guint32 *order = aw_tour_start_nearest(p, NULL, NULL);
  p->least_gain = 1e-9 * aw_tour_problem_total(p, order, &backwards) / n;
  g_autoptr(AwTourArray) array = aw_tour_array_new(order, p->n, NULL);
  aw_tour_two_opt(p, array, NULL, NULL);
  return now_s() - begun;
}

static double bench(guint32 n)
{
  double side = 1e6, bound = held_karp(n, side * side);
  AwTourSettings set = { .closed = TRUE, .first = -1, .last = -1, .n_steps = -1, .seed = 1 };
  g_autofree AwStop *stops = random_stops(n, side);
  double two_opt_s = time_two_opt(stops, n, &set), begun = now_s();
  g_autoptr(AwTour) tour = aw_tour_find(stops, n, &set, NULL, NULL);
  double whole_s = now_s() - begun;
  g_autofree char *a = aw_text_from_double(100 * (tour->nearest / bound - 1), 2);
  g_autofree char *b = aw_text_from_double(100 * (tour->two_opt / bound - 1), 2);
  g_autofree char *c = aw_text_from_double(100 * (tour->final / bound - 1), 2);
  g_autofree char *d = aw_text_from_double(two_opt_s, 3);
  g_autofree char *e = aw_text_from_double(whole_s, 3);
  g_autofree char *f = aw_text_from_double(whole_s / two_opt_s, 2);
  g_print("%8u points: over Held-Karp nearest %s %%, 2-opt %s %%, final %s %%; 2-opt %s s, whole %s s, ratio %s\n", n,
          a, b, c, d, e, f);
  return whole_s;
}

int main(int argc, char **argv)
{
  if (argc > 1) {
    for (int i = 1; i < argc; i++)
      bench((guint32)strtoul(argv[i], NULL, 10));
    return 0;
  }
  bench(1000);
  double small_s = bench(10000), large_s = bench(100000);
  g_autofree char *ratio = aw_text_from_double(large_s / small_s, 2);
  g_print("100000 points take %s times as long as 10000 (limit 20)\n", ratio);
  return 0;
}

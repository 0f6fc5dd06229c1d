/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/grid.h"

#include <math.h>

#include "base/random.h"

static double *random_points(gsize n, guint64 seed, double width, double height)
{
  double *xy = g_new(double, 2 * n);
  AwRandom r = aw_random_stream(seed, 0);
  for (gsize i = 0; i < n; i++) {
    xy[2 * i] = width * aw_random_unit(&r);
    xy[2 * i + 1] = height * aw_random_unit(&r);
  }
  return xy;
}

static int compare(gconstpointer a, gconstpointer b)
{
  const AwGridHit *p = a, *q = b;
  if (p->distance < q->distance || p->distance > q->distance)
    return p->distance < q->distance ? -1 : 1;
  return p->index < q->index ? -1 : 1;
}

/* The answer by looking at every point. */
static GArray *all_sorted(const double *xy, gsize n, double x, double y)
{
  GArray *hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  for (gsize i = 0; i < n; i++) {
    double dx = xy[2 * i] - x, dy = xy[2 * i + 1] - y;
    AwGridHit hit = { i, sqrt(dx * dx + dy * dy) };
    g_array_append_val(hits, hit);
  }
  g_array_sort(hits, compare);
  return hits;
}

static void check_against_all(const double *xy, gsize n, double x, double y)
{
  g_autoptr(AwGrid) grid = aw_grid_new(xy, n);
  g_autoptr(GArray) all = all_sorted(xy, n, x, y);
  AwGridHit hits[10];
  gsize found = aw_grid_nearest(grid, x, y, 10, hits);
  g_assert_cmpuint(found, ==, MIN(n, 10));
  for (gsize i = 0; i < found; i++)
    g_assert_cmpuint(hits[i].index, ==, g_array_index(all, AwGridHit, i).index);
  double radius = n > 20 ? g_array_index(all, AwGridHit, 20).distance : 5;
  g_autoptr(GArray) within = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  aw_grid_within(grid, x, y, radius, within);
  for (gsize i = 0; i < n; i++) {
    AwGridHit hit = g_array_index(all, AwGridHit, i);
    if (hit.distance > radius) {
      g_assert_cmpuint(within->len, ==, i);
      return;
    }
    g_assert_cmpuint(g_array_index(within, AwGridHit, i).index, ==, hit.index);
  }
}

static void test_random(void)
{
  g_autofree double *xy = random_points(500, 7, 300, 90);
  AwRandom r = aw_random_stream(8, 0);
  for (int i = 0; i < 60; i++)
    check_against_all(xy, 500, 400 * aw_random_unit(&r) - 50, 200 * aw_random_unit(&r) - 50);
}

static void test_lattice_ties(void)
{
  double xy[2 * 100];
  for (int i = 0; i < 100; i++) {
    xy[2 * i] = i % 10;
    xy[2 * i + 1] = i / 10;
  }
  check_against_all(xy, 100, 4, 4);
  check_against_all(xy, 100, 4.5, 4.5);
  check_against_all(xy, 100, -3, 12);
}

static void test_degenerate(void)
{
  double line[2 * 30], same[2 * 30];
  for (int i = 0; i < 30; i++) {
    line[2 * i] = 5;
    line[2 * i + 1] = i * i;
    same[2 * i] = same[2 * i + 1] = 3.25;
  }
  check_against_all(line, 30, 7, 100);
  check_against_all(same, 30, 3, 3);
  check_against_all(line, 1, 0, 0);
  check_against_all(NULL, 0, 0, 0);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/base/grid/random", test_random);
  g_test_add_func("/base/grid/lattice_ties", test_lattice_ties);
  g_test_add_func("/base/grid/degenerate", test_degenerate);
  return g_test_run();
}

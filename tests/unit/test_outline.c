/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/outline.h"

#include "base/random.h"
#include "geometry/contour.h"

static const AwScanPoint square[4] = { { 1, 1 }, { 5, 1 }, { 5, 4 }, { 1, 4 } };
/* An L of area 5: unit squares (0..3) x (0..1) and (0..1) x (1..3). */
static const AwScanPoint ell[6] = { { 0, 0 }, { 3, 0 }, { 3, 1 }, { 1, 1 }, { 1, 3 }, { 0, 3 } };

static void assert_near(double a, double b, double tolerance)
{
  g_assert_cmpfloat_with_epsilon(a, b, tolerance);
}

static void test_area_and_centroid(void)
{
  assert_near(aw_outline_area(square, 4), 12, 1e-12);
  assert_near(aw_outline_area(ell, 6), 5, 1e-12);
  AwScanPoint c = aw_outline_centroid(ell, 6);
  assert_near(c.x_um, (3 * 1.5 + 2 * 0.5) / 5, 1e-12);
  assert_near(c.y_um, (3 * 0.5 + 2 * 2.0) / 5, 1e-12);
  const AwScanPoint flat[3] = { { 0, 0 }, { 3, 3 }, { 6, 6 } };
  c = aw_outline_centroid(flat, 3);
  assert_near(c.x_um, 3, 1e-12);
  assert_near(aw_outline_reach(square, 4, (AwScanPoint){ 1, 1 }), 5, 1e-12);
}

static void test_contains(void)
{
  g_assert_true(aw_outline_contains(ell, 6, (AwScanPoint){ 2.5, 0.5 }));
  g_assert_true(aw_outline_contains(ell, 6, (AwScanPoint){ 0.5, 2.5 }));
  g_assert_false(aw_outline_contains(ell, 6, (AwScanPoint){ 2, 2 }));
  g_assert_false(aw_outline_contains(ell, 6, (AwScanPoint){ -0.5, 0.5 }));
}

static void test_distance(void)
{
  AwScanPoint other[4] = { { 8, 8 }, { 9, 8 }, { 9, 9 }, { 8, 9 } };
  assert_near(aw_outline_distance(square, 4, other, 4), 5, 1e-12); /* corner to corner: 3, 4, 5 */
  AwScanPoint beside[3] = { { 7, 2.5 }, { 9, 0 }, { 9, 5 } };
  assert_near(aw_outline_distance(square, 4, beside, 3), 2, 1e-12); /* corner to edge */
  assert_near(aw_outline_distance(beside, 3, square, 4), 2, 1e-12);
  AwScanPoint inner[3] = { { 2, 2 }, { 3, 2 }, { 2, 3 } };
  assert_near(aw_outline_distance(square, 4, inner, 3), 0, 1e-15);
  assert_near(aw_outline_distance(inner, 3, square, 4), 0, 1e-15);
  AwScanPoint bar[4] = { { 0, 2 }, { 6, 2 }, { 6, 3 }, { 0, 3 } }; /* crosses the square, no corner inside either */
  assert_near(aw_outline_distance(square, 4, bar, 4), 0, 1e-15);
}

/* Against the plain way: every edge with every edge. */
static double slow_distance(const AwScanPoint *a, gsize n_a, const AwScanPoint *b, gsize n_b)
{
  double best = INFINITY;
  for (gsize i = 0; i < n_a; i++)
    for (gsize j = 0; j < n_b; j++)
      for (int t = 0; t <= 400; t++) {
        AwScanPoint p = a[i], q = a[(i + 1) % n_a], u = b[j], v = b[(j + 1) % n_b];
        double f = t / 400.0, x = p.x_um + f * (q.x_um - p.x_um), y = p.y_um + f * (q.y_um - p.y_um);
        double dx = v.x_um - u.x_um, dy = v.y_um - u.y_um;
        double s = CLAMP(((x - u.x_um) * dx + (y - u.y_um) * dy) / (dx * dx + dy * dy), 0.0, 1.0);
        best = MIN(best, hypot(x - u.x_um - s * dx, y - u.y_um - s * dy));
      }
  return best;
}

static gsize random_star(AwRandom *r, AwScanPoint *p, double x, double y)
{
  for (int i = 0; i < 12; i++) {
    double angle = i * G_PI / 6, radius = 2 + 3 * aw_random_unit(r);
    p[i] = (AwScanPoint){ x + radius * cos(angle), y + radius * sin(angle) };
  }
  return 12;
}

static void test_distance_random(void)
{
  AwRandom r = aw_random_stream(3, 0);
  for (int k = 0; k < 40; k++) {
    AwScanPoint a[12], b[12];
    double turn = 2 * G_PI * aw_random_unit(&r), away = 10.5 + 8 * aw_random_unit(&r);
    random_star(&r, a, 0, 1e-15);
    random_star(&r, b, away * cos(turn), away * sin(turn));
    double slow = slow_distance(a, 12, b, 12), fast = aw_outline_distance(a, 12, b, 12);
    g_assert_cmpfloat(fast, <=, slow + 1e-12);
    g_assert_cmpfloat(fast, >=, slow - 0.02);
  }
}

static void test_common_area(void)
{
  AwScanPoint shifted[4] = { { 3, 2 }, { 7, 2 }, { 7, 5 }, { 3, 5 } };
  assert_near(aw_outline_common_area(square, 4, shifted, 4), 4, 1e-9);
  assert_near(aw_outline_common_area(square, 4, ell, 6), 0, 1e-9); /* they share an edge only */
  AwScanPoint over[4] = { { 0.5, 0.5 }, { 2, 0.5 }, { 2, 2 }, { 0.5, 2 } };
  assert_near(aw_outline_common_area(over, 4, ell, 6), 1.25, 0.03);
  AwScanPoint far_off[4] = { { 30, 2 }, { 70, 2 }, { 70, 5 }, { 30, 5 } };
  assert_near(aw_outline_common_area(square, 4, far_off, 4), 0, 1e-15);
}

static void test_simple(void)
{
  AwScanPoint bow[4] = { { 0, 0 }, { 2, 2 }, { 2, 0 }, { 0, 2 } };
  g_assert_false(aw_outline_is_simple(bow, 4));
  g_assert_true(aw_outline_is_simple(ell, 6));
}

static void test_map(void)
{
  AwScanPoint p[6];
  memcpy(p, ell, sizeof p);
  AwMatrix mirror = { -0.5, 0, 0, 2 };
  aw_outline_map(p, 6, mirror, (AwScanPoint){ 1, 1 }, (AwScanPoint){ 10, 20 });
  assert_near(aw_outline_area(p, 6), 5, 1e-12);
  /* The last point of the L comes first when the sense is kept: (0, 3) -> (10.5, 24). */
  assert_near(p[0].x_um, 10.5, 1e-12);
  assert_near(p[0].y_um, 24, 1e-12);
}

static AwRaster blank(int side)
{
  return (AwRaster){ g_malloc0((gsize)side * (gsize)side), side, side };
}

static AwRaster disc(double x, double y, double radius, int side)
{
  AwRaster r = blank(side);
  for (int j = 0; j < side; j++)
    for (int i = 0; i < side; i++)
      r.mask[j * side + i] = hypot(i - x, j - y) <= radius;
  return r;
}

static double signed_area(const AwScanPoint *p, gsize n)
{
  double sum = 0;
  for (gsize i = 0; i < n; i++)
    sum += p[i].x_um * p[(i + 1) % n].y_um - p[(i + 1) % n].x_um * p[i].y_um;
  return sum / 2;
}

static double mask_sum(const AwRaster *r)
{
  double sum = 0;
  for (int i = 0; i < r->width_px * r->height_px; i++)
    sum += r->mask[i];
  return sum;
}

/* Discs at many sub-pixel places: area within 1 % and centroid within 0.05 px of the mask, line within 0.35 px. */
static void check_discs(double radius)
{
  g_autoptr(GArray) points = g_array_new(FALSE, FALSE, sizeof(AwScanPoint));
  AwRandom r = aw_random_stream(11, (guint64)radius);
  int side = 2 * (int)radius + 12;
  double worst = 0, sum_area = 0;
  for (int k = 0; k < 50; k++) {
    double x = side / 2 + aw_random_unit(&r) - 0.5, y = side / 2 + aw_random_unit(&r) - 0.5;
    AwRaster raster = disc(x, y, radius, side);
    g_autofree guint8 *mask = raster.mask;
    aw_contour_trace(&raster, points);
    const AwScanPoint *p = (const AwScanPoint *)(const void *)points->data;
    AwScanPoint c = aw_outline_centroid(p, points->len);
    double area = signed_area(p, points->len);
    assert_near(area, mask_sum(&raster), 1e-6);
    sum_area += area / (G_PI * radius * radius) / 50;
    g_assert_cmpfloat(hypot(c.x_um - x, c.y_um - y), <, radius < 10 ? 0.2 : 0.1);
    for (guint i = 0; i < points->len; i++) {
      AwScanPoint a = p[i], b = p[(i + 1) % points->len];
      double middle = hypot((a.x_um + b.x_um) / 2 - c.x_um, (a.y_um + b.y_um) / 2 - c.y_um);
      worst = MAX(worst, fabs(hypot(a.x_um - c.x_um, a.y_um - c.y_um) - radius));
      worst = MAX(worst, fabs(middle - radius));
    }
    g_assert_cmpuint(points->len, <, (guint)(2 * G_PI * radius));
  }
  g_test_message("radius %d px: worst %d / 1000 px off the circle, %u points", (int)radius, (int)(1000 * worst),
                 points->len);
  assert_near(sum_area, 1, 0.01);
  g_assert_cmpfloat(worst, <, 0.35);
}

static void test_discs(void)
{
  check_discs(8);
  check_discs(20);
}

/* Any mask, however ragged: simple, right sense, area of the mask. */
static void test_ragged(void)
{
  g_autoptr(GArray) points = g_array_new(FALSE, FALSE, sizeof(AwScanPoint));
  for (guint64 k = 0; k < 300; k++) {
    AwRandom r = aw_random_stream(5, k);
    AwRaster raster = blank(26);
    g_autofree guint8 *mask = raster.mask;
    double density = 0.3 + 0.5 * aw_random_unit(&r);
    for (int y = 3; y < 23; y++)
      for (int x = 3; x < 23; x++)
        mask[y * 26 + x] = aw_random_unit(&r) < density;
    mask[10 * 26 + 10] = 1;
    aw_raster_clean(&raster);
    aw_contour_trace(&raster, points);
    const AwScanPoint *p = (const AwScanPoint *)(const void *)points->data;
    g_assert_cmpuint(points->len, >=, 3);
    g_assert_true(aw_outline_is_simple(p, points->len));
    assert_near(signed_area(p, points->len), mask_sum(&raster), 1e-6);
  }
}

static void test_single_pixel(void)
{
  AwRaster raster = blank(7);
  g_autofree guint8 *mask = raster.mask;
  g_autoptr(GArray) points = g_array_new(FALSE, FALSE, sizeof(AwScanPoint));
  mask[3 * 7 + 3] = 1;
  aw_contour_trace(&raster, points);
  const AwScanPoint *p = (const AwScanPoint *)(const void *)points->data;
  assert_near(signed_area(p, points->len), 1, 1e-9);
  g_assert_true(aw_outline_contains(p, points->len, (AwScanPoint){ 3, 3 }));
}

static void test_clean(void)
{
  static const char *const before[] = { "...........", "...........", "...........", "...####..#.",
                                        "...#..#....", "...#.##....", "...###.....", "......#....",
                                        "...........", "...........", "..........." };
  static const char *const after[] = { "...........", "...........", "...........", "...####....",
                                       "...####....", "...####....", "...###.....", "......#....",
                                       "...........", "...........", "..........." };
  AwRaster raster = blank(11);
  g_autofree guint8 *mask = raster.mask;
  for (int i = 0; i < 121; i++)
    mask[i] = before[i / 11][i % 11] == '#';
  aw_raster_clean(&raster);
  for (int i = 0; i < 121; i++)
    g_assert_cmpint(mask[i], ==, after[i / 11][i % 11] == '#');
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/geometry/outline/area_and_centroid", test_area_and_centroid);
  g_test_add_func("/geometry/outline/contains", test_contains);
  g_test_add_func("/geometry/outline/distance", test_distance);
  g_test_add_func("/geometry/outline/distance_random", test_distance_random);
  g_test_add_func("/geometry/outline/common_area", test_common_area);
  g_test_add_func("/geometry/outline/simple", test_simple);
  g_test_add_func("/geometry/outline/map", test_map);
  g_test_add_func("/geometry/contour/discs", test_discs);
  g_test_add_func("/geometry/contour/ragged", test_ragged);
  g_test_add_func("/geometry/contour/single_pixel", test_single_pixel);
  g_test_add_func("/geometry/contour/clean", test_clean);
  return g_test_run();
}

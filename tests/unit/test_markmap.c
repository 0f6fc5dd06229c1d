/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/random.h"
#include "geometry/markmap.h"
#include "support/check.h"

#define NEAR(a, b, tol) g_assert_cmpfloat_with_epsilon((a), (b), (tol))

/* Readings of a 3 x 3 grid of pixel places, the mark fixed: S = k + A p, with noise in the reading. */
static void draw(AwMarkView *views, AwMatrix a, double noise, guint64 item)
{
  AwRandom r = aw_random_stream(71, item);
  for (int i = 0; i < 9; i++) {
    double x = 100 + 420 * (i % 3), y = 80 + 310 * (i / 3);
    views[i].p = (AwPixelPoint){ x, y };
    views[i].stage = (AwScanPoint){ 5300.5 + a.xx * x + a.xy * y + noise * aw_random_normal(&r),
                                    -210.25 + a.yx * x + a.yy * y + noise * aw_random_normal(&r) };
  }
}

static const AwMatrix turned = { 0.6471, 0.0412, -0.0398, 0.6523 };

static void test_exact(void)
{
  AwMarkView views[9];
  AwMarkMap map;
  draw(views, turned, 0, 0);
  g_assert_true(aw_mark_map_fit(views, 9, 0.65, &map, NULL));
  NEAR(map.map.um_per_px.xx, turned.xx, 1e-12);
  NEAR(map.map.um_per_px.xy, turned.xy, 1e-12);
  NEAR(map.map.um_per_px.yx, turned.yx, 1e-12);
  NEAR(map.map.um_per_px.yy, turned.yy, 1e-12);
  NEAR(map.scale, sqrt(0.6471 * 0.6523 + 0.0412 * 0.0398), 1e-12);
  NEAR(map.angle_rad, atan2(-0.0398, 0.6471), 1e-12);
  NEAR(map.shear_rad, atan2(0.6523, 0.0412) - atan2(-0.0398, 0.6471) - G_PI / 2, 1e-12);
  g_assert_cmpint(map.n_free, ==, 12);
  g_assert_false(map.mirrored);
  NEAR(map.map.rms_um, 0, 1e-9);
  /* every view gives the mark one scan coordinate */
  AwPixelPoint c = { 511.5, 383.5 };
  AwScanPoint q = aw_pixel_to_scan(&map.map, views[0].stage, c, views[0].p);
  AwScanPoint other = aw_pixel_to_scan(&map.map, views[7].stage, c, views[7].p);
  NEAR(q.x_um, other.x_um, 1e-9);
  NEAR(q.y_um, other.y_um, 1e-9);
}

/* The standard errors stated are the spread over 2000 draws, 6 %. */
static void test_errors(void)
{
  double scale = 0, angle = 0, shear = 0, xx = 0, xy = 0;
  AwMarkView views[9];
  AwMarkMap map, exact;
  double var = 0, scale_var = 0, angle_var = 0, shear_var = 0;
  draw(views, turned, 0, 0);
  g_assert_true(aw_mark_map_fit(views, 9, 0, &exact, NULL));
  for (guint64 i = 0; i < 2000; i++) {
    draw(views, turned, 0.4, i);
    g_assert_true(aw_mark_map_fit(views, 9, 0.65, &map, NULL));
    scale += pow(map.scale - exact.scale, 2) / 2000;
    angle += pow(map.angle_rad - exact.angle_rad, 2) / 2000;
    shear += pow(map.shear_rad - exact.shear_rad, 2) / 2000;
    xx += pow(map.map.um_per_px.xx - turned.xx, 2) / 2000;
    xy += pow(map.map.um_per_px.yx - turned.yx, 2) / 2000;
    var += map.row_covariance.xx / 2000;
    scale_var += pow(map.scale_se, 2) / 2000;
    angle_var += pow(map.angle_se, 2) / 2000;
    shear_var += pow(map.shear_se, 2) / 2000;
  }
  NEAR(sqrt(scale_var / scale), 1, 0.06);
  NEAR(sqrt(angle_var / angle), 1, 0.06);
  NEAR(sqrt(shear_var / shear), 1, 0.06);
  NEAR(sqrt(var / xx), 1, 0.06);
  NEAR(sqrt(var / xy), 1, 0.06);
}

static void test_words(void)
{
  const struct {
    AwMatrix a;
    const char *words;
    gboolean mirrored;
  } rows[] = { { { 0.65, 0, 0, 0.65 }, "", FALSE },
               { { -0.65, 0, 0, 0.65 }, "the x readings of the stage run the other way", TRUE },
               { { 0, 0.65, 0.65, 0 }, "the x and y readings of the stage are exchanged", TRUE },
               { { 0, -0.65, 0.65, 0 }, "the camera is turned by 90 degrees", FALSE } };
  for (gsize i = 0; i < G_N_ELEMENTS(rows); i++) {
    AwMarkView views[9];
    AwMarkMap map;
    draw(views, rows[i].a, 0, 0);
    g_assert_true(aw_mark_map_fit(views, 9, 0.65, &map, NULL));
    g_autofree char *words = aw_mark_map_words(&map);
    g_assert_cmpstr(words, ==, rows[i].words);
    g_assert_cmpint(map.mirrored, ==, rows[i].mirrored);
    NEAR(map.shear_rad, 0, 1e-9);
  }
}

static void test_three(void)
{
  AwMarkView views[9], three[3];
  AwMarkMap map;
  draw(views, turned, 0.4, 1);
  three[0] = views[0];
  three[1] = views[2];
  three[2] = views[6];
  g_assert_true(aw_mark_map_fit(three, 3, 0.65, &map, NULL));
  g_assert_cmpint(map.n_free, ==, 0);
  g_assert_true(isnan(map.scale_se) && isnan(map.row_covariance.xx));
}

static void refuse(const AwMarkView *views, gsize n, double pixel_um, const char *words)
{
  AwMarkMap map;
  GError *error = NULL;
  g_assert_false(aw_mark_map_fit(views, n, pixel_um, &map, &error));
  aw_check_error(&error, AW_ERROR_RANGE, words);
}

static void test_refusals(void)
{
  AwMarkView views[9];
  draw(views, turned, 0, 0);
  refuse(views, 2, 0.65, "2 views|at least 3");
  refuse(views, 3, 0.65, "readings lie on one line");
  refuse(views, 9, 650, "0.65|650|seem to hold mm");
  refuse(views, 9, 0.00065, "seem to hold nm");
  for (int i = 0; i < 9; i++)
    views[i].p.y_px = 100 + views[i].p.x_px / 2;
  refuse(views, 9, 0.65, "pixels lie on one line");
  for (int i = 0; i < 9; i++)
    views[i].stage = (AwScanPoint){ 7, 7 };
  refuse(views, 9, 0.65, "readings lie on one line");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/geometry/markmap/exact", test_exact);
  g_test_add_func("/geometry/markmap/errors", test_errors);
  g_test_add_func("/geometry/markmap/words", test_words);
  g_test_add_func("/geometry/markmap/three", test_three);
  g_test_add_func("/geometry/markmap/refusals", test_refusals);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/pixelmap.h"

#include "../support/check.h"

static void frame_centre(void)
{
  AwPixelPoint c = aw_frame_centre(1001, 640);
  g_assert_cmpfloat(c.x_px, ==, 500);
  g_assert_cmpfloat(c.y_px, ==, 319.5);
}

/* The worked example of docs/geometry.md: the scan coordinate runs against the image. */
static void worked_example(void)
{
  const AwPixelMap map = { { 0.65, 0, 0, 0.65 }, AW_ORIGIN_ENTERED, 0 };
  AwPixelPoint c = aw_frame_centre(1001, 1001);
  AwScanPoint q = aw_pixel_to_scan(&map, (AwScanPoint){ 1000, 2000 }, c, (AwPixelPoint){ 600, 500 });
  g_assert_cmpfloat(q.x_um, ==, 935);
  g_assert_cmpfloat(q.y_um, ==, 2000);
}

/* A point at q is brought to the frame's centre by the stage reading q: that is what a scan coordinate means. */
static void reading_brings_point_to_centre(void)
{
  const AwPixelMap map = { { 0.61, -0.07, 0.05, -0.66 }, AW_ORIGIN_FITTED, 0.2 };
  AwPixelPoint c = aw_frame_centre(800, 600);
  AwScanPoint q = aw_pixel_to_scan(&map, (AwScanPoint){ -312.5, 77.25 }, c, (AwPixelPoint){ 731.25, 12.5 });
  AwPixelPoint p = aw_scan_to_pixel(&map, q, c, q);
  g_assert_cmpfloat_with_epsilon(p.x_px, c.x_px, 1e-12);
  g_assert_cmpfloat_with_epsilon(p.y_px, c.y_px, 1e-12);
}

/* q = S - A (p - c) by hand: p - c = (200, -100), A (p - c) = (129, 76). */
static void turned_and_mirrored(void)
{
  const AwPixelMap map = { { 0.61, -0.07, 0.05, -0.66 }, AW_ORIGIN_FITTED, 0.2 };
  AwPixelPoint c = { 399.5, 299.5 };
  AwScanPoint stage = { 1000, 2000 };
  AwScanPoint q = aw_pixel_to_scan(&map, stage, c, (AwPixelPoint){ 599.5, 199.5 });
  g_assert_cmpfloat_with_epsilon(q.x_um, 871, 1e-9);
  g_assert_cmpfloat_with_epsilon(q.y_um, 1924, 1e-9);
  AwPixelPoint p = aw_scan_to_pixel(&map, stage, c, q);
  g_assert_cmpfloat_with_epsilon(p.x_px, 599.5, 1e-9);
  g_assert_cmpfloat_with_epsilon(p.y_px, 199.5, 1e-9);
  g_assert_cmpfloat_with_epsilon(aw_pixel_map_scale(&map), 0.63174361, 1e-8); /* det = -0.4026 + 0.0035 */
}

static void matrices(void)
{
  const AwMatrix m = { 3, 1, -2, 5 };
  g_assert_cmpfloat(aw_matrix_det(m), ==, 17);
  AwMatrix one = aw_matrix_multiply(m, aw_matrix_inverse(m));
  g_assert_cmpfloat_with_epsilon(one.xx, 1, 1e-15);
  g_assert_cmpfloat_with_epsilon(one.xy, 0, 1e-15);
  g_assert_cmpfloat_with_epsilon(one.yx, 0, 1e-15);
  g_assert_cmpfloat_with_epsilon(one.yy, 1, 1e-15);
  AwMatrix ab = aw_matrix_multiply(m, (AwMatrix){ 0, 2, 7, -1 });
  g_assert_true(ab.xx == 7 && ab.xy == 5 && ab.yx == 35 && ab.yy == -9);
}

static void origins(void)
{
  g_assert_cmpstr(aw_origin_name(AW_ORIGIN_ASSUMED), ==, "assumed");
  g_assert_cmpstr(aw_origin_name(AW_ORIGIN_ENTERED), ==, "entered");
  g_assert_cmpstr(aw_origin_name(AW_ORIGIN_FITTED), ==, "fitted");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/geometry/pixelmap/frame_centre", frame_centre);
  g_test_add_func("/geometry/pixelmap/worked_example", worked_example);
  g_test_add_func("/geometry/pixelmap/reading_brings_point_to_centre", reading_brings_point_to_centre);
  g_test_add_func("/geometry/pixelmap/turned_and_mirrored", turned_and_mirrored);
  g_test_add_func("/geometry/pixelmap/matrices", matrices);
  g_test_add_func("/geometry/pixelmap/origins", origins);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "view/raster.h"

#define W 120
#define H 80

static const AwInk white = { 1, 1, 1, 1 };

/* The layer painted on black; one byte a pixel, for white ink the coverage. */
static cairo_surface_t *paint(const AwRaster *raster)
{
  cairo_surface_t *page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, W, H);
  cairo_t *cr = cairo_create(page);
  aw_raster_paint(raster, cr);
  g_assert_cmpint(cairo_status(cr), ==, CAIRO_STATUS_SUCCESS);
  cairo_destroy(cr);
  cairo_surface_flush(page);
  return page;
}

static int at(cairo_surface_t *page, int x, int y)
{
  return cairo_image_surface_get_data(page)[y * cairo_image_surface_get_stride(page) + 4 * x];
}

/* The sum of all coverage in pixels; frees the page. */
static double total(cairo_surface_t *page)
{
  double sum = 0;
  for (int y = 0; y < H; y++)
    for (int x = 0; x < W; x++)
      sum += at(page, x, y) / 255.0;
  cairo_surface_destroy(page);
  return sum;
}

static double line_total(AwStroke stroke, double x0, double y0, double x1, double y1)
{
  g_autoptr(AwRaster) raster = aw_raster_new();
  g_assert_true(aw_raster_begin(raster, W, H));
  aw_raster_line(raster, &stroke, x0, y0, x1, y1);
  return total(paint(raster));
}

/* A line along pixel centres covers just these; one between two rows covers both by half. */
static void straight_line(void)
{
  g_autoptr(AwRaster) raster = aw_raster_new();
  g_assert_true(aw_raster_begin(raster, W, H));
  AwStroke stroke = { .ink = white, .width = 1 };
  aw_raster_line(raster, &stroke, 10, 20.5, 30, 20.5);
  aw_raster_line(raster, &stroke, 60, 40, 60, 50);
  cairo_surface_t *page = paint(raster);
  g_assert_cmpint(at(page, 15, 20), ==, 255);
  g_assert_cmpint(at(page, 15, 19), ==, 0);
  g_assert_cmpint(at(page, 15, 21), ==, 0);
  g_assert_cmpint(at(page, 9, 20), ==, 0);
  g_assert_cmpint(at(page, 31, 20), ==, 0);
  g_assert_cmpint(ABS(at(page, 59, 45) - 128), <=, 1);
  g_assert_cmpint(ABS(at(page, 60, 45) - 128), <=, 1);
  cairo_surface_destroy(page);
}

/* The ink laid down is length times width, at any slope and width. */
static void ink_is_conserved(void)
{
  for (int i = 0; i < 24; i++)
    for (double width = 1; width < 5; width += 1.3) {
      double dx = 33.3 * cos(i * G_PI / 12), dy = 33.3 * sin(i * G_PI / 12);
      double sum = line_total((AwStroke){ .ink = white, .width = width }, 60.2, 40.7, 60.2 + dx, 40.7 + dy);
      g_assert_cmpfloat_with_epsilon(sum / (33.3 * width), 1, 0.03);
    }
}

/* Points far outside draw what a line between nearer points would. */
static void far_points(void)
{
  AwStroke stroke = { .ink = white, .width = 2 };
  double whole = line_total(stroke, -20, 40, 140, 40);
  g_assert_cmpfloat_with_epsilon(whole, 2 * W, 0.5);
  g_assert_cmpfloat_with_epsilon(line_total(stroke, -1e12, 40, 1e12, 40), whole, 0.5);
  g_assert_cmpfloat(line_total(stroke, NAN, 40, 50, 40), ==, 0);
  g_assert_cmpfloat(line_total(stroke, 10, -INFINITY, 50, 40), ==, 0);
  g_assert_cmpfloat(line_total(stroke, 10, -50, 50, -20), ==, 0);
  g_assert_cmpfloat(line_total(stroke, 300, -500, 301, 900), ==, 0);
}

/* A dashed square of side 40: 6 on, 4 off leaves six tenths of the ink, the pattern running on round corners. */
static void dashes(void)
{
  static const double square[] = { 30, 20, 70, 20, 70, 60, 30, 60 }, on_off[] = { 6, 4 };
  g_autoptr(AwRaster) raster = aw_raster_new();
  AwStroke stroke = { .ink = white, .width = 1 };
  g_assert_true(aw_raster_begin(raster, W, H));
  aw_raster_outline(raster, &stroke, square, 4);
  g_assert_cmpfloat_with_epsilon(total(paint(raster)), 162, 2); /* and a little more at the corners */
  g_assert_true(aw_raster_begin(raster, W, H));                 /* which clears */
  stroke.dash = on_off;
  stroke.n_dash = 2;
  aw_raster_outline(raster, &stroke, square, 4);
  g_assert_cmpfloat_with_epsilon(total(paint(raster)), 96, 2);
  static const double mad[] = { 0, 0, NAN, 5, 1e300, -1e300 }, nothing[] = { 0, 0 };
  aw_raster_outline(raster, &stroke, mad, 3);
  stroke.dash = nothing;
  aw_raster_outline(raster, &stroke, square, 4);
  aw_raster_outline(raster, &stroke, square, 0);
}

static void see_through(void)
{
  AwStroke stroke = { .ink = { 1, 1, 1, 0.5 }, .width = 3 };
  g_assert_cmpfloat_with_epsilon(line_total(stroke, 10, 10, 60, 10), 75, 1.5);
}

static void stamps(void)
{
  g_autoptr(AwRaster) raster = aw_raster_new();
  g_autoptr(AwStamp) disc = aw_stamp_new(AW_GLYPH_DISC, white, 5);
  g_assert_true(aw_raster_begin(raster, W, H));
  aw_raster_stamp(raster, disc, 50.4, 30.6);
  cairo_surface_t *page = paint(raster);
  g_assert_cmpint(at(page, 50, 30), ==, 255);
  g_assert_cmpint(at(page, 54, 30), >, 200);
  g_assert_cmpint(at(page, 45, 30), <=, 255);
  g_assert_cmpint(at(page, 57, 30), ==, 0);
  cairo_surface_destroy(page);
  double whole = total(paint(raster));
  g_assert_cmpfloat_with_epsilon(whole, G_PI * 25, 4);
  g_assert_true(aw_raster_begin(raster, W, H));
  aw_raster_stamp(raster, disc, 0.5, 30); /* a little over half of it */
  aw_raster_stamp(raster, disc, NAN, 30);
  aw_raster_stamp(raster, disc, 1e18, -1e18);
  g_assert_cmpfloat_with_epsilon(total(paint(raster)) / whole, 0.56, 0.03);
}

static void sizes(void)
{
  g_autoptr(AwRaster) raster = aw_raster_new();
  g_assert_false(aw_raster_begin(raster, 40000, 10)); /* more than cairo can hold */
  g_assert_true(aw_raster_begin(raster, 1, 1));
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/view/raster/straight_line", straight_line);
  g_test_add_func("/view/raster/ink_is_conserved", ink_is_conserved);
  g_test_add_func("/view/raster/far_points", far_points);
  g_test_add_func("/view/raster/dashes", dashes);
  g_test_add_func("/view/raster/see_through", see_through);
  g_test_add_func("/view/raster/stamps", stamps);
  g_test_add_func("/view/raster/sizes", sizes);
  return g_test_run();
}

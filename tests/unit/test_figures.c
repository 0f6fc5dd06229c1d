/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <glib/gstdio.h>
#include <math.h>
#include <string.h>

#include "base/error.h"
#include "figures/axes.h"
#include "figures/canvas.h"
#include "figures/label.h"
#include "figures/scalebar.h"
#include "figures/upright.h"

static char *scratch(const char *name)
{
  g_autofree char *folder = g_dir_make_tmp("aimwell-figures-XXXXXX", NULL);
  return g_build_filename(folder, name, NULL);
}

static void forget(const char *path)
{
  g_autofree char *folder = g_path_get_dirname(path);
  g_remove(path);
  g_rmdir(folder);
}

/* A page with text, transparency, a clip and a picture, all of which cairo gives numbers in SVG. */
static gboolean write_page(const char *path, double width, GError **error)
{
  g_autoptr(AwCanvas) canvas = aw_canvas_open(path, width, 200, error);
  if (!canvas)
    return FALSE;
  cairo_t *cr = aw_canvas_cairo(canvas);
  aw_canvas_set_title(canvas, "A page \xff of <figures>");
  cairo_surface_t *picture = cairo_image_surface_create(CAIRO_FORMAT_RGB24, 5, 5);
  cairo_set_source_surface(cr, picture, 10, 10);
  cairo_paint_with_alpha(cr, 0.5);
  cairo_rectangle(cr, 5, 5, 100, 100);
  cairo_clip(cr);
  AwLabel label = { .size = 20, .ink = aw_ink_text };
  aw_label_draw(cr, &label, "Nuclei", 20, 40);
  cairo_surface_destroy(picture);
  return aw_canvas_commit(canvas, error);
}

static void same_bytes(void)
{
  static const char *const names[] = { "a.png", "a.SVG", "a.pdf" }, *const starts[] = { "\x89PNG", "<?xml", "%PDF" };
  for (gsize i = 0; i < G_N_ELEMENTS(names); i++) {
    g_autofree char *path = scratch(names[i]), *first = NULL, *second = NULL;
    gsize n_first = 0, n_second = 0;
    GError *error = NULL;
    g_assert_true(write_page(path, 300, &error));
    g_assert_true(g_file_get_contents(path, &first, &n_first, NULL));
    g_assert_true(write_page(path, 300, &error));
    g_assert_true(g_file_get_contents(path, &second, &n_second, NULL));
    g_assert_cmpmem(first, n_first, second, n_second);
    g_assert_cmpmem(first, strlen(starts[i]), starts[i], strlen(starts[i]));
    g_assert_null(g_strstr_len(first, (gssize)n_first, "CreationDate"));
    forget(path);
  }
}

static void expect(const char *path, double width, AwErrorCode code, const char *part)
{
  GError *error = NULL;
  g_assert_false(write_page(path, width, &error));
  g_assert_error(error, AW_ERROR, (int)code);
  g_assert_nonnull(strstr(error->message, part));
  g_error_free(error);
}

static void canvas_errors(void)
{
  expect("map.jpeg", 300, AW_ERROR_UNSUPPORTED, "map.jpeg");
  expect("png", 300, AW_ERROR_UNSUPPORTED, ".svg");
  expect("map.png", 99, AW_ERROR_RANGE, "99");
  expect("map.png", 20001, AW_ERROR_RANGE, "20000");
  expect("map.png", NAN, AW_ERROR_RANGE, "100");
  expect("/no/such/folder/map.png", 300, AW_ERROR_NOT_FOUND, "/no/such/folder");
  if (g_file_test("/dev/full", G_FILE_TEST_EXISTS))
    expect("/dev/full", 300, AW_ERROR_IO, "/dev/full");
}

static void abandoned_canvas(void)
{
  g_autofree char *path = scratch("never.pdf");
  g_autoptr(AwCanvas) canvas = aw_canvas_open(path, 300, 300, NULL);
  g_assert_nonnull(canvas);
  g_clear_pointer(&canvas, aw_canvas_free);
  g_assert_false(g_file_test(path, G_FILE_TEST_EXISTS));
  forget(path);
}

static void bar_lengths(void)
{
  static const double pairs[][2] = { { 0.037, 0.02 }, { 1, 1 },     { 1.99, 1 },    { 2, 2 },      { 4.9, 2 },
                                     { 5, 5 },        { 999, 500 }, { 1000, 1000 }, { 7.3e6, 5e6 } };
  for (gsize i = 0; i < G_N_ELEMENTS(pairs); i++)
    g_assert_cmpfloat_with_epsilon(aw_scalebar_length(pairs[i][0]), pairs[i][1], pairs[i][1] * 1e-9);
  g_assert_cmpfloat(aw_scalebar_length(0), ==, 0);
  g_assert_cmpfloat(aw_scalebar_length(-3), ==, 0);
  g_assert_cmpfloat(aw_scalebar_length(NAN), ==, 0);
  g_assert_cmpfloat(aw_scalebar_length(INFINITY), ==, 0);
}

/* The bar drawn must be as long as its label says: 500 um at 0.37 px per um are 185 px. */
static void bar_drawn(void)
{
  cairo_surface_t *page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, 400, 100);
  cairo_t *cr = cairo_create(page);
  cairo_set_source_rgb(cr, 1, 1, 1);
  cairo_paint(cr);
  double height = aw_scalebar_draw(cr, 20, 10, 300, 0.37, 1);
  cairo_surface_flush(page);
  int y = (int)(10 + height - 5), n = 0;
  const unsigned char *row = cairo_image_surface_get_data(page) + y * cairo_image_surface_get_stride(page);
  for (int x = 0; x < 400; x++)
    n += row[4 * x] < 128;
  g_assert_cmpint(ABS(n - 185), <=, 1);
  g_assert_cmpfloat(aw_scalebar_draw(cr, 20, 10, 300, 0, 1), ==, 0);
  cairo_destroy(cr);
  cairo_surface_destroy(page);
}

static void numbers_as_text(void)
{
  static const gsize counts[] = { 0, 999, 1000, 1234567 };
  static const char *const texts[] = { "0", "999", "1\u202f000", "1\u202f234\u202f567" };
  for (gsize i = 0; i < G_N_ELEMENTS(counts); i++) {
    g_autofree char *text = aw_label_count(counts[i]);
    g_assert_cmpstr(text, ==, texts[i]);
  }
  static const double lengths[] = { 0.1625, 7.3, 48.26, 999, 1234, 24712.4, NAN };
  static const char *const length_texts[] = { "162 nm",  "7.30 µm", "48.3 µm",       "999 µm",
                                              "1.23 mm", "24.7 mm", "unknown length" };
  for (gsize i = 0; i < G_N_ELEMENTS(lengths); i++) {
    g_autofree char *text = aw_label_length(lengths[i]);
    g_assert_cmpstr(text, ==, length_texts[i]);
  }
}

static void check_ticks(double min, double max, gboolean log, const char *expected)
{
  AwAxis axis = aw_axis_cover(min, max, log, NULL);
  AwTicks ticks = aw_axis_ticks(&axis, 8);
  GString *all = g_string_new(NULL);
  for (int i = 0; i < ticks.n; i++) {
    g_autofree char *text = aw_axis_tick_text(&axis, &ticks, i);
    g_string_append_printf(all, "%s%s", i ? " " : "", text);
  }
  g_assert_cmpstr(all->str, ==, expected);
  g_string_free(all, TRUE);
}

static void ticks(void)
{
  check_ticks(0, 1, FALSE, "0.0 0.2 0.4 0.6 0.8 1.0");
  check_ticks(-3.2, 7.9, FALSE, "-4 -2 0 2 4 6 8");
  check_ticks(0.0013, 0.0017, FALSE, "0.0013 0.0014 0.0015 0.0016 0.0017");
  check_ticks(1e9, 1e9 + 2e8, FALSE, "1e+09 1.05e+09 1.1e+09 1.15e+09 1.2e+09");
  check_ticks(5, 5, FALSE, "4.4 4.6 4.8 5.0 5.2 5.4 5.6");
  check_ticks(0, 0, FALSE, "-0.6 -0.4 -0.2 0.0 0.2 0.4 0.6");
  check_ticks(NAN, 3, FALSE, "0.0 0.2 0.4 0.6 0.8 1.0");
  check_ticks(0.02, 700, TRUE, "0.01 0.1 1 10 100 1000");
  check_ticks(3, 8, TRUE, "1 2 5 10");
  check_ticks(-1, 0, TRUE, "1 2 5 10");
  check_ticks(1e-12, 1e12, TRUE, "1e-12 1e-08 0.0001 1 1e+04 1e+08 1e+12");
}

static void axes_places(void)
{
  AwAxes axes = { .x = 100, .y = 50, .width = 400, .height = 200, .u = 1 };
  axes.across = (AwAxis){ 1, 1000, TRUE, "dose / Gy" };
  axes.up = (AwAxis){ -2, 8, FALSE, "offset / µm" };
  g_assert_cmpfloat_with_epsilon(aw_axes_x(&axes, 10), 100 + 400 / 3.0, 1e-9);
  g_assert_cmpfloat_with_epsilon(aw_axes_y(&axes, 8), 50, 1e-9);
  g_assert_cmpfloat_with_epsilon(aw_axes_y(&axes, 0), 210, 1e-9);
  g_assert_true(isnan(aw_axes_x(&axes, -1)));
  cairo_surface_t *page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, 600, 400);
  cairo_t *cr = cairo_create(page);
  axes.grid = TRUE;
  aw_axes_draw(cr, &axes);
  cairo_save(cr);
  aw_axes_clip(cr, &axes);
  cairo_set_source_rgb(cr, 1, 0, 0);
  cairo_paint(cr);
  cairo_restore(cr);
  g_assert_cmpint(cairo_status(cr), ==, CAIRO_STATUS_SUCCESS);
  cairo_surface_flush(page);
  const unsigned char *row = cairo_image_surface_get_data(page) + 100 * cairo_image_surface_get_stride(page);
  g_assert_cmpint(row[4 * 300 + 2], ==, 255);
  g_assert_cmpint(row[4 * 520 + 2], ==, 0);
  cairo_destroy(cr);
  cairo_surface_destroy(page);
}

/* design: S = (1000, 2000), A = 0.65 identity, p - c = (100, 0) px gives q = (935, 2000). */
static void upright(void)
{
  AwPixelMap map = { { 0.65, 0, 0, 0.65 }, AW_ORIGIN_ENTERED, 0 };
  AwUpright up;
  AwFrame frame = { .width_px = 640, .height_px = 480, .stage = { 1000, 2000 } };
  g_assert_true(aw_upright_make(&map, (AwScanPoint){ 900, 1900 }, &up));
  AwPixelPoint dish = aw_upright_from_scan(&up, (AwScanPoint){ 935, 2000 });
  AwPixelPoint p = aw_upright_to_frame(&up, &frame, dish), c = aw_frame_centre(640, 480);
  g_assert_cmpfloat_with_epsilon(p.x_px, c.x_px + 100, 1e-9);
  g_assert_cmpfloat_with_epsilon(p.y_px, c.y_px, 1e-9);
  AwBox box = aw_upright_frame_box(&up, &frame);
  AwPixelPoint corner = aw_upright_to_frame(&up, &frame, (AwPixelPoint){ box.x0, box.y0 });
  g_assert_cmpfloat_with_epsilon(corner.x_px, -0.5, 1e-9);
  g_assert_cmpfloat_with_epsilon(corner.y_px, -0.5, 1e-9);
  AwScanPoint back = aw_upright_to_scan(&up, dish);
  g_assert_cmpfloat_with_epsilon(back.x_um, 935, 1e-9);
  g_assert_cmpfloat_with_epsilon(back.y_um, 2000, 1e-9);
  g_assert_false(aw_upright_make(&map, (AwScanPoint){ NAN, 0 }, &up));
  map.um_per_px = (AwMatrix){ 1, 2, 2, 4 };
  g_assert_false(aw_upright_make(&map, (AwScanPoint){ 0, 0 }, &up));
}

/* Any A, turned or mirrored: one pixel to the right in a frame is one dish pixel to the right. */
static void upright_keeps_frames(void)
{
  static const AwMatrix maps[] = { { 0.61, -0.22, 0.2, 0.63 }, { -0.3, 0.02, 0.01, 0.31 }, { 0.1, 0.4, 0.39, -0.1 } };
  AwFrame frame = { .width_px = 101, .height_px = 77, .stage = { -420, 37 } };
  AwPixelPoint c = aw_frame_centre(101, 77);
  for (gsize i = 0; i < G_N_ELEMENTS(maps); i++) {
    AwPixelMap map = { maps[i], AW_ORIGIN_FITTED, 0.1 };
    AwUpright up;
    g_assert_true(aw_upright_make(&map, (AwScanPoint){ 5, 6 }, &up));
    for (int k = 0; k < 3; k++) {
      AwPixelPoint p = { 13.0 + 20 * k, 70.0 - 11 * k };
      AwPixelPoint d = aw_upright_from_scan(&up, aw_pixel_to_scan(&map, frame.stage, c, p));
      AwPixelPoint again = aw_upright_to_frame(&up, &frame, d);
      AwBox box = aw_upright_frame_box(&up, &frame);
      g_assert_cmpfloat_with_epsilon(again.x_px, p.x_px, 1e-9);
      g_assert_cmpfloat_with_epsilon(d.x_px - box.x0, p.x_px + 0.5, 1e-9);
      g_assert_cmpfloat_with_epsilon(d.y_px - box.y0, p.y_px + 0.5, 1e-9);
    }
  }
}

static void units_and_looks(void)
{
  g_assert_cmpfloat_with_epsilon(aw_style_unit(2666, 2000), 2, 1e-3);
  g_assert_cmpfloat_with_epsilon(aw_style_unit(10, 10), 0.45, 1e-12);
  for (int a = AW_STATE_FOUND; a <= AW_STATE_REJECTED; a++)
    for (int b = a + 1; b <= AW_STATE_REJECTED; b++) {
      const AwLook *x = aw_look_of_state((AwState)a), *y = aw_look_of_state((AwState)b);
      g_assert_true(x->glyph != y->glyph);
      g_assert_true(x->n_dash != y->n_dash || memcmp(x->dash, y->dash, sizeof x->dash) != 0);
    }
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/figures/canvas/same_bytes", same_bytes);
  g_test_add_func("/figures/canvas/errors", canvas_errors);
  g_test_add_func("/figures/canvas/abandoned", abandoned_canvas);
  g_test_add_func("/figures/scalebar/lengths", bar_lengths);
  g_test_add_func("/figures/scalebar/drawn", bar_drawn);
  g_test_add_func("/figures/label/numbers", numbers_as_text);
  g_test_add_func("/figures/axes/ticks", ticks);
  g_test_add_func("/figures/axes/places", axes_places);
  g_test_add_func("/figures/upright/example", upright);
  g_test_add_func("/figures/upright/keeps_frames", upright_keeps_frames);
  g_test_add_func("/figures/style/units_and_looks", units_and_looks);
  return g_test_run();
}

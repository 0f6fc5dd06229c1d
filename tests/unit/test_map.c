/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <glib/gstdio.h>
#include <locale.h>
#include <math.h>
#include <string.h>

#include "base/csv.h"
#include "base/error.h"
#include "figures/map.h"
#include "image/overview.h"
#include "support/fake_dish.h"

#define W 1000
#define H 750
#define SIDE 600 /* of the one frame of the pattern tests, px */

typedef struct {
  double r, g, b;
} Pixel;

static Pixel pixel(cairo_surface_t *page, double x, double y)
{
  const unsigned char *row =
      cairo_image_surface_get_data(page) + (gsize)y * (gsize)cairo_image_surface_get_stride(page);
  const unsigned char *p = row + 4 * (gsize)x;
  return (Pixel){ p[2], p[1], p[0] };
}

static double grey(cairo_surface_t *page, double x, double y)
{
  Pixel p = pixel(page, floor(x + 0.5), floor(y + 0.5));
  return (p.r + p.g + p.b) / 3;
}

static cairo_surface_t *draw(const AwMapContent *content)
{
  cairo_surface_t *page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, W, H);
  cairo_t *cr = cairo_create(page);
  aw_map_draw(content, cr, W, H);
  g_assert_cmpint(cairo_status(cr), ==, CAIRO_STATUS_SUCCESS);
  cairo_destroy(cr);
  cairo_surface_flush(page);
  return page;
}

static AwMapContent content_of(const FakeDish *dish)
{
  return (AwMapContent){ .title = "test",
                         .subtitle = "a made-up dish",
                         .frames = dish->frames,
                         .map = dish->map,
                         .nuclei = dish->nuclei,
                         .state = dish->state,
                         .tour = (const gint64 *)(const void *)dish->tour->data,
                         .n_tour = dish->tour->len };
}

/* The middle of all pixels in the dish's half of the page that are near the ink of `state`. */
static AwPixelPoint middle_of_ink(cairo_surface_t *page, AwState state)
{
  static const Pixel inks[] = { [AW_STATE_PROPOSED] = { 255, 209, 74 },
                                [AW_STATE_ACCEPTED] = { 56, 189, 247 },
                                [AW_STATE_REJECTED] = { 247, 102, 64 } };
  double n = 0, sx = 0, sy = 0;
  for (int y = 0; y < H; y++)
    for (int x = 0; x < W * 0.66; x++) {
      Pixel p = pixel(page, x, y), ink = inks[state];
      if (fabs(p.r - ink.r) + fabs(p.g - ink.g) + fabs(p.b - ink.b) < 60) {
        n++;
        sx += x;
        sy += y;
      }
    }
  g_assert_cmpfloat(n, >, 10);
  return (AwPixelPoint){ sx / n, sy / n };
}

/* An ellipse by its place and axes in the image: full axes 60 and 26 px, the long one 30 degrees below +x. */
static void add_at_pixel(FakeDish *dish, double x_px, double y_px)
{
  const AwFrame *frame = dish->frames->pdata[0];
  AwPixelPoint c = aw_frame_centre(SIDE, SIDE);
  double scale = aw_pixel_map_scale(&dish->map);
  AwScanPoint q = aw_pixel_to_scan(&dish->map, frame->stage, c, (AwPixelPoint){ x_px, y_px });
  AwScanPoint tip =
      aw_pixel_to_scan(&dish->map, frame->stage, c, (AwPixelPoint){ x_px + cos(G_PI / 6), y_px + sin(G_PI / 6) });
  fake_dish_add(dish, q, 60 * scale, 26 * scale, atan2(tip.y_um - q.y_um, tip.x_um - q.x_um));
}

/* An L as the microscope shows it: a stroke down on the left, then one to the right at its foot. */
static FakeDish *pattern(double camera_rad, gboolean mirrored)
{
  FakeDishSettings s = fake_dish_defaults();
  s.n_across = s.n_down = 1;
  s.side_px = SIDE;
  s.n_nuclei = 0;
  s.overview_px = 0;
  s.camera_rad = camera_rad;
  s.mirrored = mirrored;
  FakeDish *dish = fake_dish_new(&s);
  static const AwState states[] = { AW_STATE_ACCEPTED, AW_STATE_PROPOSED, AW_STATE_REJECTED };
  add_at_pixel(dish, 150, 120);
  add_at_pixel(dish, 150, 480);
  add_at_pixel(dish, 450, 480);
  g_free(dish->state);
  dish->state = g_memdup2(states, sizeof states);
  return dish;
}

static AwPixelPoint step(AwPixelPoint at, double along, double across)
{
  double c = cos(G_PI / 6), s = sin(G_PI / 6);
  return (AwPixelPoint){ at.x_px + along * c - across * s, at.y_px + along * s + across * c };
}

/* The drawn outline must lie on the edge of the bright blob: bright inside it, dark outside, along both axes. */
static void check_blob(cairo_surface_t *page, AwPixelPoint at, double page_per_px)
{
  for (int sign = -1; sign <= 1; sign += 2) {
    AwPixelPoint in = step(at, sign * 24 * page_per_px, 0), out = step(at, 0, sign * 20 * page_per_px);
    AwPixelPoint far = step(at, sign * 40 * page_per_px, 0);
    g_assert_cmpfloat(grey(page, in.x_px, in.y_px), >, 90);
    g_assert_cmpfloat(grey(page, out.x_px, out.y_px), <, 60);
    g_assert_cmpfloat(grey(page, far.x_px, far.y_px), <, 60);
  }
}

static void check_pattern(double camera_rad, gboolean mirrored)
{
  g_autoptr(FakeDish) dish = pattern(camera_rad, mirrored);
  fake_dish_paint(dish, 300);
  AwMapContent content = content_of(dish);
  content.n_tour = 0;
  cairo_surface_t *page = draw(&content);
  AwPixelPoint top = middle_of_ink(page, AW_STATE_ACCEPTED), corner = middle_of_ink(page, AW_STATE_PROPOSED);
  AwPixelPoint right = middle_of_ink(page, AW_STATE_REJECTED);
  double k = (corner.y_px - top.y_px) / 360;
  g_assert_cmpfloat(k, >, 0.5); /* the stroke runs down, ... */
  g_assert_cmpfloat_with_epsilon(top.x_px, corner.x_px, 1.5);
  g_assert_cmpfloat_with_epsilon((right.x_px - corner.x_px) / 300, k, 0.01); /* ... the foot to the right */
  g_assert_cmpfloat_with_epsilon(right.y_px, corner.y_px, 1.5);
  check_blob(page, top, k);
  check_blob(page, corner, k);
  check_blob(page, right, k);
  cairo_surface_destroy(page);
}

static void handedness(void)
{
  check_pattern(0, FALSE);
  check_pattern(0.3, FALSE);
  check_pattern(-2.5, FALSE);
  check_pattern(0, TRUE);
  check_pattern(1.2, TRUE);
}

/* ---- the sample scan and its truth table ---- */

static double number(const AwCsv *csv, gsize row, const char *heading)
{
  double value = 0;
  gsize column = 0;
  g_assert_true(aw_csv_need(csv, heading, &column, NULL));
  g_assert_true(aw_csv_double(csv, row, column, &value, NULL));
  return value;
}

/* The sample's frames as scan.csv places them, under the camera's true matrix (sampleimages/README.md). */
static FakeDish *sample_dish(void)
{
  FakeDishSettings s = fake_dish_defaults();
  s.n_across = s.n_down = 0;
  s.n_nuclei = 0;
  s.overview_px = 0;
  s.um_per_px = 0.6506;
  s.camera_rad = 2.4 * G_PI / 180;
  FakeDish *dish = fake_dish_new(&s);
  g_autoptr(AwCsv) csv = aw_csv_read("sampleimages/scan.csv", ',', NULL);
  g_assert_nonnull(csv);
  for (gsize i = 0; i < aw_csv_n_rows(csv); i++) {
    g_autofree char *path = g_build_filename("sampleimages", aw_csv_text(csv, i, 0), NULL);
    g_autoptr(AwImage) image = aw_image_load(path, 0, -1, NULL, NULL);
    g_assert_nonnull(image);
    AwFrame *frame = g_new0(AwFrame, 1);
    frame->width_px = image->width_px;
    frame->height_px = image->height_px;
    frame->stage = (AwScanPoint){ number(csv, i, "stage_x_um"), number(csv, i, "stage_y_um") };
    frame->overview = aw_image_overview(image, 512, 0, 2000, NULL);
    g_ptr_array_add(dish->frames, frame);
  }
  return dish;
}

/* Interphase nuclei of the truth table; turned round the dish's middle on request: 1 mirrored, 2 by 180 degrees. */
static void add_truth(FakeDish *dish, int turn)
{
  g_autoptr(AwCsv) csv = aw_csv_read("sampleimages/truth.csv", ',', NULL);
  g_assert_nonnull(csv);
  AwScanPoint middle = ((const AwFrame *)dish->frames->pdata[dish->frames->len / 2])->stage;
  g_ptr_array_set_size(dish->nuclei, 0);
  for (gsize i = 0; i < aw_csv_n_rows(csv); i++) {
    if (strcmp(aw_csv_text(csv, i, (gsize)aw_csv_find(csv, "kind")), "interphase") != 0)
      continue;
    AwScanPoint q = { number(csv, i, "x_um"), number(csv, i, "y_um") };
    q.x_um = turn >= 1 ? 2 * middle.x_um - q.x_um : q.x_um;
    q.y_um = turn == 2 ? 2 * middle.y_um - q.y_um : q.y_um;
    fake_dish_add(dish, q, number(csv, i, "major_um"), number(csv, i, "minor_um"), number(csv, i, "angle_rad"));
  }
  g_free(dish->state);
  dish->state = g_new(AwState, dish->nuclei->len);
  for (guint i = 0; i < dish->nuclei->len; i++)
    dish->state[i] = AW_STATE_ACCEPTED;
}

/* How bright the bare pictures are where accepted outlines are drawn over them. */
static double brightness_under_outlines(const FakeDish *dish)
{
  AwMapContent content = content_of(dish);
  cairo_surface_t *drawn = draw(&content);
  content.nuclei = NULL;
  cairo_surface_t *bare = draw(&content);
  double n = 0, sum = 0;
  for (int y = 0; y < H; y++)
    for (int x = 0; x < W * 0.66; x++) {
      Pixel p = pixel(drawn, x, y);
      if (p.b < 170 || p.r > 120)
        continue;
      n++;
      sum += grey(bare, x, y);
    }
  cairo_surface_destroy(drawn);
  cairo_surface_destroy(bare);
  g_assert_cmpfloat(n, >, 1000);
  return sum / n;
}

/* Outlines made from the truth must lie on the nuclei of the pictures; mirrored or turned by half they would not. */
static void truth_of_sample(void)
{
  if (!g_file_test("sampleimages/scan.csv", G_FILE_TEST_EXISTS)) {
    g_test_skip("no sample scan beside the tests");
    return;
  }
  g_autoptr(FakeDish) dish = sample_dish();
  double brightness[3];
  for (int turn = 0; turn < 3; turn++) {
    add_truth(dish, turn);
    brightness[turn] = brightness_under_outlines(dish);
    g_test_message("turn %d: mean grey %g", turn, brightness[turn]);
  }
  g_assert_cmpfloat(brightness[0], >, 1.6 * brightness[1]);
  g_assert_cmpfloat(brightness[0], >, 1.6 * brightness[2]);
}

static void reverse(GPtrArray *list)
{
  for (guint i = 0; i < list->len / 2; i++) {
    gpointer swap = list->pdata[i];
    list->pdata[i] = list->pdata[list->len - 1 - i];
    list->pdata[list->len - 1 - i] = swap;
  }
}

/* Frames that overlap must show the same nuclei at the same places, whichever of them lies on top. */
static void overlaps_agree(void)
{
  FakeDishSettings s = fake_dish_defaults();
  s.overlap_frac = 0.4;
  s.camera_rad = 0.12;
  g_autoptr(FakeDish) dish = fake_dish_new(&s);
  AwMapContent content = content_of(dish);
  content.nuclei = NULL;
  content.n_tour = 0;
  cairo_surface_t *first = draw(&content);
  reverse(dish->frames);
  cairo_surface_t *second = draw(&content);
  double n = 0, sum = 0;
  for (int y = 120; y < 600; y++)
    for (int x = 120; x < 600; x++) {
      sum += fabs(grey(first, x, y) - grey(second, x, y));
      n++;
    }
  g_test_message("mean difference %g", sum / n);
  g_assert_cmpfloat(sum / n, <, 3); /* 2.4 from noise and frame numbers; 4.2 with frames 1 % apart, 6.6 when mirrored */
  cairo_surface_destroy(first);
  cairo_surface_destroy(second);
}

static gsize not_white(cairo_surface_t *page)
{
  gsize n = 0;
  for (int y = 0; y < H; y++)
    for (int x = 0; x < W; x++)
      n += grey(page, x, y) < 250;
  return n;
}

/* The pictures of poor content must still be drawn: no tour, nuclei, pictures, states, frames, titles. */
static void empty_states(void)
{
  g_autoptr(FakeDish) dish = pattern(0.1, FALSE);
  AwMapContent content = content_of(dish);
  for (int i = 0; i < 6; i++) {
    if (i == 1)
      content.n_tour = 0, content.tour = NULL;
    if (i == 2)
      content.state = NULL;
    if (i == 3)
      content.nuclei = NULL;
    if (i == 4)
      content.title = content.subtitle = NULL;
    if (i == 5)
      content.frames = NULL;
    cairo_surface_t *page = draw(&content);
    g_assert_cmpuint(not_white(page), >, 50000);
    cairo_surface_destroy(page);
  }
}

static void mad_numbers(void)
{
  g_autoptr(FakeDish) dish = pattern(0, FALSE);
  static const double mad[] = { NAN, INFINITY, -INFINITY, 1e300, -1e9, 0 };
  for (gsize i = 0; i < G_N_ELEMENTS(mad); i++) {
    AwNucleus *n = fake_dish_add(dish, (AwScanPoint){ mad[i], 0 }, 10, 10, 0);
    n->diameter = mad[i];
    n = fake_dish_add(dish, (AwScanPoint){ 0, 0 }, 10, 10, 0);
    n->outline[3].y_um = mad[i];
    g_array_append_val(dish->tour, n->id);
    AwFrame *frame = g_new0(AwFrame, 1);
    frame->stage = (AwScanPoint){ 0, mad[i] };
    frame->width_px = i % 2 ? 100 : -1;
    frame->height_px = 100;
    frame->overview = g_bytes_new_static("not a picture, though it is long enough", 39);
    g_ptr_array_add(dish->frames, frame);
  }
  g_free(dish->state);
  dish->state = g_new(AwState, dish->nuclei->len);
  memset(dish->state, 0x7f, dish->nuclei->len * sizeof(AwState));
  AwMapContent content = content_of(dish);
  content.title = "bad \xff\xfe bytes <b>& \n\n lines";
  cairo_surface_t *page = draw(&content);
  g_assert_cmpuint(not_white(page), >, 2000);
  cairo_surface_destroy(page);
}

/* A pixel map that cannot be inverted places nothing and says so on a light ground. */
static void useless_map(void)
{
  g_autoptr(FakeDish) dish = pattern(0, FALSE);
  static const AwMatrix maps[] = { { 0, 0, 0, 0 }, { 1, 2, 2, 4 }, { NAN, 0, 0, 1 }, { INFINITY, 0, 0, 1 } };
  for (gsize i = 0; i < G_N_ELEMENTS(maps); i++) {
    AwMapContent content = content_of(dish);
    content.map.um_per_px = maps[i];
    cairo_surface_t *page = draw(&content);
    g_assert_cmpfloat_with_epsilon(grey(page, 300, 200), 243, 3);
    cairo_surface_destroy(page);
  }
}

/* The tour's start, a white disc, stands on its first stop: the middle of a known nucleus. */
static void tour_starts_at_first(void)
{
  g_autoptr(FakeDish) dish = pattern(0, FALSE);
  gint64 ids[] = { 3, 99, 1 }; /* 99 does not exist and is passed over */
  g_array_append_vals(dish->tour, ids, 3);
  AwMapContent content = content_of(dish);
  cairo_surface_t *page = draw(&content);
  AwPixelPoint corner = middle_of_ink(page, AW_STATE_PROPOSED);
  content.n_tour = 0;
  cairo_surface_t *bare = draw(&content);
  AwPixelPoint first = middle_of_ink(bare, AW_STATE_REJECTED), last = middle_of_ink(bare, AW_STATE_ACCEPTED);
  g_assert_cmpfloat(grey(page, first.x_px, first.y_px), >, 250);
  g_assert_cmpfloat(grey(page, last.x_px, last.y_px), >, 250);
  g_assert_cmpfloat(grey(page, corner.x_px + 20, corner.y_px), <, 200);
  g_assert_cmpfloat(grey(page, (first.x_px + last.x_px) / 2, (first.y_px + last.y_px) / 2), >, 180);
  cairo_surface_destroy(page);
  cairo_surface_destroy(bare);
}

static char *written(const AwMapContent *content, const char *path, gsize *n)
{
  char *bytes = NULL;
  GError *error = NULL;
  g_assert_true(aw_map_write(content, path, 640, 480, &error));
  g_assert_true(g_file_get_contents(path, &bytes, n, NULL));
  g_remove(path);
  return bytes;
}

/* Same content, same bytes: a second time in one process, and where the decimal point is a comma. */
static void same_bytes(void)
{
  static const char *const names[] = { "map.png", "map.svg", "map.pdf" };
  FakeDishSettings s = fake_dish_defaults();
  s.n_nuclei = 60;
  s.overview_px = 64;
  g_autoptr(FakeDish) dish = fake_dish_new(&s);
  AwMapContent content = content_of(dish);
  g_autofree char *folder = g_dir_make_tmp("aimwell-map-XXXXXX", NULL);
  for (gsize i = 0; i < G_N_ELEMENTS(names); i++) {
    gsize n_first = 0, n_second = 0;
    g_autofree char *path = g_build_filename(folder, names[i], NULL);
    g_autofree char *first = written(&content, path, &n_first);
    gboolean comma = setlocale(LC_ALL, "de_DE.UTF-8") != NULL;
    g_autofree char *second = written(&content, path, &n_second);
    setlocale(LC_ALL, "C");
    g_test_message("%s: %s", names[i], comma ? "with a decimal comma too" : "no locale with a decimal comma here");
    g_assert_cmpmem(first, n_first, second, n_second);
  }
  g_rmdir(folder);
}

static void unknown_ending(void)
{
  AwMapContent content = { .title = "test" };
  GError *error = NULL;
  g_assert_false(aw_map_write(&content, "map.bmp", 640, 480, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED);
  g_error_free(error);
}

/* 20,000 nuclei and a tour through a third of them, at the size of a poster. */
static void many_nuclei(void)
{
  FakeDishSettings s = fake_dish_defaults();
  s.n_across = s.n_down = 10;
  s.overview_px = 0;
  s.n_nuclei = 20000;
  g_autoptr(FakeDish) dish = fake_dish_new(&s);
  AwMapContent content = content_of(dish);
  cairo_surface_t *page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, 2400, 1800);
  cairo_t *cr = cairo_create(page);
  g_test_timer_start();
  aw_map_draw(&content, cr, 2400, 1800);
  g_assert_cmpfloat(g_test_timer_elapsed(), <, 20); /* a second on a quiet machine */
  cairo_destroy(cr);
  cairo_surface_destroy(page);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/figures/map/handedness", handedness);
  g_test_add_func("/figures/map/truth_of_sample", truth_of_sample);
  g_test_add_func("/figures/map/overlaps_agree", overlaps_agree);
  g_test_add_func("/figures/map/empty_states", empty_states);
  g_test_add_func("/figures/map/mad_numbers", mad_numbers);
  g_test_add_func("/figures/map/useless_map", useless_map);
  g_test_add_func("/figures/map/tour_starts_at_first", tour_starts_at_first);
  g_test_add_func("/figures/map/same_bytes", same_bytes);
  g_test_add_func("/figures/map/unknown_ending", unknown_ending);
  g_test_add_func("/figures/map/many_nuclei", many_nuclei);
  return g_test_run();
}

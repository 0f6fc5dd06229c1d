/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/scan.h"

#include "base/random.h"
#include "image/writer.h"
#include "support/check.h"
#include "support/drawn.h"

#define SIDE 300
#define STEP_UM 240.0

/* A folder of frames of a dish of discs, pixel 1 um, camera as the assumed map says or mirrored in x. */
typedef struct {
  char *folder;
  gsize n;
  AwScanFrame frames[9];
} Dish;

/* Discs on a jittered lattice, in scan um. */
static GArray *lattice(double from, double to, double pitch)
{
  GArray *points = g_array_new(FALSE, FALSE, sizeof(AwScanPoint));
  AwRandom r = aw_random_stream(12, 0);
  for (double y = from; y < to; y += pitch)
    for (double x = from; x < to; x += pitch) {
      AwScanPoint q = { x + 0.4 * pitch * (aw_random_unit(&r) - 0.5), y + 0.4 * pitch * (aw_random_unit(&r) - 0.5) };
      g_array_append_val(points, q);
    }
  return points;
}

static void write_frame(Dish *dish, const AwPixelMap *camera, const GArray *points, AwScanPoint stage)
{
  gsize k = dish->n++;
  g_autoptr(AwImage) image = drawn_image(SIDE, SIDE, AW_SAMPLE_U16, 200);
  for (guint i = 0; i < points->len; i++) {
    AwPixelPoint p =
        aw_scan_to_pixel(camera, stage, aw_frame_centre(SIDE, SIDE), g_array_index(points, AwScanPoint, i));
    /* Sizes differ, as marks are told apart by them too. */
    drawn_disc(image, p.x_px, p.y_px, 7 + 3 * ((i * 37) % 11) / 10.0, 1500, 1);
  }
  drawn_noise(image, 15, k + 1);
  g_autofree char *name = g_strdup_printf("f%d.tif", (int)k);
  char *path = g_build_filename(dish->folder, name, NULL);
  GError *error = NULL;
  aw_image_write_tiff(image, path, 0, &error);
  g_assert_no_error(error);
  dish->frames[k] = (AwScanFrame){ path, 0, -1, SIDE, SIDE, stage };
}

static Dish make_dish(AwMatrix camera_matrix, int n_across, int n_down)
{
  Dish dish = { aw_scratch_new(), 0, { { 0 } } };
  AwPixelMap camera = { camera_matrix, AW_ORIGIN_FITTED, 0 };
  g_autoptr(GArray) points = lattice(-150, 630, 42);
  for (int y = 0; y < n_down; y++)
    for (int x = 0; x < n_across; x++)
      write_frame(&dish, &camera, points, (AwScanPoint){ x * STEP_UM, y * STEP_UM });
  return dish;
}

static void dish_clear(Dish *dish)
{
  for (gsize i = 0; i < dish->n; i++)
    g_free((gpointer)(guintptr)dish->frames[i].path);
  aw_scratch_remove(dish->folder);
}

static const AwScanSettings assumed = {
  .n_threads = 2, .fit_map = TRUE, .pixel_um = 1, .map = { { 1, 0, 0, 1 }, AW_ORIGIN_ASSUMED, 0 }
};

static AwScanResult *scan(const Dish *dish, const AwScanSettings *settings)
{
  GError *error = NULL;
  AwScanResult *result = aw_scan_segment(dish->frames, dish->n, settings, NULL, &error);
  g_assert_no_error(error);
  g_test_message("%s; %u nuclei, %d pairs", result->map_note, result->nuclei->len, (int)result->n_overlap_pairs);
  return result;
}

/* Every disc that some frame shows whole is there once, whole; discs beyond all frames are not. */
static void check_once(const AwScanResult *result, double low, double high, double tolerance)
{
  g_autoptr(GArray) points = lattice(-150, 630, 42);
  guint n_inside = 0;
  for (guint i = 0; i < points->len; i++) {
    AwScanPoint q = g_array_index(points, AwScanPoint, i);
    guint n = 0;
    for (guint k = 0; k < result->nuclei->len; k++) {
      const AwNucleus *a = result->nuclei->pdata[k];
      if (hypot(a->centroid.x_um - q.x_um, a->centroid.y_um - q.y_um) > tolerance)
        continue;
      n++;
      if (MIN(q.x_um, q.y_um) > low + 14 && MAX(q.x_um, q.y_um) < high - 14)
        g_assert_cmpuint(a->flags & AW_FLAG_BORDER, ==, 0);
    }
    if (MIN(q.x_um, q.y_um) > low + 14 && MAX(q.x_um, q.y_um) < high - 14) {
      g_assert_cmpuint(n, ==, 1);
      n_inside++;
    } else {
      g_assert_cmpuint(n, <=, 1);
    }
  }
  g_assert_cmpuint(n_inside, >, 100);
}

static void test_grid_of_frames(void)
{
  double t = 1.5 * G_PI / 180;
  Dish dish = make_dish((AwMatrix){ cos(t), -sin(t), sin(t), cos(t) }, 3, 3);
  g_autoptr(AwScanResult) result = scan(&dish, &assumed);
  g_assert_cmpint(result->map.origin, ==, AW_ORIGIN_FITTED);
  g_assert_cmpfloat_with_epsilon(result->map.um_per_px.yx, sin(t), 0.002);
  check_once(result, -140, 620, 2);
  g_assert_cmpuint(result->n_overlap_pairs, >, 20);
  g_assert_cmpfloat(result->overlap_rms_um, <, 0.3);
  g_assert_cmpuint(result->n_cut_dropped, >, 5);
  for (guint i = 1; i < result->nuclei->len; i++) {
    const AwNucleus *a = result->nuclei->pdata[i - 1], *b = result->nuclei->pdata[i];
    g_assert_true(a->frame < b->frame || (a->frame == b->frame && a->centroid_px.y_px <= b->centroid_px.y_px));
    g_assert_cmpint(b->id, ==, 0);
  }
  dish_clear(&dish);
}

/* Stage readings that are off by some um, as on worn stages: still every nucleus once, and the disagreement is told. */
static void test_readings_off(void)
{
  Dish dish = make_dish((AwMatrix){ 1, 0, 0, 1 }, 3, 3);
  AwRandom r = aw_random_stream(9, 0);
  for (gsize i = 0; i < dish.n; i++) {
    dish.frames[i].stage.x_um += 2 * aw_random_normal(&r);
    dish.frames[i].stage.y_um += 2 * aw_random_normal(&r);
  }
  g_autoptr(AwScanResult) result = scan(&dish, &assumed);
  check_once(result, -140, 620, 8);
  g_assert_cmpfloat(result->overlap_rms_um, >, 1);
  g_assert_cmpfloat(result->overlap_rms_um, <, 5);
  dish_clear(&dish);
}

/* The number of threads changes nothing. */
static void test_threads(void)
{
  Dish dish = make_dish((AwMatrix){ 1, 0, 0, 1 }, 2, 2);
  AwScanSettings one = assumed, three = assumed;
  one.n_threads = 1;
  three.n_threads = 3;
  g_autoptr(AwScanResult) a = scan(&dish, &one);
  g_autoptr(AwScanResult) b = scan(&dish, &three);
  g_assert_cmpuint(a->nuclei->len, ==, b->nuclei->len);
  for (guint i = 0; i < a->nuclei->len; i++) {
    const AwNucleus *p = a->nuclei->pdata[i], *q = b->nuclei->pdata[i];
    g_assert_cmpmem(p->outline, p->n_outline * sizeof *p->outline, q->outline, q->n_outline * sizeof *q->outline);
    g_assert_cmpmem(&p->centroid, sizeof p->centroid, &q->centroid, sizeof q->centroid);
  }
  dish_clear(&dish);
}

static void test_mirrored(void)
{
  Dish dish = make_dish((AwMatrix){ -1, 0, 0, 1 }, 3, 2);
  GError *error = NULL;
  g_assert_null(aw_scan_segment(dish.frames, dish.n, &assumed, NULL, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "x readings of the stage run the other way");
  AwScanSettings entered = assumed;
  entered.fit_map = FALSE;
  entered.map = (AwPixelMap){ { -1, 0, 0, 1 }, AW_ORIGIN_ENTERED, 0 };
  g_autoptr(AwScanResult) result = scan(&dish, &entered);
  g_assert_cmpint(result->map.origin, ==, AW_ORIGIN_ENTERED);
  check_once(result, -140, 380, 2);
  dish_clear(&dish);
}

/* One frame wider than a block: nothing is lost or doubled at the seams. */
static void test_blocks(void)
{
  int w = 4400, h = 160;
  Dish dish = { aw_scratch_new(), 1, { { 0 } } };
  g_autoptr(AwImage) image = drawn_image(w, h, AW_SAMPLE_U16, 200);
  for (int i = 0; i < 102; i++)
    drawn_disc(image, 60 + 42 * i, 40 + 30 * (i % 3), 9 + i % 4, 1500, 1);
  drawn_noise(image, 15, 1);
  char *path = g_build_filename(dish.folder, "wide.tif", NULL);
  GError *error = NULL;
  aw_image_write_tiff(image, path, 0, &error);
  g_assert_no_error(error);
  dish.frames[0] = (AwScanFrame){ path, 0, -1, w, h, { 0, 0 } };
  g_autoptr(AwScanResult) result = scan(&dish, &assumed);
  g_assert_cmpuint(result->nuclei->len, ==, 102);
  AwPixelPoint c = aw_frame_centre(w, h);
  gboolean seen[102] = { 0 };
  for (guint i = 0; i < 102; i++) {
    const AwNucleus *a = result->nuclei->pdata[i];
    int k = (int)floor((a->centroid_px.x_px - 60) / 42 + 0.5);
    g_assert_false(seen[k]);
    seen[k] = TRUE;
    g_assert_cmpfloat_with_epsilon(a->centroid_px.x_px, 60 + 42 * k, 0.5);
    g_assert_cmpfloat_with_epsilon(a->centroid.x_um, c.x_px - a->centroid_px.x_px, 1e-9);
    g_assert_cmpint(a->n_views, ==, 1);
    g_assert_cmpuint(a->flags & AW_FLAG_BORDER, ==, 0);
  }
  g_assert_cmpuint(result->n_overlap_pairs, ==, 0);
  g_assert_true(isnan(result->overlap_rms_um));
  dish_clear(&dish);
}

static void test_empty(void)
{
  Dish dish = { aw_scratch_new(), 0, { { 0 } } };
  AwPixelMap camera = { { 1, 0, 0, 1 }, AW_ORIGIN_FITTED, 0 };
  g_autoptr(GArray) none = g_array_new(FALSE, FALSE, sizeof(AwScanPoint));
  write_frame(&dish, &camera, none, (AwScanPoint){ 0, 0 });
  write_frame(&dish, &camera, none, (AwScanPoint){ 200, 0 });
  g_autoptr(AwScanResult) result = scan(&dish, &assumed);
  g_assert_cmpuint(result->nuclei->len, ==, 0);
  g_assert_nonnull(strstr(result->map_note, "no nucleus"));
  dish_clear(&dish);
}

static void refuse(const Dish *dish, const AwScanSettings *settings, AwProgress *progress, AwErrorCode code,
                   const char *parts)
{
  GError *error = NULL;
  g_assert_null(aw_scan_segment(dish->frames, dish->n, settings, progress, &error));
  aw_check_error(&error, code, parts);
}

static void cancel_when_finding(const char *what, double done_frac, gpointer data)
{
  (void)done_frac;
  if (!strcmp(what, "finding nuclei"))
    aw_progress_cancel(data);
}

static void test_errors(void)
{
  Dish dish = make_dish((AwMatrix){ 1, 0, 0, 1 }, 2, 1);
  AwProgress progress = { .report = cancel_when_finding };
  progress.data = &progress;
  refuse(&dish, &assumed, &progress, AW_ERROR_CANCELLED, "stopped");
  AwScanSettings bad = assumed;
  bad.segment.sensitivity = 3;
  refuse(&dish, &bad, NULL, AW_ERROR_RANGE, "3");
  dish.frames[1].width_px = 200;
  refuse(&dish, &assumed, NULL, AW_ERROR_FORMAT, "f1.tif|300 x 300|200 x 300");
  g_autofree char *missing = g_build_filename(dish.folder, "gone.tif", NULL);
  const char *kept = dish.frames[1].path;
  dish.frames[1].path = missing;
  refuse(&dish, &assumed, NULL, AW_ERROR_NOT_FOUND, "gone.tif");
  dish.frames[1].path = kept;
  dish_clear(&dish);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/scan/grid_of_frames", test_grid_of_frames);
  g_test_add_func("/nuclei/scan/readings_off", test_readings_off);
  g_test_add_func("/nuclei/scan/threads", test_threads);
  g_test_add_func("/nuclei/scan/mirrored", test_mirrored);
  g_test_add_func("/nuclei/scan/blocks", test_blocks);
  g_test_add_func("/nuclei/scan/empty", test_empty);
  g_test_add_func("/nuclei/scan/errors", test_errors);
  return g_test_run();
}

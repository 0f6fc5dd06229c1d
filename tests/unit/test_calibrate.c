/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Calibration steps on a small record: marks in images, refusals, and stored numbers that cannot be read. */
#include <math.h>

#include "image/writer.h"
#include "record/private.h"
#include "steps/calibrate.h"
#include "support/check.h"
#include "support/dish.h"
#include "support/drawn.h"

#define NEAR(a, b, tol) g_assert_cmpfloat_with_epsilon((a), (b), (tol))

typedef struct {
  char *folder, *path;
  AwStepContext context;
} Dish;

/* A record of three frames, A = (.65 .01; -.02 .66), and five nuclei. */
static void set_up(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  dish->folder = aw_scratch_new();
  dish->path = g_build_filename(dish->folder, "dish.dish", NULL);
  dish->context = (AwStepContext){ .who = "ada" };
  AwRecord *record = aw_test_dish_new(dish->folder);
  aw_test_dish_segment(record, 5);
  aw_record_free(record);
}

static void tear_down(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  aw_scratch_remove(dish->folder);
  g_free(dish->path);
}

/* An image of 160 x 120 px with a spot at (x, y). */
static void write_image(const Dish *dish, const char *name, double x, double y)
{
  GError *error = NULL;
  g_autoptr(AwImage) image = drawn_image(160, 120, AW_SAMPLE_U16, 400);
  drawn_disc(image, x, y, 4, 3000, 1);
  drawn_noise(image, 10, 5);
  g_autofree char *path = g_build_filename(dish->folder, name, NULL);
  g_assert_true(aw_image_write_tiff(image, path, 0, &error));
}

static const AwMarkSettings spot = { .diameter_px = 8 };

static AwCalibrateSource table(const Dish *dish, const char *text, const AwMarkSettings *marks, char **path)
{
  *path = aw_scratch_write(dish->folder, "table.csv", text);
  return (AwCalibrateSource){ .table = *path, .marks = marks, .at_unix_s = 1.8e9 };
}

/* The mark moves against the stage by A: S = k + A p. */
static void test_pixel_from_images(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  const double p[4][2] = { { 40, 30 }, { 120, 34 }, { 44, 90 }, { 118, 88 } };
  g_autoptr(GString) text = g_string_new("file,stage_x_um,stage_y_um\n");
  g_autofree char *path = NULL;
  GError *error = NULL;
  for (int i = 0; i < 4; i++) {
    g_autofree char *name = g_strdup_printf("view%d.tif", i);
    write_image(dish, name, p[i][0], p[i][1]);
    g_string_append_printf(text, "%s,%d.%d,%d\n", name, (int)(500 + 0.5 * p[i][0]), 0, (int)(100 + 0.5 * p[i][1]));
  }
  AwCalibrateSource source = table(dish, text->str, &spot, &path);
  g_auto(AwPixelSummary) s = { 0 };
  g_assert_true(aw_step_calibrate_pixel(dish->path, &source, &dish->context, &s, &error));
  NEAR(s.fit.map.um_per_px.xx, 0.5, 2e-3);
  NEAR(s.fit.map.um_per_px.xy, 0, 2e-3);
  NEAR(s.fit.map.um_per_px.yy, 0.5, 2e-3);
  g_assert_true(s.segmented);
}

/* A scan coordinate from an image: q = S - A (p - c). */
static void test_marks_from_images(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  g_autofree char *path = NULL;
  GError *error = NULL;
  write_image(dish, "mark.tif", 99.5, 59.5); /* 20 px right of the centre (79.5, 59.5) */
  AwCalibrateSource source = table(dish,
                                   "name,file,stage_x_um,stage_y_um,beam_x_um,beam_y_um\n"
                                   "a,mark.tif,0,0,0,0\nb,mark.tif,5000,0,5000,0\nc,mark.tif,0,4000,0,4000\n",
                                   &spot, &path);
  const AwMarksSettings settings = { AW_FIT_RIGID, FALSE, 1 };
  g_auto(AwMarksSummary) s = { 0 };
  g_assert_true(aw_step_calibrate_marks(dish->path, &source, &settings, &dish->context, &s, &error));
  NEAR(g_array_index(s.pairs, AwMarkPair, 0).scan.x_um, -0.65 * 20, 0.05);
  NEAR(g_array_index(s.pairs, AwMarkPair, 0).scan.y_um, 0.02 * 20, 0.05);
  NEAR(s.fit.tx_um, 13, 0.05);
  g_assert_cmpstr(s.names->pdata[2], ==, "c");
  g_assert_cmpfloat(s.min_um, <=, s.median_um);
  g_assert_cmpfloat(s.median_um, <=, s.max_um);
}

static const char bead_table[] = "x_um,y_um,n_full,n_degraded\n"
                                 "0,0,99,1\n1,0,90,10\n2,0,80,20\n3,0,90,10\n4,0,99,1\n"
                                 "0,1,90,10\n1,1,40,60\n2,1,20,80\n3,1,40,60\n4,1,90,10\n"
                                 "0,2,80,20\n1,2,20,80\n2,2,4,96\n3,2,20,80\n4,2,80,20\n"
                                 "0,3,90,10\n1,3,40,60\n2,3,20,80\n3,3,40,60\n4,3,90,10\n"
                                 "0,4,99,1\n1,4,90,10\n2,4,80,20\n3,4,90,10\n4,4,99,1\n";

static void test_bead_image(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  g_autofree char *path = NULL, *image = g_build_filename(dish->folder, "bead.tif", NULL);
  GError *error = NULL;
  write_image(dish, "bead.tif", 79.5, 49.5); /* 10 px above the centre */
  AwCalibrateSource source = table(dish, bead_table, &spot, &path);
  const AwBeadScan scan = { .image = image, .reading = { 30, 40 } };
  g_auto(AwBeadSummary) s = { 0 };
  g_assert_true(aw_step_calibrate_bead(dish->path, &source, &scan, &dish->context, &s, &error));
  NEAR(s.fit.centre.bx_um, 2, 1e-3);
  NEAR(s.crosshair.bx_um, 30 + 0.01 * 10, 0.05);
  NEAR(s.crosshair.by_um, 40 + 0.66 * 10, 0.05);
  NEAR(s.offset.x_um, 2 - 30.1, 0.05);
  g_assert_true(isnan(s.drift_um2_per_h));
  const AwBeamPoint crosshair = { 1, 1 };
  const AwBeadScan later = { .crosshair = &crosshair };
  g_auto(AwBeadSummary) second = { 0 };
  source.at_unix_s += 3600;
  g_assert_true(aw_step_calibrate_bead(dish->path, &source, &later, &dish->context, &second, &error));
  g_assert_cmpfloat(second.drift_um2_per_h, >, 100);
  g_autoptr(AwCalibrationView) view = aw_step_calibrations(dish->path, 1.8e9 + 7200, &error);
  g_assert_no_error(error);
  NEAR(view->now.offset.x_um, 1, 1e-3);
  NEAR(view->budget.check_age_s, 3600, 1e-3);
  g_assert_cmpuint(view->n_targets, ==, 5);
  g_assert_cmpint(view->budget.term[AW_TERM_DRIFT].origin, ==, AW_ORIGIN_FITTED);
}

static void refuse_marks(Dish *dish, const char *text, const AwMarkSettings *marks, AwErrorCode code, const char *words)
{
  g_autofree char *path = NULL;
  GError *error = NULL;
  AwCalibrateSource source = table(dish, text, marks, &path);
  const AwMarksSettings settings = { AW_FIT_SIMILARITY, FALSE, 0 };
  g_auto(AwMarksSummary) s = { 0 };
  g_assert_false(aw_step_calibrate_marks(dish->path, &source, &settings, &dish->context, &s, &error));
  aw_check_error(&error, code, words);
}

static void test_refusals(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  refuse_marks(dish, "file,stage_x_um,stage_y_um,beam_x_um,beam_y_um\na.tif,0,0,0,0\n", NULL, AW_ERROR_NOT_FOUND,
               "scan_x_um and scan_y_um|--mark-px");
  refuse_marks(dish, "file,stage_x_um,stage_y_um,beam_x_um,beam_y_um\na.tif,0,0,0,0\n", &spot, AW_ERROR_NOT_FOUND,
               "a.tif");
  g_autoptr(AwImage) empty = drawn_image(160, 120, AW_SAMPLE_U16, 400);
  drawn_noise(empty, 10, 6);
  g_autofree char *image = g_build_filename(dish->folder, "empty.tif", NULL);
  g_assert_true(aw_image_write_tiff(empty, image, 0, &error));
  refuse_marks(dish, "file,stage_x_um,stage_y_um,beam_x_um,beam_y_um\nempty.tif,0,0,0,0\n", &spot, AW_ERROR_NOT_FOUND,
               "empty.tif: no bright mark");
  refuse_marks(dish, "scan_x_um,scan_y_um,beam_x_um,beam_y_um\n0,0,0,0\n1e9,0,1,0\n", NULL, AW_ERROR_RANGE,
               "line 3, column scan_x_um|1e9|another unit");
  refuse_marks(dish, "scan_x_um,scan_y_um,beam_x_um,beam_y_um\n0,0,0,0\n1,0,1000,0\n0,1,0,1000\n1,1,1000,1001\n", NULL,
               AW_ERROR_RANGE, "scan columns seem to hold mm");
  g_assert_false(aw_step_calibrate_error(dish->path, AW_TERM_STAGE, -1, NAN, &dish->context, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "stage|-1|0 to 1000");
  g_assert_false(aw_step_calibrate_error("nowhere.dish", AW_TERM_STAGE, 1, NAN, &dish->context, &error));
  g_clear_error(&error);
  g_assert_null(aw_step_calibrations("nowhere.dish", NAN, &error));
  g_clear_error(&error);
  g_autoptr(AwCalibrationView) view = aw_step_calibrations(dish->path, NAN, &error);
  g_assert_cmpuint(view->calibrations->len, ==, 0);
}

/* Numbers in the record that are no numbers are refused by the number of the calibration. */
static void test_damaged(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  static const char *const rows[][2] = { { "pixel", "[pixel]\nn=9\n" },
                                         { "marks", "[marks]\nfit=rigid\nn=3\nmark-1=1 2 3\n" },
                                         { "marks", "[marks]\nfit=round\nn=3\n" },
                                         { "bead", "[offset]\nx-um=1\n" },
                                         { "edge-x", "[edge]\nsigma-um=wide\n" },
                                         { "error-stage", "[error]\n" },
                                         { "beam", "[beam]\n" },
                                         { "beam", "no key file" } };
  for (gsize i = 0; i < G_N_ELEMENTS(rows); i++) {
    GError *error = NULL;
    char empty[] = "";
    g_autofree char *kind = g_strdup(rows[i][0]), *text = g_strdup(rows[i][1]);
    const AwCalibration one = { 0, kind, 1e9 + (double)i, empty, empty, AW_ORIGIN_FITTED, text };
    AwRecord *record = aw_record_open(dish->path, AW_RECORD_WRITE, &error);
    g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_add_calibration(record, &one, &error) &&
                  aw_record_commit(record, "spoil", &error));
    g_auto(AwCalibrated) c = { 0 };
    g_assert_false(aw_calibrated_read(record, &c, &error));
    g_test_message("%s: %s", text, error ? error->message : "no error");
    g_assert_nonnull(error);
    g_clear_error(&error);
    g_assert_true(aw_record_undo(record, "ada", NULL, &error));
    aw_record_free(record);
  }
}

static gboolean refuse_to_draw(gpointer data, GError **error)
{
  (void)data;
  g_set_error_literal(error, AW_ERROR, AW_ERROR_IO, "no paper");
  return FALSE;
}

/* What is drawn before the commit decides with it: nothing is stored when it fails. */
static void test_before_commit(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  g_autofree char *path = NULL;
  GError *error = NULL;
  AwCalibrateSource source = table(dish, bead_table, NULL, &path);
  source.before_commit = refuse_to_draw;
  const AwBeadScan scan = { 0 };
  g_auto(AwBeadSummary) s = { 0 };
  g_assert_false(aw_step_calibrate_bead(dish->path, &source, &scan, &dish->context, &s, &error));
  aw_check_error(&error, AW_ERROR_IO, "no paper");
  g_autoptr(AwCalibrationView) view = aw_step_calibrations(dish->path, NAN, &error);
  g_assert_cmpuint(view->calibrations->len, ==, 0);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_test_use_memory();
#define ADD(name, fn) g_test_add("/steps/calibrate/" name, Dish, NULL, set_up, fn, tear_down)
  ADD("pixel-from-images", test_pixel_from_images);
  ADD("marks-from-images", test_marks_from_images);
  ADD("bead-image", test_bead_image);
  ADD("refusals", test_refusals);
  ADD("damaged", test_damaged);
  ADD("before-commit", test_before_commit);
  return g_test_run();
}

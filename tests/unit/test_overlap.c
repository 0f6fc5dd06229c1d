/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/overlap.h"

#include "base/random.h"
#include "support/check.h"

/* A dish of random marks seen by frames through a true map; what the fit is told may differ from the truth. */
typedef struct {
  int n_across, n_down, side_px;
  double step_um;    /* between frames */
  AwMatrix truth;    /* um per px */
  double noise_px;   /* of each centroid, per axis */
  double reading_um; /* error of each stage reading, per axis */
  double density;    /* marks per frame */
} Scene;

typedef struct {
  AwOverlapFrame *frames;
  gsize n;
} Shot;

static const Scene plain = { 3, 3, 1000, 570, { 0.65, 0, 0, 0.65 }, 0.3, 0.4, 90 };

static Scene turned(double degrees, double scale)
{
  Scene s = plain;
  double t = degrees * G_PI / 180;
  s.truth = (AwMatrix){ scale * cos(t), -scale * sin(t), scale * sin(t), scale * cos(t) };
  return s;
}

static gsize marks_in_frame(const Scene *s, AwRandom *r, const double *dish, gsize n_dish, AwScanPoint stage,
                            AwOverlapMark *marks)
{
  AwPixelMap map = { s->truth, AW_ORIGIN_FITTED, 0 };
  AwPixelPoint c = aw_frame_centre(s->side_px, s->side_px);
  gsize n = 0;
  for (gsize i = 0; i < n_dish; i++) {
    AwPixelPoint p = aw_scan_to_pixel(&map, stage, c, (AwScanPoint){ dish[3 * i], dish[3 * i + 1] });
    if (p.x_px < 12 || p.y_px < 12 || p.x_px > s->side_px - 13 || p.y_px > s->side_px - 13)
      continue;
    if (aw_random_unit(r) < 0.05) /* missed in this frame */
      continue;
    p.x_px += s->noise_px * aw_random_normal(r);
    p.y_px += s->noise_px * aw_random_normal(r);
    marks[n++] = (AwOverlapMark){ p, dish[3 * i + 2] * (1 + 0.03 * aw_random_normal(r)) };
  }
  return n;
}

static Shot shoot(const Scene *s, guint64 seed)
{
  AwRandom r = aw_random_stream(seed, 1);
  double um = s->side_px * sqrt(fabs(aw_matrix_det(s->truth)));
  double width = um * 1.5 + s->step_um * (s->n_across - 1), height = um * 1.5 + s->step_um * (s->n_down - 1);
  gsize n_dish = (gsize)(s->density * width * height / (um * um)), f = 0;
  g_autofree double *dish = g_new(double, 3 * n_dish + 1);
  for (gsize i = 0; i < n_dish; i++) {
    dish[3 * i] = width * aw_random_unit(&r) - um * 0.75;
    dish[3 * i + 1] = height * aw_random_unit(&r) - um * 0.75;
    dish[3 * i + 2] = 250 + 400 * aw_random_unit(&r);
  }
  Shot shot = { g_new0(AwOverlapFrame, s->n_across * s->n_down), (gsize)(s->n_across * s->n_down) };
  for (int y = 0; y < s->n_down; y++)
    for (int x = 0; x < s->n_across; x++, f++) {
      AwScanPoint stage = { x * s->step_um, y * s->step_um };
      AwOverlapMark *marks = g_new(AwOverlapMark, n_dish + 1);
      gsize n = marks_in_frame(s, &r, dish, n_dish, stage, marks);
      stage.x_um += s->reading_um * aw_random_normal(&r);
      stage.y_um += s->reading_um * aw_random_normal(&r);
      shot.frames[f] = (AwOverlapFrame){ stage, s->side_px, s->side_px, marks, n };
    }
  return shot;
}

static void shot_free(Shot shot)
{
  for (gsize f = 0; f < shot.n; f++)
    g_free((gpointer)(guintptr)shot.frames[f].marks);
  g_free(shot.frames);
}

static const AwPixelMap assumed = { { 0.65, 0, 0, 0.65 }, AW_ORIGIN_ASSUMED, 0 };

static void check_fitted(Scene s, guint64 seed)
{
  Shot shot = shoot(&s, seed);
  GError *error = NULL;
  g_auto(AwOverlapFit) fit = { 0 };
  g_assert_true(aw_overlap_fit(shot.frames, shot.n, &assumed, AW_OVERLAP_FIT, &fit, &error));
  g_assert_no_error(error);
  g_test_message("%s", fit.note);
  g_assert_cmpint(fit.map.origin, ==, AW_ORIGIN_FITTED);
  double side = s.side_px;
  /* What a wrong A does at the far end of a frame: below two thirds of a pixel. */
  g_assert_cmpfloat(hypot(fit.map.um_per_px.xx - s.truth.xx, fit.map.um_per_px.yx - s.truth.yx) * side, <, 0.8);
  g_assert_cmpfloat(hypot(fit.map.um_per_px.xy - s.truth.xy, fit.map.um_per_px.yy - s.truth.yy) * side, <, 0.8);
  g_assert_cmpfloat(fit.map.rms_um, <, 1.5);
  g_assert_cmpfloat(fit.map.rms_um, >, 0.1);
  g_assert_cmpuint(fit.n_frame_pairs, >=, 8);
  shot_free(shot);
}

static void test_turned(void)
{
  for (guint64 seed = 0; seed < 3; seed++) {
    check_fitted(turned(3, 0.65), seed);
    check_fitted(turned(-6, 0.68), seed);
  }
}

/* Narrow overlaps with few nuclei: 8 % of a frame of 60. */
static void test_sparse(void)
{
  for (guint64 seed = 0; seed < 3; seed++) {
    Scene s = turned(2, 0.65);
    s.density = 60;
    s.step_um = 600;
    check_fitted(s, seed);
  }
}

/* Thousands of marks per frame, as on confluent dishes. */
static void test_dense(void)
{
  Scene s = turned(1.5, 0.65);
  s.density = 1200;

  s.side_px = 2000;
  s.step_um = 1170;
  check_fitted(s, 3);
}

static void check_refused(Scene s, const AwPixelMap *start, AwOverlapMode mode, const char *parts)
{
  for (guint64 seed = 0; seed < 2; seed++) {
    Shot shot = shoot(&s, seed);
    GError *error = NULL;
    g_auto(AwOverlapFit) fit = { 0 };
    if (aw_overlap_fit(shot.frames, shot.n, start, mode, &fit, &error))
      g_error("seed %d is not refused: %s", (int)seed, fit.note);
    g_test_message("%s", error->message);
    aw_check_error(&error, AW_ERROR_RANGE, parts);
    shot_free(shot);
  }
}

static void test_mirrored(void)
{
  Scene s = plain;
  s.truth = (AwMatrix){ -0.65, 0, 0, 0.65 };
  check_refused(s, &assumed, AW_OVERLAP_FIT, "assumed|the x readings of the stage run the other way|-0.6");
  s.truth = (AwMatrix){ 0.65, 0.01, 0, -0.65 };
  check_refused(s, &assumed, AW_OVERLAP_FIT, "the y readings of the stage run the other way");
  s.truth = (AwMatrix){ -0.65, 0, 0, -0.65 };
  check_refused(s, &assumed, AW_OVERLAP_FIT, "both readings");
  s.truth = (AwMatrix){ 0, 0.65, 0.65, 0 };
  check_refused(s, &assumed, AW_OVERLAP_FIT, "exchanged");
  s.truth = (AwMatrix){ 0, -0.65, 0.65, 0 };
  check_refused(s, &assumed, AW_OVERLAP_FIT, "camera is turned by 90 degrees");
}

static void test_pixel_size(void)
{
  Scene s = turned(1, 1.3);
  s.step_um = 1140;
  check_refused(s, &assumed, AW_OVERLAP_FIT, "pixel size is 1.|instead of 0.6500 um (2.0|binning");
  AwPixelMap entered = { { 0.65, 0, 0, 0.65 }, AW_ORIGIN_ENTERED, 0 };
  check_refused(s, &entered, AW_OVERLAP_CHECK, "entered pixel map|(2.0");
}

/* An entered map is kept when it agrees and refused when nuclei would miss their partners. */
static void test_entered(void)
{
  Scene s = turned(0.1, 0.65);
  AwPixelMap entered = { { 0.65, 0, 0, 0.65 }, AW_ORIGIN_ENTERED, 0 };
  Shot shot = shoot(&s, 5);
  GError *error = NULL;
  g_auto(AwOverlapFit) fit = { 0 };
  g_assert_true(aw_overlap_fit(shot.frames, shot.n, &entered, AW_OVERLAP_CHECK, &fit, &error));
  g_assert_no_error(error);
  g_assert_cmpint(fit.map.origin, ==, AW_ORIGIN_ENTERED);
  g_assert_cmpfloat(fit.map.um_per_px.xy, ==, 0);
  g_assert_nonnull(strstr(fit.note, "kept as entered"));
  shot_free(shot);
  check_refused(turned(4, 0.65), &entered, AW_OVERLAP_CHECK, "camera is turned by 4.0 degrees|entered pixel map");
}

static void check_assumed(Scene s, guint64 seed, const char *part)
{
  Shot shot = shoot(&s, seed);
  GError *error = NULL;
  g_auto(AwOverlapFit) fit = { 0 };
  g_assert_true(aw_overlap_fit(shot.frames, shot.n, &assumed, AW_OVERLAP_FIT, &fit, &error));
  g_assert_no_error(error);
  g_assert_cmpint(fit.map.origin, ==, AW_ORIGIN_ASSUMED);
  g_assert_cmpfloat(fit.map.um_per_px.xx, ==, 0.65);
  g_assert_cmpuint(fit.n_marks, ==, 0);
  if (!strstr(fit.note, part))
    g_error("\"%s\" lacks \"%s\"", fit.note, part);
  shot_free(shot);
}

static void test_single_row(void)
{
  Scene s = turned(1, 0.65);
  s.n_down = 1;
  s.n_across = 6;
  for (guint64 seed = 0; seed < 4; seed++)
    check_assumed(s, seed, "one line");
  s.truth = (AwMatrix){ -0.65, 0, 0, 0.65 };
  check_refused(s, &assumed, AW_OVERLAP_FIT, "one line|run the other way");
}

static void test_no_overlaps(void)
{
  Scene s = plain;
  s.step_um = 900;
  for (guint64 seed = 0; seed < 8; seed++)
    check_assumed(s, seed, "too few nuclei");
  s.density = 1200;
  check_assumed(s, 9, "too few nuclei");
}

static void test_nothing(void)
{
  Scene s = plain;
  s.density = 0;
  check_assumed(s, 1, "no nucleus");
  s.density = 90;
  s.n_across = s.n_down = 1;
  check_assumed(s, 1, "one frame");
}

/* Spots that stay with the camera must not be taken for marks that stay with the dish. */
static void test_dust(void)
{
  Scene s = plain;
  s.density = 25;
  s.step_um = 900;
  Shot shot = shoot(&s, 2);
  AwRandom r = aw_random_stream(77, 0);
  AwPixelPoint dust[30];
  for (int k = 0; k < 30; k++)
    dust[k] = (AwPixelPoint){ 900 * aw_random_unit(&r), 900 * aw_random_unit(&r) };
  for (gsize f = 0; f < shot.n; f++) {
    AwOverlapMark *more = g_new(AwOverlapMark, shot.frames[f].n_marks + 30);
    memcpy(more, shot.frames[f].marks, shot.frames[f].n_marks * sizeof *more);
    for (gsize k = 0; k < 30; k++)
      more[shot.frames[f].n_marks++] = (AwOverlapMark){ dust[k], 300 };
    g_free((gpointer)(guintptr)shot.frames[f].marks);
    shot.frames[f].marks = more;
  }
  g_auto(AwOverlapFit) fit = { 0 };
  g_assert_true(aw_overlap_fit(shot.frames, shot.n, &assumed, AW_OVERLAP_FIT, &fit, NULL));
  g_assert_cmpint(fit.map.origin, ==, AW_ORIGIN_ASSUMED);
  shot_free(shot);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/geometry/overlap/turned", test_turned);
  g_test_add_func("/geometry/overlap/sparse", test_sparse);
  g_test_add_func("/geometry/overlap/dense", test_dense);
  g_test_add_func("/geometry/overlap/mirrored", test_mirrored);
  g_test_add_func("/geometry/overlap/pixel_size", test_pixel_size);
  g_test_add_func("/geometry/overlap/entered", test_entered);
  g_test_add_func("/geometry/overlap/single_row", test_single_row);
  g_test_add_func("/geometry/overlap/no_overlaps", test_no_overlaps);
  g_test_add_func("/geometry/overlap/nothing", test_nothing);
  g_test_add_func("/geometry/overlap/dust", test_dust);
  return g_test_run();
}

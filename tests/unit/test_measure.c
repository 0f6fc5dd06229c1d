/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/measure.h"

#include "base/random.h"
#include "geometry/outline.h"
#include "nuclei/runs.h"
#include "nuclei/shape.h"
#include "support/check.h"
#include "support/drawn.h"

static void assert_near(double a, double b, double tolerance)
{
  g_assert_cmpfloat_with_epsilon(a, b, tolerance);
}

static AwLabels *labels_from(const char *const *rows, int n_rows)
{
  AwLabels *labels = aw_labels_new((int)strlen(rows[0]), n_rows, NULL);
  for (int y = 0; y < n_rows; y++)
    for (int x = 0; x < labels->width_px; x++) {
      guint32 k = rows[y][x] == '.' ? 0 : (guint32)(rows[y][x] - '0');
      labels->label[y * labels->width_px + x] = k;
      labels->n_labels = MAX(labels->n_labels, k);
    }
  return labels;
}

static GPtrArray *measure(const AwImage *image, const AwLabels *labels)
{
  GError *error = NULL;
  AwPlacement loose = aw_placement_loose(image->width_px, image->height_px);
  GPtrArray *nuclei = aw_measure_nuclei(image, labels, NULL, &loose, aw_saturation_level(image), &error);
  g_assert_no_error(error);
  return nuclei;
}

/* Hand-counted: 3 + 4 + 1 pixels with a hole of one in the middle. */
static void test_shape(void)
{
  static const char *const rows[] = { ".......", "..111..", "..1.11.", "...1...", "......." };
  g_autoptr(AwLabels) labels = labels_from(rows, 5);
  g_autoptr(AwRunTable) table = aw_run_table_new(labels, NULL);
  g_assert_cmpuint(table->first[2] - table->first[1], ==, 4);
  AwMoments m = aw_runs_moments(table->runs, 4);
  g_assert_cmpint(m.n_px, ==, 7);
  assert_near(m.x_px, (2 + 3 + 4 + 2 + 4 + 5 + 3) / 7.0, 1e-12);
  assert_near(m.y_px, (3 * 1 + 3 * 2 + 3) / 7.0, 1e-12);
  g_assert_false(aw_runs_are_plain(table->runs, 4));
  AwRect box = aw_runs_box(table->runs, 4);
  g_assert_cmpint(box.x0, ==, 2);
  g_assert_cmpint(box.x1, ==, 6);
  g_assert_cmpint(box.y1, ==, 4);
}

/* The hull of an L of 5 + 4 pixels: the diagonal from (0.5, 0) half steps takes in the triangle between the arms. */
static void test_hull(void)
{
  AwRun bar[1] = { { 4, 10, 17 } };
  g_assert_cmpint(aw_runs_hull_px(bar, 1), ==, 7);
  AwRun ell[3] = { { 0, 0, 1 }, { 1, 0, 1 }, { 2, 0, 3 } };
  g_assert_cmpint(aw_runs_hull_px(ell, 3), ==, 6); /* (1, 1) joins, (1, 0) and (2, 0), (2, 1) do not */
  AwRun gap[2] = { { 0, 0, 2 }, { 4, 0, 2 } };
  g_assert_cmpint(aw_runs_hull_px(gap, 2), ==, 10);
}

static void test_ellipse_map(void)
{
  double major = 0, minor = 0, angle = 0;
  aw_ellipse_from_covariance(4, 0, 1, &major, &minor, &angle);
  assert_near(major, 8, 1e-12);
  assert_near(minor, 4, 1e-12);
  assert_near(angle, 0, 1e-12);
  double t = 30 * G_PI / 180;
  AwMatrix turn = { 0.5 * cos(t), -0.5 * sin(t), 0.5 * sin(t), 0.5 * cos(t) };
  aw_ellipse_map(turn, &major, &minor, &angle);
  assert_near(major, 4, 1e-12);
  assert_near(minor, 2, 1e-12);
  assert_near(angle, t, 1e-12);
  AwMatrix mirror = { -1, 0, 0, 1 };
  aw_ellipse_map(mirror, &major, &minor, &angle);
  assert_near(angle, -t, 1e-12);
}

static void test_light(void)
{
  g_autoptr(AwImage) image = drawn_image(120, 100, AW_SAMPLE_U16, 200);
  g_autoptr(AwLabels) labels = aw_labels_new(120, 100, NULL);
  DrawnBlob sharp = { 35, 40, 24, 24, 0, 1000, 0.8 }, soft = { 85, 50, 24, 24, 0, 500, 3 };
  drawn_blob(image, sharp);
  drawn_blob(image, soft);
  drawn_label(labels, sharp, 1);
  drawn_label(labels, soft, 2);
  g_autoptr(GPtrArray) nuclei = measure(image, labels);
  const AwNucleus *a = nuclei->pdata[0], *b = nuclei->pdata[1];
  assert_near(a->background, 200, 1.5);
  assert_near(b->background, 200, 15); /* its blurred rim reaches into the ring */
  assert_near(a->integrated, 1000 * a->area, 0.05 * 1000 * a->area);
  /* The fall of an edge blurred by sigma over the pixel around it: erf (0.5 px / (sigma sqrt 2)) of its height. Pixels
   * and the interpolation between them add 1/12 and about 1/6 px2 to the blur. */
  double s1 = sqrt(0.8 * 0.8 + 0.25), s2 = sqrt(3 * 3 + 0.25);
  assert_near(a->sharpness * (a->mean - a->background) / 1000, erf(0.5 / (s1 * G_SQRT2)), 0.05);
  assert_near(b->sharpness * (b->mean - b->background) / 500, erf(0.5 / (s2 * G_SQRT2)), 0.01);
  g_assert_cmpuint(a->flags, ==, 0);
  assert_near(a->area_ratio, 1, 0.01);
  assert_near(a->isolation, b->isolation, 1e-12);
  assert_near(a->isolation, hypot(50, 10) - 24, 0.65);
  assert_near(a->centroid.x_um, a->centroid_px.x_px, 1e-12);
}

/* A nucleus in a ring of other masks takes the others' background; alone on a full image, the smallest value. */
static void test_no_free_ring(void)
{
  g_autoptr(AwImage) image = drawn_image(60, 60, AW_SAMPLE_U16, 300);
  g_autoptr(AwLabels) labels = aw_labels_new(60, 60, NULL);
  for (int i = 0; i < 3600; i++)
    labels->label[i] = 1;
  labels->n_labels = 1;
  drawn_set(image, 5, 5, 120);
  g_autoptr(GPtrArray) full = measure(image, labels);
  const AwNucleus *a = full->pdata[0];
  assert_near(a->background, 120, 1e-9);
  assert_near(a->convexity, 1, 1e-12);
  for (int i = 0; i < 3600; i++) {
    int x = i % 60 - 30, y = i / 60 - 20;
    labels->label[i] = i == 3599 ? 3 : x * x + y * y < 25 ? 1 : y < 35 ? 2 : 0;
  }
  labels->n_labels = 3;
  g_autoptr(GPtrArray) nuclei = measure(image, labels);
  a = nuclei->pdata[0];
  assert_near(a->background, 300, 1e-9);
  g_assert_cmpuint(a->flags, ==, AW_FLAG_TOUCHING);
  assert_near(a->isolation, 0, 1e-12);
}

static void test_flags(void)
{
  static const char *const rows[] = { "11......", "11..22..", "....2233", "........",
                                      ".4......", "........", "......5.", "........" };
  g_autoptr(AwLabels) labels = labels_from(rows, 8);
  g_autoptr(AwImage) image = drawn_image(8, 8, AW_SAMPLE_U8, 10);
  drawn_set(image, 1, 4, 255);
  g_autoptr(GPtrArray) nuclei = measure(image, labels);
  static const guint want[] = { AW_FLAG_BORDER, AW_FLAG_TOUCHING, AW_FLAG_TOUCHING | AW_FLAG_BORDER, AW_FLAG_SATURATED,
                                0 };
  for (guint i = 0; i < 5; i++) {
    const AwNucleus *a = nuclei->pdata[i];
    g_assert_cmpuint(a->flags & ~(guint)AW_FLAG_DEFOCUSED, ==, want[i]);
  }
}

static void test_defocused(void)
{
  g_autoptr(AwImage) image = drawn_image(400, 60, AW_SAMPLE_U16, 100);
  g_autoptr(AwLabels) labels = aw_labels_new(400, 60, NULL);
  for (guint32 k = 0; k < 8; k++) {
    DrawnBlob blob = { 25 + 50 * k, 30, 22, 22, 0, 2000, k == 5 ? 5 : 1 };
    drawn_blob(image, blob);
    drawn_label(labels, blob, k + 1);
  }
  g_autoptr(GPtrArray) nuclei = measure(image, labels);
  for (guint k = 0; k < 8; k++) {
    const AwNucleus *a = nuclei->pdata[k];
    g_assert_cmpuint(a->flags, ==, k == 5 ? AW_FLAG_DEFOCUSED : 0);
  }
}

/* A rotated, scaled map and a block offset: everything in scan um as design.md section 2 says. */
static void test_placement(void)
{
  g_autoptr(AwImage) image = drawn_image(100, 80, AW_SAMPLE_U16, 100);
  g_autoptr(AwLabels) labels = aw_labels_new(100, 80, NULL);
  DrawnBlob blob = { 60, 30, 30, 14, 0.35, 2000, 1 };
  drawn_blob(image, blob);
  drawn_label(labels, blob, 1);
  double t = 3 * G_PI / 180, s = 0.65;
  AwPlacement place = { .map = { .um_per_px = { s * cos(t), -s * sin(t), s * sin(t), s * cos(t) } },
                        .stage = { 1000, 2000 },
                        .centre = aw_frame_centre(1000, 900),
                        .x_offset_px = 500,
                        .y_offset_px = 300,
                        .frame_width_px = 1000,
                        .frame_height_px = 900 };
  GError *error = NULL;
  g_autoptr(GPtrArray) placed = aw_measure_nuclei(image, labels, NULL, &place, 0, &error);
  g_assert_no_error(error);
  g_autoptr(GPtrArray) loose = measure(image, labels);
  const AwNucleus *a = placed->pdata[0], *b = loose->pdata[0];
  assert_near(a->centroid_px.x_px, b->centroid_px.x_px + 500, 1e-9);
  AwScanPoint q = aw_pixel_to_scan(&place.map, place.stage, place.centre, a->centroid_px);
  assert_near(a->centroid.x_um, q.x_um, 1e-9);
  assert_near(a->area, b->area * s * s, 1e-9);
  assert_near(a->major, b->major * s, 1e-9);
  assert_near(a->angle_rad, b->angle_rad + t, 1e-9);
  assert_near(b->angle_rad, 0.35, 0.02);
  assert_near(aw_outline_area(a->outline, a->n_outline), a->area, 1e-6);
  AwScanPoint c = aw_outline_centroid(a->outline, a->n_outline);
  assert_near(hypot(c.x_um - q.x_um, c.y_um - q.y_um), 0, 1e-6);
  g_assert_cmpint(a->runs[0].y, ==, b->runs[0].y + 300);
  assert_near(a->sharpness, b->sharpness / s, 1e-9);
  g_assert_cmpuint(a->flags, ==, 0);
}

static void test_bad_labels(void)
{
  static const char *const rows[] = { "...", ".3.", "1.." };
  g_autoptr(AwLabels) labels = labels_from(rows, 3);
  g_autoptr(AwImage) image = drawn_image(3, 3, AW_SAMPLE_U8, 10);
  AwPlacement loose = aw_placement_loose(3, 3);
  GError *error = NULL;
  g_assert_null(aw_measure_nuclei(image, labels, NULL, &loose, 0, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "label 2 of 3");
  labels->n_labels = 1;
  g_assert_null(aw_measure_nuclei(image, labels, NULL, &loose, 0, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "label 3|1");
}

static void test_empty(void)
{
  g_autoptr(AwLabels) labels = aw_labels_new(5, 4, NULL);
  g_autoptr(AwImage) image = drawn_image(5, 4, AW_SAMPLE_F32, 10);
  g_autoptr(GPtrArray) nuclei = measure(image, labels);
  g_assert_cmpuint(nuclei->len, ==, 0);
}

static void test_saturation_level(void)
{
  g_autoptr(AwImage) image = drawn_image(50, 50, AW_SAMPLE_U16, 3000);
  drawn_noise(image, 50, 1);
  assert_near(aw_saturation_level(image), 0, 1e-9);
  for (int i = 0; i < 20; i++)
    drawn_set(image, i, 3, 4094);
  assert_near(aw_saturation_level(image), 0, 1e-9);
  for (int i = 0; i < 20; i++)
    drawn_set(image, i, 3, 4095);
  assert_near(aw_saturation_level(image), 4095, 1e-9);
  drawn_set(image, 7, 7, 65535);
  assert_near(aw_saturation_level(image), 65535, 1e-9);
  g_autoptr(AwImage) real = drawn_image(50, 50, AW_SAMPLE_F32, 3000);
  assert_near(aw_saturation_level(real), 0, 1e-9);
}

static void scatter(AwLabels *labels, int pitch)
{
  AwRandom r = aw_random_stream(4, 0);
  guint32 k = 0;
  for (int y = pitch; y + pitch < labels->height_px; y += pitch)
    for (int x = pitch; x + pitch < labels->width_px; x += pitch) {
      DrawnBlob blob = { x + 8 * aw_random_unit(&r),
                         y + 8 * aw_random_unit(&r),
                         12 + 12 * aw_random_unit(&r),
                         10 + 10 * aw_random_unit(&r),
                         3 * aw_random_unit(&r),
                         1,
                         0 };
      drawn_label(labels, blob, ++k);
    }
}

/* Isolation by the grid agrees with looking at every pair, with a nucleus many times larger among them. */
static void test_isolation(void)
{
  g_autoptr(AwLabels) labels = aw_labels_new(600, 600, NULL);
  g_autoptr(AwImage) image = drawn_image(600, 600, AW_SAMPLE_U16, 10);
  scatter(labels, 30);
  for (int i = 0; i < 600 * 600; i++)
    if (i / 600 > 250 && i / 600 < 310)
      labels->label[i] = i % 600 > 100 && i / 600 == 280 ? 1 : 0;
  guint32 n = 0;
  g_autofree guint32 *number = g_new0(guint32, labels->n_labels + 1);
  for (int i = 0; i < 600 * 600; i++) {
    guint32 *k = &number[labels->label[i]];
    if (labels->label[i] && !*k)
      *k = ++n;
    labels->label[i] = *k;
  }
  labels->n_labels = n;
  g_autoptr(GPtrArray) nuclei = measure(image, labels);
  for (guint i = 0; i < n; i++) {
    const AwNucleus *a = nuclei->pdata[i];
    double best = a->flags & AW_FLAG_TOUCHING ? 0 : INFINITY;
    for (guint j = 0; j < n; j++) {
      const AwNucleus *b = nuclei->pdata[j];
      if (j != i)
        best = MIN(best, aw_outline_distance(a->outline, a->n_outline, b->outline, b->n_outline));
    }
    assert_near(a->isolation, best, 1e-9);
  }
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/measure/shape", test_shape);
  g_test_add_func("/nuclei/measure/hull", test_hull);
  g_test_add_func("/nuclei/measure/ellipse_map", test_ellipse_map);
  g_test_add_func("/nuclei/measure/light", test_light);
  g_test_add_func("/nuclei/measure/no_free_ring", test_no_free_ring);
  g_test_add_func("/nuclei/measure/flags", test_flags);
  g_test_add_func("/nuclei/measure/defocused", test_defocused);
  g_test_add_func("/nuclei/measure/placement", test_placement);
  g_test_add_func("/nuclei/measure/bad_labels", test_bad_labels);
  g_test_add_func("/nuclei/measure/empty", test_empty);
  g_test_add_func("/nuclei/measure/saturation_level", test_saturation_level);
  g_test_add_func("/nuclei/measure/isolation", test_isolation);
  return g_test_run();
}

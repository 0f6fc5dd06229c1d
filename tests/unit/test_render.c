/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/error.h"
#include "nuclei/population.h"
#include "nuclei/render.h"

/* A camera without faults, so bright that noise does not matter. */
static const AwRenderCamera clean = { .blur_px = 1.2, .counts_per_e = 0.01, .full_scale = 65535.0 };

static AwRenderView view_at(double x_um, double y_um, double turn_rad)
{
  double c = 0.65 * cos(turn_rad), s = 0.65 * sin(turn_rad);
  return (AwRenderView){ 200, 160, { { c, -s, s, c }, AW_ORIGIN_ENTERED, 0.0 }, { x_um, y_um }, 3 };
}

static GPtrArray *one_nucleus(double x, double y, double light_e)
{
  AwShape shape = { { x, y }, 16.0, 12.0, 0.5, { 0.02, 0.03 }, { -0.02, 0.01 }, 0.0 };
  AwScanPoint outline[AW_SHAPE_N_POINTS];
  aw_shape_outline(&shape, outline);
  AwTruth *t = aw_truth_new(AW_TRUTH_INTERPHASE, outline, AW_SHAPE_N_POINTS);
  t->light_e = light_e;
  GPtrArray *all = aw_truths_new();
  g_ptr_array_add(all, t);
  return all;
}

static AwImage *frame_of(const GPtrArray *truths, const AwRenderView *view, const AwRenderCamera *camera)
{
  AwImage *image = aw_render_frame(truths, view, camera, NULL);
  g_assert_nonnull(image);
  return image;
}

static double total(const AwImage *image)
{
  double sum = 0.0;
  for (int y = 0; y < image->height_px; y++)
    for (int x = 0; x < image->width_px; x++)
      sum += aw_image_value(image, x, y);
  return sum;
}

static AwPixelPoint weighted_centre(const AwImage *image)
{
  double sum = total(image), x_sum = 0.0, y_sum = 0.0;
  for (int y = 0; y < image->height_px; y++)
    for (int x = 0; x < image->width_px; x++) {
      x_sum += x * aw_image_value(image, x, y) / sum;
      y_sum += y * aw_image_value(image, x, y) / sum;
    }
  return (AwPixelPoint){ x_sum, y_sum };
}

/* docs/geometry.md: S = (1000, 2000), A = 0.65 identity: q = (935, 2000) lies 100 px to the right of the centre. */
static void runs_against_the_image(void)
{
  AwRenderView view = { 401, 301, { { 0.65, 0.0, 0.0, 0.65 }, AW_ORIGIN_ENTERED, 0.0 }, { 1000.0, 2000.0 }, 0 };
  AwShape disc = { { 935.0, 2000.0 }, 14.0, 14.0, 0.0, { 0 }, { 0 }, 0.0 };
  AwScanPoint outline[AW_SHAPE_N_POINTS];
  aw_shape_outline(&disc, outline);
  g_autoptr(GPtrArray) truths = aw_truths_new();
  AwTruth *t = aw_truth_new(AW_TRUTH_MITOTIC, outline, AW_SHAPE_N_POINTS);
  t->light_e = 5e8;
  g_ptr_array_add(truths, t);
  g_autoptr(AwImage) image = frame_of(truths, &view, &clean);
  AwPixelPoint p = weighted_centre(image);
  g_assert_cmpfloat_with_epsilon(p.x_px, 300.0, 0.01);
  g_assert_cmpfloat_with_epsilon(p.y_px, 150.0, 0.01);
}

/* The same nucleus in two frames of a turned camera: its light is centred on the true centroid in both. */
static void turned_camera(void)
{
  g_autoptr(GPtrArray) truths = one_nucleus(503.3, 307.9, 5e8);
  const AwTruth *t = truths->pdata[0];
  const AwRenderView views[] = { view_at(500.0, 300.0, 0.04), view_at(530.4, 331.7, 0.04) };
  for (int i = 0; i < 2; i++) {
    g_autoptr(AwImage) image = frame_of(truths, &views[i], &clean);
    AwPixelPoint p = weighted_centre(image);
    AwScanPoint q = aw_pixel_to_scan(&views[i].map, views[i].stage, aw_frame_centre(200, 160), p);
    g_assert_cmpfloat_with_epsilon(q.x_um, t->centroid.x_um, 0.01);
    g_assert_cmpfloat_with_epsilon(q.y_um, t->centroid.y_um, 0.01);
  }
}

static void light_is_kept(void)
{
  g_autoptr(GPtrArray) truths = one_nucleus(500.0, 300.0, 2e8);
  AwTruth *t = truths->pdata[0];
  AwRenderView view = view_at(501.0, 302.0, 0.04);
  AwRenderCamera camera = clean;
  for (int i = 0; i < 3; i++) {
    g_autoptr(AwImage) image = frame_of(truths, &view, &camera);
    g_assert_cmpfloat_with_epsilon(total(image), 2e6, 1e4);
    t->dome_frac = i ? -0.7 : 0.4;
    t->texture_frac = 0.3;
    t->blur_um = 2.0;
    camera.haze_frac = 0.2;
    camera.haze_um = 9.0;
  }
}

/* Photon transfer: the variance in electrons is the mean plus the read noise squared, in bright and in dim light. */
static void noise(void)
{
  const double background[] = { 4.0, 400.0 };
  g_autoptr(GPtrArray) none = aw_truths_new();
  AwRenderView view = view_at(0.0, 0.0, 0.0);
  for (int k = 0; k < 2; k++) {
    AwRenderCamera camera = { .background_e = background[k],
                              .counts_per_e = 2.0,
                              .read_noise_e = 3.0,
                              .offset = 100.0,
                              .full_scale = 4095.0,
                              .seed = 9 };
    g_autoptr(AwImage) image = frame_of(none, &view, &camera);
    double n = 200.0 * 160.0, mean = total(image) / n, squares = 0.0, cubes = 0.0;
    for (int y = 0; y < 160; y++)
      for (int x = 0; x < 200; x++) {
        double d = (aw_image_value(image, x, y) - mean) / 2.0;
        squares += d * d / n;
        cubes += d * d * d / n;
      }
    double variance = background[k] + 9.0;
    g_assert_cmpfloat_with_epsilon((mean - 100.0) / 2.0, background[k], 5.0 * sqrt(variance / n));
    g_assert_cmpfloat_with_epsilon(squares / variance, 1.0, 0.05);
    g_assert_cmpfloat_with_epsilon(cubes / (variance * sqrt(variance)), background[k] / (variance * sqrt(variance)),
                                   0.08);
    g_assert_cmpfloat(image->full_scale, ==, 4095.0);
  }
}

static void uneven_light_and_clipping(void)
{
  g_autoptr(GPtrArray) none = aw_truths_new();
  AwRenderView view = view_at(0.0, 0.0, 0.0);
  AwRenderCamera camera = {
    .background_e = 1e6, .vignette_frac = 0.3, .slope_x = 0.1, .counts_per_e = 0.01, .full_scale = 65535.0
  };
  g_autoptr(AwImage) image = frame_of(none, &view, &camera);
  g_assert_cmpfloat_with_epsilon(aw_image_value(image, 99, 80), 10000.0, 60.0);
  g_assert_cmpfloat_with_epsilon(aw_image_value(image, 199, 159), 7700.0, 60.0);
  g_assert_cmpfloat_with_epsilon(aw_image_value(image, 0, 0), 6300.0, 60.0);
  camera.full_scale = 9000.0;
  g_autoptr(AwImage) clipped = frame_of(none, &view, &camera);
  g_assert_cmpfloat(aw_image_value(clipped, 99, 80), ==, 9000.0);
}

/* Hot pixels stay where they are from frame to frame. */
static void hot_pixels(void)
{
  g_autoptr(GPtrArray) none = aw_truths_new();
  AwRenderView view = view_at(0.0, 0.0, 0.0);
  AwRenderCamera camera = { .counts_per_e = 0.01, .full_scale = 65535.0, .n_hot = 6, .hot_e = 1e6, .seed = 4 };
  g_autoptr(AwImage) one = aw_render_frame(none, &view, &camera, NULL);
  view.frame = 1;
  g_autoptr(AwImage) two = aw_render_frame(none, &view, &camera, NULL);
  int n = 0;
  for (int y = 0; y < 160; y++)
    for (int x = 0; x < 200; x++) {
      n += aw_image_value(one, x, y) > 50.0;
      g_assert_cmpfloat_with_epsilon(aw_image_value(one, x, y), aw_image_value(two, x, y), 80.0);
    }
  g_assert_true(n >= 4 && n <= 6);
}

/* A busy frame drawn in bands of odd heights equals one drawn whole; another frame has other noise. */
static void bands(void)
{
  AwPopulationPlan plan = { .from = { -60.0, -50.0 },
                            .to = { 60.0, 50.0 },
                            .n_nuclei = 14,
                            .clump_frac = 0.3,
                            .mitotic_frac = 0.2,
                            .debris_per_nucleus = 0.5,
                            .gap_um = 3.0,
                            .light_e = 3e5,
                            .seed = 6 };
  g_autoptr(GPtrArray) truths = aw_population_new(&plan, NULL);
  AwRenderView view = view_at(0.0, 0.0, 0.05);
  AwRenderCamera camera = { .blur_px = 1.0,
                            .background_e = 100.0,
                            .haze_frac = 0.2,
                            .haze_um = 15.0,
                            .vignette_frac = 0.2,
                            .counts_per_e = 0.3,
                            .read_noise_e = 5.0,
                            .offset = 100.0,
                            .full_scale = 4095.0,
                            .n_hot = 5,
                            .hot_e = 3000.0,
                            .seed = 77 };
  g_autoptr(AwImage) whole = frame_of(truths, &view, &camera);
  g_autofree guint16 *rows = g_new(guint16, 200 * 160);
  const int cut[] = { 0, 1, 37, 96, 160 };
  for (int i = 0; i < 4; i++)
    g_assert_true(aw_render_rows(truths, &view, &camera, cut[i], cut[i + 1], rows + 200 * cut[i], NULL));
  g_assert_cmpmem(rows, 64000, whole->pixels, 64000);
  view.frame = 4;
  g_assert_true(aw_render_rows(truths, &view, &camera, 0, 160, rows, NULL));
  g_assert_true(memcmp(rows, whole->pixels, 64000) != 0);
}

static void labels(void)
{
  g_autoptr(GPtrArray) truths = one_nucleus(500.0, 300.0, 1.0);
  g_autoptr(GPtrArray) other = one_nucleus(506.0, 300.0, 1.0);
  g_autoptr(GPtrArray) gone = one_nucleus(5000.0, 300.0, 1.0);
  g_ptr_array_add(truths, g_ptr_array_steal_index(gone, 0));
  g_ptr_array_add(truths, g_ptr_array_steal_index(other, 0));
  AwRenderView view = view_at(503.0, 301.0, 0.04);
  g_autoptr(AwLabels) seen = aw_render_labels(truths, &view, NULL);
  double n[4] = { 0 };
  for (int i = 0; i < 200 * 160; i++)
    n[seen->label[i]] += 1.0;
  double area = ((const AwTruth *)truths->pdata[2])->area_um2 / (0.65 * 0.65);
  g_assert_cmpuint(seen->n_labels, ==, 3);
  g_assert_cmpfloat_with_epsilon(n[3], area, 8.0);
  g_assert_cmpfloat(n[2], ==, 0.0);
  g_assert_true(n[1] > 0.2 * area && n[1] < 0.8 * area);
}

static void memory(void)
{
  g_autoptr(GPtrArray) none = aw_truths_new();
  AwRenderView view = view_at(0.0, 0.0, 0.0);
  view.width_px = view.height_px = G_MAXINT - 16;
  g_autoptr(GError) error = NULL;
  g_assert_false(aw_render_rows(none, &view, &clean, 0, view.height_px, NULL, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_MEMORY);
  g_clear_error(&error);
  g_assert_null(aw_render_frame(none, &view, &clean, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_RANGE);
  g_clear_error(&error);
  g_assert_null(aw_render_labels(none, &view, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_RANGE);
}

/* An object wider than any memory: both ways of drawing it say so. */
static void vast_object(void)
{
  AwScanPoint box[] = { { -5e8, -5e8 }, { 5e8, -5e8 }, { 5e8, 5e8 }, { -5e8, 5e8 } };
  g_autoptr(GPtrArray) truths = aw_truths_new();
  g_ptr_array_add(truths, aw_truth_new(AW_TRUTH_DEBRIS, box, 4));
  AwRenderView view = view_at(0.0, 0.0, 0.0);
  g_autoptr(GError) error = NULL;
  g_assert_null(aw_render_frame(truths, &view, &clean, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_MEMORY);
  g_clear_error(&error);
  g_assert_null(aw_render_labels(truths, &view, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_MEMORY);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/render/runs_against_the_image", runs_against_the_image);
  g_test_add_func("/nuclei/render/turned_camera", turned_camera);
  g_test_add_func("/nuclei/render/light_is_kept", light_is_kept);
  g_test_add_func("/nuclei/render/noise", noise);
  g_test_add_func("/nuclei/render/uneven_light_and_clipping", uneven_light_and_clipping);
  g_test_add_func("/nuclei/render/hot_pixels", hot_pixels);
  g_test_add_func("/nuclei/render/bands", bands);
  g_test_add_func("/nuclei/render/labels", labels);
  g_test_add_func("/nuclei/render/memory", memory);
  g_test_add_func("/nuclei/render/vast_object", vast_object);
  return g_test_run();
}

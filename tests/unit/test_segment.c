/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "nuclei/segment.h"
#include "support/check.h"
#include "support/drawn.h"

/* Drawn frames: background 200, noise 12, nuclei about 1000 high, edges 1 px soft, unless a case says otherwise. */

typedef struct {
  AwImage *image;
  AwLabels *truth;
} Scene;

static Scene scene_new(int width, int height)
{
  return (Scene){ drawn_image(width, height, AW_SAMPLE_U16, 200), aw_labels_new(width, height, NULL) };
}

static void scene_clear(Scene *s)
{
  aw_image_free(s->image);
  aw_labels_free(s->truth);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Scene, scene_clear)

static void add(Scene *s, double x, double y, double major, double minor, double angle, double height)
{
  DrawnBlob blob = { x, y, major, minor, angle, height, 1 };
  drawn_blob(s->image, blob);
  drawn_label(s->truth, blob, s->truth->n_labels + 1);
}

/* Loose nuclei that give the frame its scale, on a grid of `pitch` inside the rectangle. */
static void add_crowd(Scene *s, AwRect where, double pitch, double diameter)
{
  int i = 0;
  for (double y = where.y0 + pitch / 2; y < where.y1; y += pitch)
    for (double x = where.x0 + pitch / 2; x < where.x1; x += pitch, i++)
      add(s, x, y, diameter * (1 + 0.1 * (i % 3)), diameter * (1 - 0.05 * (i % 2)), 0.5 * i, 900 + 60 * (i % 5));
}

static AwSegmentation *segment(const AwImage *image, const AwSegmentSettings *settings)
{
  GError *error = NULL;
  AwSegmentation *s = aw_segment_image(image, settings, NULL, NULL, &error);
  g_assert_no_error(error);
  return s;
}

/* Intersection over union of true nucleus k with the label that covers most of it. */
static double overlap(const AwLabels *truth, guint32 k, const AwLabels *found)
{
  gsize n = (gsize)truth->width_px * (gsize)truth->height_px;
  g_autofree double *both = g_new0(double, (gsize)found->n_labels + 1);
  g_autofree double *area = g_new0(double, (gsize)found->n_labels + 1);
  double own = 0, best = 0;
  for (gsize i = 0; i < n; i++) {
    area[found->label[i]]++;
    own += truth->label[i] == k;
    both[found->label[i]] += truth->label[i] == k;
  }
  for (guint32 l = 1; l <= found->n_labels; l++)
    best = MAX(best, both[l] / (own + area[l] - both[l]));
  return best;
}

static guint32 n_found(const Scene *s, const AwLabels *found, double least)
{
  guint32 n = 0;
  for (guint32 k = 1; k <= s->truth->n_labels; k++)
    n += overlap(s->truth, k, found) > least;
  return n;
}

/* Every drawn nucleus is found, and nothing else. */
static void check_all(const Scene *s, double least)
{
  g_autoptr(AwSegmentation) found = segment(s->image, NULL);
  g_assert_cmpuint(n_found(s, found->labels, least), ==, s->truth->n_labels);
  g_assert_cmpuint(found->labels->n_labels, ==, s->truth->n_labels);
}

static void test_loose(void)
{
  g_auto(Scene) s = scene_new(300, 260);
  add_crowd(&s, (AwRect){ 0, 0, 300, 260 }, 50, 26);
  drawn_noise(s.image, 12, 1);
  check_all(&s, 0.85);
  g_autoptr(AwSegmentation) found = segment(s.image, NULL);
  g_assert_cmpfloat(found->scale.radius_px, >, 9);
  g_assert_cmpfloat(found->scale.radius_px, <, 15);
  g_assert_cmpfloat_with_epsilon(found->scale.noise, 12, 1.5);
  g_assert_cmpfloat(found->scale.height, >, 800);
  g_assert_cmpfloat(found->scale.height, <, 1300);
  for (guint32 k = 1; k <= found->labels->n_labels; k++) {
    g_assert_cmpfloat(found->info[k].confidence, >, 0.8);
    g_assert_cmpfloat(found->info[k].contrast, >, 30);
    g_assert_cmpfloat(found->info[k].neck_frac, ==, 0);
  }
}

static void test_dim_beside_bright(void)
{
  g_auto(Scene) s = scene_new(300, 300);
  add_crowd(&s, (AwRect){ 0, 0, 300, 150 }, 50, 26);
  add(&s, 100, 220, 30, 13, 0.4, 9000);
  add(&s, 122, 236, 28, 24, 0.2, 900);
  drawn_noise(s.image, 12, 2);
  check_all(&s, 0.6);
}

static void test_kidney(void)
{
  g_auto(Scene) s = scene_new(300, 300);
  add_crowd(&s, (AwRect){ 0, 0, 300, 150 }, 50, 26);
  AwPixelPoint p[48];
  for (int i = 0; i < 48; i++) {
    double t = 2 * G_PI * i / 48, bend = 5 * cos(t) * cos(t);
    p[i] = (AwPixelPoint){ 150 + 21 * cos(t), 225 + 11 * sin(t) + bend };
  }
  drawn_polygon(s.image, p, G_N_ELEMENTS(p), 1000, 1);
  drawn_noise(s.image, 12, 3);
  g_autoptr(AwSegmentation) found = segment(s.image, NULL);
  g_assert_cmpuint(found->labels->n_labels, ==, s.truth->n_labels + 1);
  guint32 left = found->labels->label[228 * 300 + 138], right = found->labels->label[228 * 300 + 162];
  g_assert_cmpuint(left, >, 0);
  g_assert_cmpuint(left, ==, right);
}

static void test_four_touching(void)
{
  g_auto(Scene) s = scene_new(300, 300);
  add_crowd(&s, (AwRect){ 0, 0, 300, 150 }, 50, 26);
  add(&s, 137, 212, 27, 25, 0, 1000);
  add(&s, 163, 212, 27, 25, 0, 1000);
  add(&s, 137, 236, 27, 25, 0, 1000);
  add(&s, 163, 236, 27, 25, 0, 1000);
  drawn_noise(s.image, 12, 4);
  check_all(&s, 0.7);
  g_autoptr(AwSegmentation) found = segment(s.image, NULL);
  guint32 k = found->labels->label[212 * 300 + 137];
  g_assert_cmpfloat(found->info[k].neck_frac, >, 0.3);
}

static void test_gradient(void)
{
  g_auto(Scene) s = scene_new(400, 200);
  for (int i = 0; i < 8; i++)
    for (int j = 0; j < 4; j++)
      add(&s, 25 + 50 * i, 25 + 50 * j, 27, 24, 0.3 * i, 400 + 1600 * i / 7.0);
  drawn_slope(s.image, 1, 0); /* background 200 to 600: and the nuclei 5 : 1 */
  drawn_noise(s.image, 12, 5);
  check_all(&s, 0.75);
}

static void test_hot_pixels(void)
{
  g_auto(Scene) s = scene_new(300, 260);
  add_crowd(&s, (AwRect){ 0, 0, 300, 260 }, 50, 26);
  drawn_noise(s.image, 12, 6);
  g_autoptr(AwSegmentation) before = segment(s.image, NULL);
  for (int i = 0; i < 60; i++)
    drawn_set(s.image, (i * 37) % 297 + 1, (i * 53) % 257 + 1, 60000);
  g_autoptr(AwSegmentation) after = segment(s.image, NULL);
  g_assert_cmpuint(after->labels->n_labels, ==, before->labels->n_labels);
  g_assert_cmpuint(n_found(&s, after->labels, 0.85), ==, s.truth->n_labels);
}

static void test_glare(void)
{
  g_auto(Scene) s = scene_new(400, 400);
  add_crowd(&s, (AwRect){ 0, 0, 400, 200 }, 50, 26);
  add_crowd(&s, (AwRect){ 0, 200, 200, 400 }, 50, 26);
  drawn_disc(s.image, 300, 300, 45, 6000, 12);
  drawn_noise(s.image, 12, 7);
  g_autoptr(AwSegmentation) found = segment(s.image, NULL);
  g_assert_cmpuint(n_found(&s, found->labels, 0.7), ==, s.truth->n_labels);
  g_assert_cmpfloat(found->scale.radius_px, <, 20);
  guint32 glare = found->labels->label[300 * 400 + 300];
  if (glare)
    g_assert_cmpfloat(found->info[glare].confidence, <, 0.8);
}

static void test_dark_hole(void)
{
  g_auto(Scene) s = scene_new(300, 300);
  add_crowd(&s, (AwRect){ 0, 0, 300, 150 }, 50, 30);
  add(&s, 150, 225, 34, 30, 0, 1000);
  drawn_disc(s.image, 151, 226, 5, -800, 1);
  drawn_noise(s.image, 12, 8);
  check_all(&s, 0.8);
}

static void test_fibre(void)
{
  g_auto(Scene) s = scene_new(300, 300);
  add_crowd(&s, (AwRect){ 0, 0, 300, 150 }, 50, 26);
  AwPixelPoint p[4] = { { 20, 200 }, { 280, 262 }, { 280, 265 }, { 20, 203 } };
  drawn_polygon(s.image, p, 4, 900, 1);
  drawn_noise(s.image, 12, 9);
  g_autoptr(AwSegmentation) found = segment(s.image, NULL);
  g_assert_cmpuint(n_found(&s, found->labels, 0.8), ==, s.truth->n_labels);
  for (int x = 30; x < 270; x++)
    for (int y = 195; y < 270; y++) {
      guint32 k = found->labels->label[y * 300 + x];
      if (k)
        g_assert_cmpfloat(found->info[k].confidence, <, 0.7);
    }
}

static void check_empty(const AwImage *image)
{
  g_autoptr(AwSegmentation) found = segment(image, NULL);
  g_assert_cmpuint(found->labels->n_labels, ==, 0);
  g_assert_nonnull(found->info);
}

static void test_empty(void)
{
  g_autoptr(AwImage) flat = drawn_image(200, 150, AW_SAMPLE_U16, 300);
  check_empty(flat);
  for (guint64 seed = 1; seed <= 4; seed++) {
    g_autoptr(AwImage) noise = drawn_image(256, 256, AW_SAMPLE_U16, 300);
    drawn_noise(noise, 20, seed);
    check_empty(noise);
    AwSegmentScale scale;
    g_assert_true(aw_segment_measure(noise, NULL, &scale, NULL));
    g_assert_cmpfloat(scale.weight, ==, 0);
    g_assert_true(isnan(scale.radius_px));
    g_assert_cmpfloat_with_epsilon(scale.noise, 20, 2);
  }
}

static void test_confluent(void)
{
  g_auto(Scene) s = scene_new(280, 280);
  for (int j = 0; j < 10; j++)
    for (int i = 0; i < 10; i++)
      add(&s, 14 + 28 * i + (j % 2 ? 6 : -6), 14 + 28 * j, 27, 26, 0, 1000);
  drawn_noise(s.image, 12, 10);
  g_autoptr(AwSegmentation) found = segment(s.image, NULL);
  g_assert_cmpuint(n_found(&s, found->labels, 0.7), >=, 90);
}

static void check_width(double diameter)
{
  int side = (int)(diameter * 10);
  g_auto(Scene) s = scene_new(side, side);
  add_crowd(&s, (AwRect){ 0, 0, side, side }, 2 * diameter, diameter);
  drawn_noise(s.image, 12, 11);
  check_all(&s, 0.7);
}

static void test_widths(void)
{
  check_width(8);
  check_width(20);
  check_width(60);
}

static void test_small_images(void)
{
  const int side[][2] = { { 1, 1 }, { 1, 40 }, { 40, 1 }, { 2, 2 }, { 3, 3 }, { 5, 7 } };
  for (guint i = 0; i < G_N_ELEMENTS(side); i++) {
    g_autoptr(AwImage) image = drawn_image(side[i][0], side[i][1], AW_SAMPLE_U8, 9);
    drawn_set(image, 0, 0, 200);
    g_autoptr(AwSegmentation) found = segment(image, NULL);
    g_assert_cmpint(found->labels->width_px, ==, side[i][0]);
    g_assert_cmpint(found->labels->height_px, ==, side[i][1]);
    AwSegmentScale scale = { 10, 100, 1, 5 };
    g_autoptr(AwSegmentation) forced = aw_segment_image(image, NULL, &scale, NULL, NULL);
    g_assert_nonnull(forced);
  }
}

static void test_saturated(void)
{
  g_auto(Scene) s = scene_new(300, 260);
  add_crowd(&s, (AwRect){ 0, 0, 300, 260 }, 50, 26);
  drawn_noise(s.image, 12, 12);
  guint16 *p = s.image->pixels;
  for (int i = 0; i < 300 * 260; i++)
    p[i] = MIN(p[i], 700);
  check_all(&s, 0.8);
}

static void test_float_images(void)
{
  g_auto(Scene) s = scene_new(200, 200);
  add_crowd(&s, (AwRect){ 0, 0, 200, 200 }, 50, 26);
  drawn_noise(s.image, 12, 13);
  g_autoptr(AwImage) real = drawn_image(200, 200, AW_SAMPLE_F32, 0);
  const guint16 *p = s.image->pixels;
  float *q = real->pixels;
  for (int i = 0; i < 200 * 200; i++)
    q[i] = ((float)p[i] - 500) / 1024;
  g_autoptr(AwSegmentation) whole = segment(s.image, NULL);
  g_autoptr(AwSegmentation) below_zero = segment(real, NULL);
  g_assert_cmpmem(whole->labels->label, 160000, below_zero->labels->label, 160000);
  q[201] = NAN;
  GError *error = NULL;
  g_assert_null(aw_segment_image(real, NULL, NULL, NULL, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "column 1|row 1|finite");
  q[201] = INFINITY;
  AwSegmentScale scale;
  g_assert_false(aw_segment_measure(real, NULL, &scale, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "column 1|row 1|finite");
}

static void test_settings(void)
{
  const struct {
    AwSegmentSettings settings;
    const char *parts;
  } bad[] = { { { 3, 0, 0 }, "width|3|4|400" },
              { { 500, 0, 0 }, "width|500|400" },
              { { 0, 1.5, 0 }, "sensitivity|1.5|-1|1" },
              { { 0, 0, -2 }, "splitting|-2|-1|1" },
              { { NAN, 0, 0 }, "width" } };
  g_autoptr(AwImage) image = drawn_image(20, 20, AW_SAMPLE_U8, 9);
  for (guint i = 0; i < G_N_ELEMENTS(bad); i++) {
    GError *error = NULL;
    g_assert_false(aw_segment_settings_check(&bad[i].settings, &error));
    aw_check_error(&error, AW_ERROR_RANGE, bad[i].parts);
    g_assert_null(aw_segment_image(image, &bad[i].settings, NULL, NULL, &error));
    aw_check_error(&error, AW_ERROR_RANGE, bad[i].parts);
  }
  AwSegmentSettings good = { 25.5, 1, -1 };
  g_assert_true(aw_segment_settings_check(&good, NULL));
}

static void test_sensitivity(void)
{
  g_auto(Scene) s = scene_new(400, 200);
  for (int i = 0; i < 8; i++)
    for (int j = 0; j < 4; j++)
      add(&s, 25 + 50 * i, 25 + 50 * j, 27, 24, 0.3 * i, 1000 * pow(0.6, i));
  drawn_noise(s.image, 4, 14);
  guint32 before = 0;
  for (int step = -2; step <= 2; step++) {
    AwSegmentSettings settings = { 0, step / 2.0, 0 };
    g_autoptr(AwSegmentation) found = segment(s.image, &settings);
    guint32 n = n_found(&s, found->labels, 0.5);
    g_assert_cmpuint(n, >=, before);
    if (step == 2)
      g_assert_cmpuint(n, >=, 24);
    if (step == -2)
      g_assert_cmpuint(n, <=, 16);
    before = n;
  }
}

static void test_splitting(void)
{
  g_auto(Scene) s = scene_new(600, 400);
  for (int i = 0; i < 10; i++)
    for (int j = 0; j < 5; j++) { /* pairs from one blob to two */
      add(&s, 30 + 60 * i - 0.9 * (i + 4), 40 + 80 * j, 27, 25, 0, 1000);
      add(&s, 30 + 60 * i + 0.9 * (i + 4), 40 + 80 * j, 27, 25, 0, 1000);
    }
  drawn_noise(s.image, 12, 15);
  guint32 before = 0, first = 0;
  for (int step = -2; step <= 2; step++) {
    AwSegmentSettings settings = { 26, 0, step / 2.0 };
    g_autoptr(AwSegmentation) found = segment(s.image, &settings);
    g_assert_cmpuint(found->labels->n_labels, >=, before);
    before = found->labels->n_labels;
    first = step == -2 ? before : first;
  }
  g_assert_cmpuint(before, >=, first + 4);
}

static void test_width_handle(void)
{
  g_auto(Scene) s = scene_new(300, 260);
  add_crowd(&s, (AwRect){ 0, 0, 300, 260 }, 50, 26);
  drawn_noise(s.image, 12, 16);
  AwSegmentSettings settings = { 40, 0, 0 };
  g_autoptr(AwSegmentation) found = segment(s.image, &settings);
  g_assert_cmpfloat(found->scale.radius_px, ==, 20);
}

/* The same frame turned, on another scale of brightness, and run again. */
static void test_invariance(void)
{
  g_auto(Scene) s = scene_new(220, 180);
  add_crowd(&s, (AwRect){ 0, 0, 220, 180 }, 30, 26);
  drawn_noise(s.image, 12, 17);
  g_autoptr(AwImage) turned = drawn_image(180, 220, AW_SAMPLE_U16, 0);
  g_autoptr(AwImage) mapped = drawn_image(220, 180, AW_SAMPLE_U16, 0);
  for (int y = 0; y < 180; y++)
    for (int x = 0; x < 220; x++) {
      drawn_set(turned, y, x, aw_image_value(s.image, x, y));
      drawn_set(mapped, x, y, 17 * aw_image_value(s.image, x, y) + 500);
    }
  g_autoptr(AwSegmentation) a = segment(s.image, NULL);
  g_autoptr(AwSegmentation) again = segment(s.image, NULL);
  g_autoptr(AwSegmentation) b = segment(turned, NULL);
  g_autoptr(AwSegmentation) c = segment(mapped, NULL);
  g_assert_cmpmem(a->labels->label, 158400, again->labels->label, 158400);
  gsize differ = 0, differ_mapped = 0;
  for (int y = 0; y < 180; y++)
    for (int x = 0; x < 220; x++) {
      differ += !a->labels->label[y * 220 + x] != !b->labels->label[x * 180 + y];
      differ_mapped += a->labels->label[y * 220 + x] != c->labels->label[y * 220 + x];
    }
  g_assert_cmpuint(a->labels->n_labels, ==, b->labels->n_labels);
  g_assert_cmpuint(differ, <, 60);
  g_assert_cmpuint(differ_mapped, <, 20);
}

static void test_pooled(void)
{
  AwSegmentScale scales[5] = {
    { 10, 100, 1, 20 }, { NAN, NAN, 3, 0 }, { 14, 300, 2, 30 }, { 30, 900, 2, 4 }, { NAN, NAN, 2, 0 }
  };
  AwSegmentScale all = aw_segment_pool_scales(scales, 5);
  g_assert_cmpfloat(all.radius_px, ==, 14);
  g_assert_cmpfloat(all.height, ==, 300);
  g_assert_cmpfloat(all.noise, ==, 2);
  g_assert_cmpfloat(all.weight, ==, 54);
  AwSegmentScale none = aw_segment_pool_scales(scales + 4, 1);
  g_assert_true(isnan(none.radius_px));
  g_assert_cmpfloat(none.weight, ==, 0);
  g_assert_cmpfloat(aw_segment_pool_scales(NULL, 0).weight, ==, 0);
}

/* A frame with one dim nucleus, judged by its own scale and by that of its scan. */
static void test_given_scale(void)
{
  g_auto(Scene) s = scene_new(120, 120);
  add(&s, 60, 60, 26, 24, 0, 100);
  drawn_noise(s.image, 4, 18);
  g_autoptr(AwSegmentation) alone = segment(s.image, NULL);
  g_assert_cmpuint(alone->labels->n_labels, ==, 1);
  AwSegmentScale bright = { 11, 2000, 4, 100 }, empty = { NAN, NAN, 4, 0 };
  g_autoptr(AwSegmentation) dim = aw_segment_image(s.image, NULL, &bright, NULL, NULL);
  g_assert_cmpuint(dim->labels->n_labels, ==, 0);
  g_autoptr(AwSegmentation) none = aw_segment_image(s.image, NULL, &empty, NULL, NULL);
  g_assert_cmpuint(none->labels->n_labels, ==, 0);
}

static void test_cancelled(void)
{
  g_auto(Scene) s = scene_new(200, 200);
  add_crowd(&s, (AwRect){ 0, 0, 200, 200 }, 50, 26);
  AwProgress progress = { .cancelled = 0 };
  aw_progress_cancel(&progress);
  GError *error = NULL;
  g_assert_null(aw_segment_image(s.image, NULL, NULL, &progress, &error));
  aw_check_error(&error, AW_ERROR_CANCELLED, "stop");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/segment/loose", test_loose);
  g_test_add_func("/nuclei/segment/dim-beside-bright", test_dim_beside_bright);
  g_test_add_func("/nuclei/segment/kidney", test_kidney);
  g_test_add_func("/nuclei/segment/four-touching", test_four_touching);
  g_test_add_func("/nuclei/segment/gradient", test_gradient);
  g_test_add_func("/nuclei/segment/hot-pixels", test_hot_pixels);
  g_test_add_func("/nuclei/segment/glare", test_glare);
  g_test_add_func("/nuclei/segment/dark-hole", test_dark_hole);
  g_test_add_func("/nuclei/segment/fibre", test_fibre);
  g_test_add_func("/nuclei/segment/empty", test_empty);
  g_test_add_func("/nuclei/segment/confluent", test_confluent);
  g_test_add_func("/nuclei/segment/widths", test_widths);
  g_test_add_func("/nuclei/segment/small-images", test_small_images);
  g_test_add_func("/nuclei/segment/saturated", test_saturated);
  g_test_add_func("/nuclei/segment/float", test_float_images);
  g_test_add_func("/nuclei/segment/settings", test_settings);
  g_test_add_func("/nuclei/segment/sensitivity", test_sensitivity);
  g_test_add_func("/nuclei/segment/splitting", test_splitting);
  g_test_add_func("/nuclei/segment/width-handle", test_width_handle);
  g_test_add_func("/nuclei/segment/invariance", test_invariance);
  g_test_add_func("/nuclei/segment/pooled", test_pooled);
  g_test_add_func("/nuclei/segment/given-scale", test_given_scale);
  g_test_add_func("/nuclei/segment/cancelled", test_cancelled);
  return g_test_run();
}

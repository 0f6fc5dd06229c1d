/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/error.h"
#include "base/random.h"
#include "nuclei/patch.h"
#include "support/drawn.h"

static double at(const AwPatch *patch, int x, int y)
{
  return patch->value[(gsize)(y - patch->rect.y0) * (gsize)aw_patch_width(patch) + (gsize)(x - patch->rect.x0)];
}

/* A rectangle from (2.25, 3) to (5.5, 4.75): the share of every pixel is known. */
static void cover_rectangle(void)
{
  AwPixelPoint box[] = { { 2.25, 3.0 }, { 5.5, 3.0 }, { 5.5, 4.75 }, { 2.25, 4.75 } };
  g_auto(AwPatch) patch;
  aw_patch_init(&patch);
  for (int turn = 0; turn < 2; turn++) {
    g_assert_true(aw_patch_cover(&patch, box, 4, (AwRect){ 0, 0, 9, 9 }, NULL));
    g_assert_cmpfloat_with_epsilon(at(&patch, 2, 3), 0.25 * 0.5, 1e-14);
    g_assert_cmpfloat_with_epsilon(at(&patch, 3, 3), 0.5, 1e-14);
    g_assert_cmpfloat_with_epsilon(at(&patch, 3, 4), 1.0, 1e-14);
    g_assert_cmpfloat_with_epsilon(at(&patch, 5, 4), 1.0, 1e-14);
    g_assert_cmpfloat_with_epsilon(at(&patch, 6, 4), 0.0, 1e-14);
    g_assert_cmpfloat_with_epsilon(at(&patch, 4, 5), 0.25, 1e-14);
    g_assert_cmpfloat_with_epsilon(aw_patch_sum(&patch), 3.25 * 1.75, 1e-13);
    AwPixelPoint swap = box[1];
    box[1] = box[3];
    box[3] = swap;
  }
}

/* Random star-shaped polygons: the sum is the shoelace area, and each pixel agrees with a 64 x 64 count of points. */
static gboolean inside(const AwPixelPoint *p, gsize n, double x, double y)
{
  gboolean in = FALSE;
  for (gsize i = 0, j = n - 1; i < n; j = i++)
    if ((p[i].y_px > y) != (p[j].y_px > y) &&
        x < p[i].x_px + (p[j].x_px - p[i].x_px) * (y - p[i].y_px) / (p[j].y_px - p[i].y_px))
      in = !in;
  return in;
}

static double counted(const AwPixelPoint *p, gsize n, int x, int y)
{
  int hits = 0;
  for (int j = 0; j < 64; j++)
    for (int i = 0; i < 64; i++)
      hits += inside(p, n, x - 0.5 + (i + 0.5) / 64.0, y - 0.5 + (j + 0.5) / 64.0);
  return hits / 4096.0;
}

static void cover_random(void)
{
  g_auto(AwPatch) patch;
  aw_patch_init(&patch);
  for (guint64 k = 0; k < 12; k++) {
    AwRandom r = aw_random_stream(20310504, k);
    AwPixelPoint p[17];
    double area = 0.0;
    for (gsize i = 0; i < 17; i++) {
      double radius = 1.0 + 7.0 * aw_random_unit(&r), t = 2.0 * G_PI * (double)i / 17.0;
      p[i] = (AwPixelPoint){ -3.7 + radius * cos(t), 4.2 + radius * sin(t) };
    }
    for (gsize i = 0; i < 17; i++)
      area += (p[i].x_px * p[(i + 1) % 17].y_px - p[(i + 1) % 17].x_px * p[i].y_px) / 2.0;
    g_assert_true(aw_patch_cover(&patch, p, 17, aw_points_rect(p, 17, 1.0), NULL));
    g_assert_cmpfloat_with_epsilon(aw_patch_sum(&patch), area, 1e-11);
    for (int y = patch.rect.y0; y < patch.rect.y1; y += 2)
      for (int x = patch.rect.x0; x < patch.rect.x1; x++)
        g_assert_cmpfloat_with_epsilon(at(&patch, x, y), counted(p, 17, x, y), 0.02);
  }
}

/* Blurring keeps light and centroid, and widens the second moment by sigma squared. */
static void blur(void)
{
  AwPixelPoint dot[] = { { 19.6, 19.8 }, { 20.4, 19.8 }, { 20.4, 20.2 }, { 19.6, 20.2 } };
  g_auto(AwPatch) patch;
  aw_patch_init(&patch);
  g_assert_true(aw_patch_cover(&patch, dot, 4, (AwRect){ 0, 0, 41, 43 }, NULL));
  aw_patch_blur(&patch, 2.5);
  double sum = aw_patch_sum(&patch), mx = 0.0, vx = 0.0, vy = 0.0;
  for (int y = 0; y < 43; y++)
    for (int x = 0; x < 41; x++) {
      mx += x * at(&patch, x, y) / sum;
      vx += (x - 20.0) * (x - 20.0) * at(&patch, x, y) / sum;
      vy += (y - 20.0) * (y - 20.0) * at(&patch, x, y) / sum;
    }
  g_assert_cmpfloat_with_epsilon(sum, 0.32, 1e-12);
  g_assert_cmpfloat_with_epsilon(mx, 20.0, 1e-12);
  g_assert_cmpfloat_with_epsilon(vx, 6.25, 0.02);
  g_assert_cmpfloat_with_epsilon(vy, vx, 1e-9);
}

/* Two bands added apart give the same picture as one, and what lies outside the picture is dropped. */
static void add_in_bands(void)
{
  AwPixelPoint box[] = { { -3.0, 2.0 }, { 6.0, 1.0 }, { 12.0, 9.5 }, { 1.0, 7.0 } };
  double whole[80] = { 0 }, bands[80] = { 0 };
  g_auto(AwPatch) patch;
  aw_patch_init(&patch);
  g_assert_true(aw_patch_cover(&patch, box, 4, aw_points_rect(box, 4, 6.0), NULL));
  aw_patch_blur(&patch, 1.0);
  aw_patch_add(&patch, 3.0, whole, 10, 0, 8);
  aw_patch_add(&patch, 3.0, bands, 10, 0, 5);
  aw_patch_add(&patch, 3.0, bands + 50, 10, 5, 8);
  for (int i = 0; i < 80; i++)
    g_assert_cmpfloat(whole[i], ==, bands[i]);
  g_assert_cmpfloat_with_epsilon(whole[44], 3.0, 0.05);
}

static void patch_memory(void)
{
  AwPixelPoint box[] = { { -9e8, -9e8 }, { 9e8, -9e8 }, { 9e8, 9e8 }, { -9e8, 9e8 } };
  g_auto(AwPatch) patch;
  aw_patch_init(&patch);
  g_autoptr(GError) error = NULL;
  g_assert_false(aw_patch_cover(&patch, box, 4, aw_points_rect(box, 4, 1.0), &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_MEMORY);
  AwRect far = aw_points_rect((AwPixelPoint[]){ { -1e300, 3.0 }, { 1e300, 4.0 } }, 2, 1.0);
  g_assert_cmpint(far.x1 - far.x0, ==, 2000000001);
}

static void drawn_pieces(void)
{
  g_autoptr(AwImage) image = drawn_image(60, 50, AW_SAMPLE_U16, 100.0);
  drawn_disc(image, 29.0, 24.0, 10.0, 1000.0, 1.0);
  g_assert_cmpfloat(aw_image_value(image, 29, 24), ==, 1100.0);
  g_assert_cmpfloat(aw_image_value(image, 5, 5), ==, 100.0);
  g_assert_cmpfloat_with_epsilon(aw_image_value(image, 39, 24), 600.0, 40.0);
  drawn_slope(image, 2.0, -1.0);
  g_assert_cmpfloat(aw_image_value(image, 5, 5), ==, 105.0);
  drawn_noise(image, 5.0, 7);
  g_autoptr(AwLabels) labels = aw_labels_new(60, 50, NULL);
  drawn_label(labels, (DrawnBlob){ 29.3, 24.1, 20.0, 20.0, 0.0, 0.0, 0.0 }, 1);
  guint32 n = 0;
  for (int i = 0; i < 60 * 50; i++)
    n += labels->label[i];
  g_assert_cmpfloat_with_epsilon((double)n, 100.0 * G_PI, 6.0);
  g_assert_cmpuint(labels->n_labels, ==, 1);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/patch/cover_rectangle", cover_rectangle);
  g_test_add_func("/nuclei/patch/cover_random", cover_random);
  g_test_add_func("/nuclei/patch/blur", blur);
  g_test_add_func("/nuclei/patch/add_in_bands", add_in_bands);
  g_test_add_func("/nuclei/patch/memory", patch_memory);
  g_test_add_func("/support/drawn/pieces", drawn_pieces);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "image/distance.h"
#include "image/noise.h"
#include "image/opening.h"
#include "image/otsu.h"
#include "image/rank.h"
#include "image/runs.h"
#include "image/smooth.h"
#include "image/watershed.h"
#include "support/check.h"
#include "support/drawn.h"

/* Fast versions against plain ones written as the definition says, on frames of random numbers. */

static guint32 dice(guint32 *state)
{
  return *state = *state * 1664525u + 1013904223u, *state >> 8;
}

static AwPlane *random_plane(int width, int height, guint32 seed)
{
  AwPlane *p = aw_plane_new(width, height, NULL);
  for (int i = 0; i < width * height; i++)
    p->value[i] = (float)(dice(&seed) % 1000);
  return p;
}

static guint8 *random_mask(int n, guint32 seed, guint32 percent)
{
  guint8 *m = g_new(guint8, (gsize)n);
  for (int i = 0; i < n; i++)
    m[i] = dice(&seed) % 100 < percent;
  return m;
}

static int mirrored(int i, int n)
{
  while (i < 0 || i >= n)
    i = i < 0 ? -1 - i : 2 * n - 1 - i;
  return i;
}

static void check_gaussian(int width, int height, double sigma)
{
  g_autoptr(AwPlane) in = random_plane(width, height, 7);
  g_autoptr(AwPlane) out = aw_smooth_plane(in, sigma, NULL);
  int r = sigma < 0.75 ? 2 : (int)ceil(3.3 * sigma);
  for (int y = 0; y < height; y++)
    for (int x = 0; x < width; x++) {
      double sum = 0, weight = 0;
      for (int j = -r; j <= r; j++)
        for (int i = -r; i <= r; i++) {
          double w = exp(-(i * i + j * j) / (2 * sigma * sigma));
          sum += w * (double)aw_plane_row(in, mirrored(y + j, height))[mirrored(x + i, width)];
          weight += w;
        }
      g_assert_cmpfloat_with_epsilon((double)aw_plane_row(out, y)[x], sum / weight, 2e-3);
    }
}

static void test_gaussian(void)
{
  check_gaussian(31, 17, 0.7);
  check_gaussian(31, 17, 2.3);
  check_gaussian(3, 5, 4);
  check_gaussian(1, 9, 1);
  check_gaussian(1, 1, 3);
}

static void test_hot_pixel(void)
{
  g_autoptr(AwImage) image = drawn_image(21, 21, AW_SAMPLE_U16, 100);
  drawn_set(image, 10, 10, 60000);
  drawn_set(image, 0, 0, 60000);
  g_autoptr(AwPlane) out = aw_smooth_image(image, 0.7, NULL);
  for (int i = 0; i < 21 * 21; i++)
    g_assert_cmpfloat_with_epsilon((double)out->value[i], 100, 1e-3);
}

static void test_not_finite(void)
{
  g_autoptr(AwImage) image = drawn_image(4, 3, AW_SAMPLE_F32, 1);
  ((float *)image->pixels)[9] = NAN;
  GError *error = NULL;
  g_assert_null(aw_smooth_image(image, 1, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "column 1|row 2|finite");
}

static void test_reduce(void)
{
  g_autoptr(AwPlane) in = random_plane(7, 5, 3);
  g_autoptr(AwPlane) out = aw_plane_reduce(in, 3, NULL);
  g_assert_cmpint(out->width_px, ==, 3);
  g_assert_cmpint(out->height_px, ==, 2);
  double corner = (double)(aw_plane_row(in, 3)[6] + aw_plane_row(in, 4)[6]) / 2;
  g_assert_cmpfloat_with_epsilon((double)aw_plane_row(out, 1)[2], corner, 1e-3);
}

/* A plane that is linear in x and y comes back exactly away from the outermost block centres. */
static void test_expand(void)
{
  g_autoptr(AwPlane) in = aw_plane_new(48, 36, NULL);
  for (int i = 0; i < 48 * 36; i++)
    in->value[i] = (float)(3 * (i % 48) - 2 * (i / 48));
  for (int factor = 1; factor <= 4; factor++) {
    g_autoptr(AwPlane) small = aw_plane_reduce(in, factor, NULL);
    float row[40];
    for (int y = factor; y < 36 - factor; y++) {
      aw_plane_expand_row(small, factor, y, 5, 37, row);
      for (int x = 0; x < 37; x++)
        g_assert_cmpfloat_with_epsilon((double)row[x], 3 * (x + 5) - 2 * y, 1e-3);
    }
  }
}

static double extreme(const AwPlane *in, int x, int y, double radius, gboolean least)
{
  double best = least ? INFINITY : -INFINITY;
  for (int j = 0; j < in->height_px; j++)
    for (int i = 0; i < in->width_px; i++)
      if ((i - x) * (i - x) + (j - y) * (j - y) <= radius * radius) {
        double v = (double)aw_plane_row(in, j)[i];
        best = least ? MIN(best, v) : MAX(best, v);
      }
  return best;
}

static void check_opening(int width, int height, double radius)
{
  g_autoptr(AwPlane) in = random_plane(width, height, 11);
  g_autoptr(AwPlane) low = aw_plane_new(width, height, NULL);
  g_autoptr(AwPlane) out = aw_opening_disc(in, radius, NULL);
  for (int y = 0; y < height; y++)
    for (int x = 0; x < width; x++)
      aw_plane_row(low, y)[x] = (float)extreme(in, x, y, radius, TRUE);
  for (int y = 0; y < height; y++)
    for (int x = 0; x < width; x++)
      g_assert_cmpfloat((double)aw_plane_row(out, y)[x], ==, extreme(low, x, y, radius, FALSE));
}

static void test_opening(void)
{
  check_opening(23, 19, 1);
  check_opening(23, 19, 3.6);
  check_opening(9, 30, 9);
  check_opening(1, 1, 5);
}

static void test_distance(void)
{
  const int w = 37, h = 29;
  for (guint32 percent = 60; percent <= 100; percent += 13) {
    g_autofree guint8 *mask = random_mask(w * h, percent, percent);
    g_autofree float *d = g_new(float, w *h);
    aw_distance_inside(mask, w, h, 30, d);
    for (int i = 0; i < w * h; i++) {
      double best = 30;
      for (int j = 0; j < w * h; j++)
        if (!mask[j])
          best = MIN(best, hypot(i % w - j % w, i / w - j / w));
      g_assert_cmpfloat_with_epsilon((double)d[i], mask[i] ? best : 0, 1e-4);
    }
  }
}

static void test_otsu(void)
{
  float value[300];
  for (int i = 0; i < 300; i++)
    value[i] = (float)(i < 200 ? 10 + i % 5 : 90 + i % 7);
  double t = aw_otsu(value, 300);
  g_assert_cmpfloat(t, >=, 14);
  g_assert_cmpfloat(t, <, 90);
  float same[3] = { 5, 5, 5 };
  g_assert_cmpfloat(aw_otsu(same, 3), ==, 5);
}

static int by_size(const void *a, const void *b)
{
  float u = *(const float *)a, v = *(const float *)b;
  return (u > v) - (u < v);
}

static void test_rank(void)
{
  for (guint32 seed = 1; seed < 40; seed++) {
    g_autoptr(AwPlane) p = random_plane((int)seed, 3, seed);
    gsize n = 3 * seed;
    g_autofree float *sorted = g_memdup2(p->value, n * sizeof(float));
    qsort(sorted, n, sizeof *sorted, by_size);
    for (double q = 0; q <= 1; q += 0.25)
      g_assert_cmpfloat((double)aw_quantile(p->value, n, q), ==, (double)sorted[(gsize)(q * (double)(n - 1))]);
  }
  const double value[] = { 5, 1, 3 }, weight[] = { 1, 1, 5 };
  g_assert_cmpfloat(aw_weighted_median(value, weight, 3), ==, 3);
  g_assert_true(isnan(aw_weighted_median(value, weight, 0)));
}

static void test_noise(void)
{
  g_autoptr(AwImage) image = drawn_image(400, 300, AW_SAMPLE_U16, 1000);
  drawn_slope(image, 3, 2);
  drawn_disc(image, 200, 150, 60, 9000, 1);
  drawn_noise(image, 31, 5);
  g_assert_cmpfloat_with_epsilon(aw_image_noise(image), 31, 1);
  g_autoptr(AwImage) tiny = drawn_image(2, 9, AW_SAMPLE_U8, 1);
  g_assert_cmpfloat(aw_image_noise(tiny), ==, 0);
}

static int spread(const guint8 *mask, int w, int h, int at, guint8 *seen)
{
  if (!mask[at] || seen[at])
    return 0;
  seen[at] = 1;
  int n = 1;
  for (int dy = -1; dy <= 1; dy++)
    for (int dx = -1; dx <= 1; dx++) {
      int x = at % w + dx, y = at / w + dy;
      if (x >= 0 && y >= 0 && x < w && y < h)
        n += spread(mask, w, h, y * w + x, seen);
    }
  return n;
}

static void test_runs(void)
{
  const int w = 40, h = 33;
  for (guint32 seed = 1; seed < 12; seed++) {
    g_autofree guint8 *mask = random_mask(w * h, seed, 15 + 3 * seed);
    g_autofree guint8 *seen = g_new0(guint8, w * h);
    g_autoptr(AwMaskRuns) runs = aw_mask_runs(mask, w, h, 1, TRUE);
    guint32 part = 0;
    gint64 largest = 0;
    for (gsize i = 0; i < runs->n_runs; i++) {
      int n = spread(mask, w, h, runs->run[i].y * w + runs->run[i].x0, seen);
      if (n == 0)
        continue;
      g_assert_cmpuint(runs->run[i].part, ==, part);
      g_assert_cmpint(runs->part[part++].n_px, ==, n);
      largest = MAX(largest, n);
    }
    g_assert_cmpuint(runs->n_parts, ==, part);
    g_assert_cmpint(aw_mask_keep_largest(mask, w, h), ==, largest);
  }
}

static void test_holes(void)
{
  char picture[] = "..........."
                   ".####.####."
                   ".#..#.#...."
                   ".####.####."
                   "...........";
  guint8 mask[55], spare[55];
  for (int i = 0; i < 55; i++)
    mask[i] = picture[i] == '#';
  aw_mask_fill_holes(mask, 11, 5, 1);
  g_assert_cmpint(mask[24], ==, 0); /* too large a hole */
  aw_mask_fill_holes(mask, 11, 5, 2);
  g_assert_cmpint(mask[24] + mask[25], ==, 2);
  g_assert_cmpint(mask[29], ==, 0); /* the open bay */
  aw_mask_open(mask, 11, 5, spare);
  g_assert_cmpint(mask[24], ==, 1);
  g_assert_cmpint(mask[12], ==, 0); /* a corner has no room for the cross */
  g_assert_cmpint(mask[40], ==, 0); /* a line of one pixel goes */
}

static void test_watershed(void)
{
  const float value[] = { 1, 5, 4, 4.5f, 2, 6, 1, 3 };
  const guint8 mask[] = { 1, 1, 1, 1, 1, 1, 0, 1 };
  guint32 label[8];
  g_assert_cmpuint(aw_watershed(value, mask, 8, 1, 0, label), ==, 4);
  g_assert_cmpuint(label[5], ==, 1); /* the highest first */
  g_assert_cmpuint(label[1], ==, 2);
  g_assert_cmpuint(label[3], ==, 3);
  g_assert_cmpuint(label[4], ==, 1); /* joins its higher neighbour */
  g_assert_cmpuint(label[6], ==, 0);
  g_assert_cmpuint(label[7], ==, 4);
  g_assert_cmpuint(aw_watershed(value, mask, 8, 1, 1, label), ==, 3); /* the rise of 0.5 does not count */
  g_assert_cmpuint(label[3], ==, label[1]);
  const guint8 none[8] = { 0 };
  g_assert_cmpuint(aw_watershed(value, none, 8, 1, 0, label), ==, 0);
}

static void test_flood_gaps(void)
{
  const float value[] = { 9, 3, 2, 4, 9, 7 };
  const guint8 mask[] = { 1, 1, 1, 1, 1, 0 };
  guint32 label[] = { 1, 0, 0, 0, 2, 0 };
  g_assert_cmpuint(aw_flood_gaps(value, mask, 6, 1, label), ==, 0);
  const guint32 wanted[] = { 1, 1, 2, 2, 2, 0 };
  g_assert_cmpmem(label, sizeof label, wanted, sizeof wanted);
  guint32 far[] = { 0, 0, 0, 0, 0, 0 };
  g_assert_cmpuint(aw_flood_gaps(value, mask, 6, 1, far), ==, 5);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/image/smooth/gaussian", test_gaussian);
  g_test_add_func("/image/smooth/hot-pixel", test_hot_pixel);
  g_test_add_func("/image/smooth/not-finite", test_not_finite);
  g_test_add_func("/image/plane/reduce", test_reduce);
  g_test_add_func("/image/plane/expand", test_expand);
  g_test_add_func("/image/opening/disc", test_opening);
  g_test_add_func("/image/distance/inside", test_distance);
  g_test_add_func("/image/otsu/two-heaps", test_otsu);
  g_test_add_func("/image/rank/quantile", test_rank);
  g_test_add_func("/image/noise/level", test_noise);
  g_test_add_func("/image/runs/parts", test_runs);
  g_test_add_func("/image/runs/holes", test_holes);
  g_test_add_func("/image/watershed/maxima", test_watershed);
  g_test_add_func("/image/watershed/gaps", test_flood_gaps);
  return g_test_run();
}

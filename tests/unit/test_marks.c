/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/random.h"
#include "image/marks.h"
#include "support/check.h"

#define NEAR(a, b, tol) g_assert_cmpfloat_with_epsilon((a), (b), (tol))
#define W 120
#define H 90

/* An empty picture of noise 3 round 100. */
static AwImage *ground(guint64 item)
{
  AwImage *image = aw_image_new(W, H, AW_SAMPLE_F32, NULL);
  AwRandom r = aw_random_stream(17, item);
  for (int i = 0; i < W * H; i++)
    ((float *)image->pixels)[i] = (float)(100 + 3 * aw_random_normal(&r));
  return image;
}

static void add_spot(AwImage *image, double x, double y, double sigma, double height)
{
  for (int iy = 0; iy < H; iy++)
    for (int ix = 0; ix < W; ix++)
      ((float *)image->pixels)[iy * W + ix] +=
          (float)(height * exp(-((ix - x) * (ix - x) + (iy - y) * (iy - y)) / (2 * sigma * sigma)));
}

/* A cross of arms 9 px long and 3 px wide, edges sampled 8 x 8. */
static void add_cross(AwImage *image, double x, double y, double height)
{
  for (int iy = 0; iy < H; iy++)
    for (int ix = 0; ix < W; ix++) {
      int n = 0;
      for (int k = 0; k < 64; k++) {
        double u = fabs(ix + (k % 8 - 3.5) / 8 - x), v = fabs(iy + (k / 8 - 3.5) / 8 - y);
        n += (u <= 1.5 && v <= 9) || (v <= 1.5 && u <= 9);
      }
      ((float *)image->pixels)[iy * W + ix] += (float)(height * n / 64);
    }
}

/* Thompson, Larson & Webb 2002; numbers computed outside from the formula. */
static void test_spot_error(void)
{
  NEAR(aw_mark_spot_error(125, 100, 1000, 0), 4.0569, 1e-4);
  NEAR(aw_mark_spot_error(125, 100, 1000, 3), 4.6884, 1e-4);
  NEAR(aw_mark_spot_error(125, 100, 100, 1), 15.0314, 1e-4);
}

/* The error stated is the one made, over 300 noisy pictures. */
static void test_spot(void)
{
  const AwMarkSettings settings = { .diameter_px = 7 };
  double sum = 0, stated = 0;
  for (guint64 i = 0; i < 300; i++) {
    g_autoptr(AwImage) image = ground(i);
    AwRandom r = aw_random_stream(18, i);
    double x = 40 + 30 * aw_random_unit(&r), y = 30 + 20 * aw_random_unit(&r);
    AwMark mark;
    add_spot(image, x, y, 2.5, 60);
    g_assert_true(aw_mark_find(image, &settings, &mark, NULL));
    sum += (pow(mark.at.x_px - x, 2) + pow(mark.at.y_px - y, 2)) / 600;
    stated += mark.se_px / 300;
    NEAR(mark.noise, 3, 1);
  }
  g_test_message("rms %.4f px, stated %.4f px", sqrt(sum), stated);
  NEAR(sqrt(sum) / stated, 1, 0.15);
  g_assert_cmpfloat(stated, <, 0.1);
}

static void test_dark_cross(void)
{
  const AwMarkSettings settings = { .dark = TRUE, .diameter_px = 14 };
  g_autoptr(AwImage) image = ground(1);
  AwMark mark;
  add_cross(image, 61.3, 44.8, -50);
  add_spot(image, 20, 20, 3, 200); /* a bright spot must not count */
  g_assert_true(aw_mark_find(image, &settings, &mark, NULL));
  NEAR(mark.at.x_px, 61.3, 4 * mark.se_px);
  NEAR(mark.at.y_px, 44.8, 4 * mark.se_px);
  g_assert_cmpfloat(mark.se_px, <, 0.15);
  NEAR(mark.height, 50, 12);
  NEAR(mark.ground, 100, 2);
}

static void test_near(void)
{
  const AwPixelPoint at = { 80, 60 };
  AwMarkSettings settings = { .diameter_px = 6, .near = &at };
  g_autoptr(AwImage) image = ground(2);
  AwMark mark;
  add_spot(image, 30, 30, 2, 300);
  add_spot(image, 84.4, 63.2, 2, 80);
  g_assert_true(aw_mark_find(image, &settings, &mark, NULL));
  NEAR(mark.at.x_px, 84.4, 0.2);
  settings.near = NULL;
  g_assert_true(aw_mark_find(image, &settings, &mark, NULL));
  NEAR(mark.at.x_px, 30, 0.1);
}

static void refuse(const AwImage *image, const AwMarkSettings *settings, AwErrorCode code, const char *words)
{
  AwMark mark;
  GError *error = NULL;
  g_assert_false(aw_mark_find(image, settings, &mark, &error));
  aw_check_error(&error, code, words);
}

static void test_refusals(void)
{
  const AwPixelPoint at = { 20, 70 };
  AwMarkSettings settings = { .diameter_px = 1 };
  g_autoptr(AwImage) image = ground(3);
  refuse(image, &settings, AW_ERROR_RANGE, "1.0 px|2 to 200");
  settings.diameter_px = 6;
  refuse(image, &settings, AW_ERROR_NOT_FOUND, "no bright mark|from the image");
  add_spot(image, 60, 40, 2, 100);
  settings.near = &at;
  refuse(image, &settings, AW_ERROR_NOT_FOUND, "near that pixel");
  settings.near = NULL;
  settings.dark = TRUE;
  refuse(image, &settings, AW_ERROR_NOT_FOUND, "no dark mark");
  settings.dark = FALSE;
  add_spot(image, 90, 40, 2, 97);
  refuse(image, &settings, AW_ERROR_RANGE, "two marks|(60, 40)|(90, 40)");
  add_spot(image, 3, 40, 2, 400);
  refuse(image, &settings, AW_ERROR_RANGE, "(3, 40)|edge");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/image/marks/spot-error", test_spot_error);
  g_test_add_func("/image/marks/spot", test_spot);
  g_test_add_func("/image/marks/dark-cross", test_dark_cross);
  g_test_add_func("/image/marks/near", test_near);
  g_test_add_func("/image/marks/refusals", test_refusals);
  return g_test_run();
}

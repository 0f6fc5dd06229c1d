/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/image.h"

#include "../support/check.h"
#include "base/limits.h"

static void samples(void)
{
  static const struct {
    AwSample sample;
    gsize bytes;
    double full_scale;
  } cases[] = { { AW_SAMPLE_U8, 1, 255 }, { AW_SAMPLE_U16, 2, 65535 }, { AW_SAMPLE_F32, 4, 0 } };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    GError *error = NULL;
    g_autoptr(AwImage) image = aw_image_new(7, 5, cases[i].sample, &error);
    g_assert_no_error(error);
    g_assert_cmpuint(aw_sample_bytes(cases[i].sample), ==, cases[i].bytes);
    g_assert_cmpfloat(image->full_scale, ==, cases[i].full_scale);
    g_assert_cmpint(image->width_px, ==, 7);
    g_assert_cmpint(image->height_px, ==, 5);
    for (int y = 0; y < 5; y++)
      for (int x = 0; x < 7; x++)
        g_assert_cmpfloat(aw_image_value(image, x, y), ==, 0);
  }
}

static void values(void)
{
  g_autoptr(AwImage) u8 = aw_image_new(3, 2, AW_SAMPLE_U8, NULL);
  g_autoptr(AwImage) u16 = aw_image_new(3, 2, AW_SAMPLE_U16, NULL);
  g_autoptr(AwImage) f32 = aw_image_new(3, 2, AW_SAMPLE_F32, NULL);
  ((guint8 *)u8->pixels)[5] = 211;
  ((guint16 *)u16->pixels)[3] = 60123;
  ((float *)f32->pixels)[1] = -2.75f;
  g_assert_cmpfloat(aw_image_value(u8, 2, 1), ==, 211);
  g_assert_cmpfloat(aw_image_value(u16, 0, 1), ==, 60123);
  g_assert_cmpfloat(aw_image_value(f32, 1, 0), ==, -2.75);
}

static void labels(void)
{
  GError *error = NULL;
  g_autoptr(AwLabels) labels = aw_labels_new(3, 2, &error);
  g_assert_no_error(error);
  g_assert_cmpuint(labels->n_labels, ==, 0);
  for (int i = 0; i < 6; i++)
    g_assert_cmpuint(labels->label[i], ==, 0);
}

static void refused_sides(void)
{
  static const int bad[][2] = { { 0, 5 }, { 5, 0 }, { -1, 5 }, { AW_MAX_SIDE_PX + 1, 1 }, { 1, AW_MAX_SIDE_PX + 1 } };
  GError *error = NULL;
  for (gsize i = 0; i < G_N_ELEMENTS(bad); i++) {
    g_assert_null(aw_image_new(bad[i][0], bad[i][1], AW_SAMPLE_U8, &error));
    aw_check_error(&error, AW_ERROR_RANGE, "px is outside the limits (1 to 200000 px a side)");
    g_assert_null(aw_labels_new(bad[i][0], bad[i][1], &error));
    aw_check_error(&error, AW_ERROR_RANGE, "outside the limits");
  }
  aw_image_free(NULL);
  aw_labels_free(NULL);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/image/image/samples", samples);
  g_test_add_func("/image/image/values", values);
  g_test_add_func("/image/image/labels", labels);
  g_test_add_func("/image/image/refused_sides", refused_sides);
  return g_test_run();
}

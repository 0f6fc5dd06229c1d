/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/overview.h"

#include <string.h>

#include "../support/check.h"
#include "image/writer.h"

static void factor(void)
{
  g_assert_cmpint(aw_overview_factor(100, 40, 100), ==, 1);
  g_assert_cmpint(aw_overview_factor(101, 40, 100), ==, 2);
  g_assert_cmpint(aw_overview_factor(40, 1000, 100), ==, 10);
  g_assert_cmpint(aw_overview_factor(3, 2, 100), ==, 1);
}

/* 5 x 3 by the factor 2: the last column and row are means of what is there. */
static void means(void)
{
  static const AwSample samples[] = { AW_SAMPLE_U8, AW_SAMPLE_U16, AW_SAMPLE_F32 };
  for (gsize s = 0; s < G_N_ELEMENTS(samples); s++) {
    g_autoptr(AwImage) image = aw_image_new(5, 3, samples[s], NULL);
    for (int i = 0; i < 15; i++)
      if (samples[s] == AW_SAMPLE_U8)
        ((guint8 *)image->pixels)[i] = (guint8)(i + 1);
      else if (samples[s] == AW_SAMPLE_U16)
        ((guint16 *)image->pixels)[i] = (guint16)(i + 1);
      else
        ((float *)image->pixels)[i] = (float)(i + 1);
    g_autoptr(AwImage) small = aw_image_shrink(image, 3, NULL);
    g_assert_cmpint(small->width_px, ==, 3);
    g_assert_cmpint(small->height_px, ==, 2);
    const double want[] = { (1 + 2 + 6 + 7) / 4.0, (3 + 4 + 8 + 9) / 4.0, (5 + 10) / 2.0, 11.5, 13.5, 15 };
    for (int i = 0; i < 6; i++)
      g_assert_cmpfloat(aw_image_value(small, i % 3, i / 3), ==, want[i]);
  }
}

static AwImage *ramp(int width_px, int height_px)
{
  AwImage *image = aw_image_new(width_px, height_px, AW_SAMPLE_U16, NULL);
  for (int i = 0; i < width_px * height_px; i++)
    ((guint16 *)image->pixels)[i] = (guint16)((guint)i * 7919u % 50021u);
  return image;
}

/* 3000 px wide makes bands of 1398 rows rounded to the factor; the whole image gives the same. */
static void from_file(void)
{
  g_autoptr(GError) error = NULL;
  char *folder = aw_scratch_new();
  g_autofree char *path = g_build_filename(folder, "a.tif", NULL);
  g_autoptr(AwImage) image = ramp(3001, 2903);
  g_assert_true(aw_image_write_tiff(image, path, 0, NULL));
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, &error);
  g_autoptr(AwImage) banded = aw_image_reader_shrink(reader, 500, &error);
  g_assert_no_error(error);
  g_autoptr(AwImage) whole = aw_image_shrink(image, 500, NULL);
  g_assert_cmpint(whole->width_px, ==, (3001 + 6) / 7);
  g_assert_cmpmem(banded->pixels, (gsize)(banded->width_px * banded->height_px) * 4, whole->pixels,
                  (gsize)(whole->width_px * whole->height_px) * 4);
  aw_scratch_remove(folder);
}

static void contrast(void)
{
  double low, high;
  g_autoptr(AwImage) image = aw_image_new(1000, 1, AW_SAMPLE_U16, NULL);
  for (int i = 0; i < 1000; i++) /* the values 0 ... 999 in another order */
    ((guint16 *)image->pixels)[i] = (guint16)((i * 617) % 1000);
  g_assert_true(aw_image_contrast(image, &low, &high, NULL));
  g_assert_cmpfloat(low, ==, 9);    /* floor (0.01 x 999) */
  g_assert_cmpfloat(high, ==, 997); /* floor (0.998 x 999) */
}

static void picture(void)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(AwImage) image = aw_image_new(5, 1, AW_SAMPLE_U16, NULL);
  memcpy(image->pixels, (guint16[]){ 50, 100, 150, 200, 9000 }, 10);
  g_autoptr(GBytes) png = aw_image_overview(image, 100, 100, 200, &error);
  g_assert_no_error(error);
  g_autoptr(AwImage) back = aw_overview_decode(png, "frame 1", &error);
  g_assert_no_error(error);
  g_assert_cmpint(back->sample, ==, AW_SAMPLE_U8);
  g_assert_cmpmem(back->pixels, 5, ((guint8[]){ 0, 0, 128, 255, 255 }), 5);
  /* no contrast: a flat frame must not divide by zero */
  g_autoptr(GBytes) flat = aw_image_overview(image, 100, 150, 150, &error);
  g_autoptr(AwImage) flat_back = aw_overview_decode(flat, "frame 1", &error);
  g_assert_cmpmem(flat_back->pixels, 5, ((guint8[]){ 0, 0, 0, 255, 255 }), 5);
}

static void same_bytes(void)
{
  g_autoptr(AwImage) image = ramp(300, 200);
  g_autoptr(GBytes) a = aw_image_overview(image, 128, 10, 40000, NULL);
  g_autoptr(GBytes) b = aw_image_overview(image, 128, 10, 40000, NULL);
  g_assert_true(g_bytes_equal(a, b));
}

static void damaged(void)
{
  GError *error = NULL;
  g_autoptr(AwImage) image = ramp(60, 50);
  g_autoptr(GBytes) png = aw_image_overview(image, 64, 0, 50021, NULL);
  for (gsize n = 0; n < g_bytes_get_size(png); n += 1 + n / 40) {
    g_autoptr(GBytes) cut = g_bytes_new_from_bytes(png, 0, n);
    g_assert_null(aw_overview_decode(cut, "the picture of frame 7", &error));
    aw_check_error(&error, AW_ERROR_FORMAT, "the picture of frame 7 is a damaged PNG");
  }
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/image/overview/factor", factor);
  g_test_add_func("/image/overview/means", means);
  g_test_add_func("/image/overview/from-file", from_file);
  g_test_add_func("/image/overview/contrast", contrast);
  g_test_add_func("/image/overview/picture", picture);
  g_test_add_func("/image/overview/same-bytes", same_bytes);
  g_test_add_func("/image/overview/damaged", damaged);
  return g_test_run();
}

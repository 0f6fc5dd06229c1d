/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "../support/check.h"
#include "../support/png_bytes.h"
#include "image/reader.h"

static AwImage *load(const PngBytes *png, int page, int channel, AwImageInfo *info, GError **error)
{
  char *folder = aw_scratch_new();
  g_autoptr(GByteArray) bytes = png_bytes(png);
  g_autofree char *path = png_bytes_save(bytes, folder, "a.png", 0);
  AwImage *image = aw_image_load(path, page, channel, info, error);
  aw_scratch_remove(folder);
  return image;
}

static void depths(void)
{
  static const struct {
    PngBytes png;
    AwSample sample;
    double full_scale, values[4];
  } cases[] = {
    { { 2, 2, 1, 0, 0, "\0\x40\0\x80", 4, 0, NULL }, AW_SAMPLE_U8, 1, { 0, 1, 1, 0 } },
    { { 2, 2, 2, 0, 0, "\0\x40\0\xb0", 4, 0, NULL }, AW_SAMPLE_U8, 3, { 1, 0, 2, 3 } },
    { { 2, 2, 4, 0, 0, "\0\x4f\0\xb0", 4, 0, NULL }, AW_SAMPLE_U8, 15, { 4, 15, 11, 0 } },
    { { 2, 2, 8, 0, 0, "\0\x4f\1\0\xb0\xff", 6, 0, NULL }, AW_SAMPLE_U8, 255, { 79, 1, 176, 255 } },
    { { 2, 2, 16, 0, 0, "\0\1\2\3\4\0\xff\xff\0\5", 10, 0, NULL }, AW_SAMPLE_U16, 65535, { 258, 772, 65535, 5 } },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autoptr(GError) error = NULL;
    AwImageInfo info;
    g_autoptr(AwImage) image = load(&cases[i].png, 0, -1, &info, &error);
    g_assert_no_error(error);
    g_assert_cmpint(info.sample, ==, cases[i].sample);
    g_assert_cmpfloat(info.full_scale, ==, cases[i].full_scale);
    g_assert_cmpfloat(image->full_scale, ==, cases[i].full_scale);
    g_assert_cmpfloat(info.pixel_um, ==, 0);
    g_assert_true(isnan(info.taken_at_unix_s));
    for (int k = 0; k < 4; k++)
      g_assert_cmpfloat(aw_image_value(image, k % 2, k / 2), ==, cases[i].values[k]);
  }
}

static void pixel_size(void)
{
  PngBytes png = { 1, 1, 8, 0, 0, "\0\7", 2, 2000000, NULL };
  AwImageInfo info;
  g_autoptr(AwImage) image = load(&png, 0, 0, &info, NULL);
  g_assert_cmpfloat_with_epsilon(info.pixel_um, 0.5, 1e-12);
  png.per_metre = 2835; /* 72 dpi */
  g_autoptr(AwImage) screen = load(&png, 0, 0, &info, NULL);
  g_assert_cmpfloat(info.pixel_um, ==, 0);
}

/* Rows above the last ones read begin the file again. */
static void rectangles(void)
{
  char rows[9 * 8];
  for (int y = 0; y < 9; y++)
    for (int x = 0; x < 8; x++)
      rows[y * 8 + x] = (char)(x == 0 ? 0 : y * 7 + x - 1);
  const PngBytes png = { 7, 9, 8, 0, 0, rows, sizeof rows, 0, NULL };
  char *folder = aw_scratch_new();
  g_autoptr(GByteArray) bytes = png_bytes(&png);
  g_autofree char *path = png_bytes_save(bytes, folder, "a.png", 0);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, NULL);
  const AwRect rects[] = { { 0, 2, 7, 4 }, { 3, 4, 5, 9 }, { 1, 0, 2, 9 }, { 0, 8, 7, 9 }, { 6, 8, 7, 9 } };
  for (gsize i = 0; i < G_N_ELEMENTS(rects); i++) {
    AwRect r = rects[i];
    g_autoptr(AwImage) image = aw_image_reader_read(reader, r, NULL);
    for (int y = r.y0; y < r.y1; y++)
      for (int x = r.x0; x < r.x1; x++)
        g_assert_cmpfloat(aw_image_value(image, x - r.x0, y - r.y0), ==, y * 7 + x);
  }
  aw_scratch_remove(folder);
}

static void colours(void)
{
  GError *error = NULL;
  const PngBytes grey = { 2, 1, 8, 2, 0, "\0\5\5\5\x63\x63\x63", 7, 0, NULL };
  const PngBytes colour = { 2, 1, 8, 2, 0, "\0\5\5\5\x63\x63\x62", 7, 0, NULL };
  g_autoptr(AwImage) image = load(&grey, 0, -1, NULL, &error);
  g_assert_no_error(error);
  g_assert_cmpfloat(aw_image_value(image, 1, 0), ==, 99);
  g_assert_null(load(&colour, 0, -1, NULL, &error));
  aw_check_error(&error, AW_ERROR_UNSUPPORTED, "a.png|channels differ (first at x 1, y 0)|--channel 0 to 2");
  g_autoptr(AwImage) blue = load(&colour, 0, 2, NULL, &error);
  g_assert_cmpfloat(aw_image_value(blue, 1, 0), ==, 98);
  g_assert_null(load(&colour, 0, 3, NULL, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "a.png|no channel 3; it has 3, counted from 0");
  g_assert_null(load(&colour, 1, 0, NULL, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "a.png|no page 1; a PNG file has 1");
}

static void refused_forms(void)
{
  static const struct {
    PngBytes png;
    AwErrorCode code;
    const char *parts;
  } cases[] = {
    { { 1, 1, 8, 3, 0, "\0\1", 2, 0, "\1\2\3\4\5\6" }, AW_ERROR_UNSUPPORTED, "a.png|palette|save it as grey" },
    { { 1, 1, 8, 4, 0, "\0\1\xff", 3, 0, NULL }, AW_ERROR_UNSUPPORTED, "a.png|transparency" },
    { { 1, 1, 8, 6, 0, "\0\1\2\3\xff", 5, 0, NULL }, AW_ERROR_UNSUPPORTED, "a.png|transparency" },
    { { 1, 1, 8, 0, 1, "\0\1", 2, 0, NULL }, AW_ERROR_UNSUPPORTED, "a.png|interlaced" },
    { { 0, 1, 8, 0, 0, "\0\1", 2, 0, NULL }, AW_ERROR_FORMAT, "a.png is a damaged PNG: " },
    { { 200001, 1, 8, 0, 0, "\0\1", 2, 0, NULL }, AW_ERROR_FORMAT, "a.png is a damaged PNG: " },
    { { 150000, 150000, 8, 0, 0, "\0\1", 2, 0, NULL }, AW_ERROR_FORMAT, "a.png|claims 150000 x 150000 px" },
    { { 1, 1, 9, 0, 0, "\0\1", 2, 0, NULL }, AW_ERROR_FORMAT, "a.png is a damaged PNG: " },
    { { 4, 4, 8, 0, 0, "\0\1\2\3\4", 5, 0, NULL }, AW_ERROR_FORMAT, "a.png is a damaged PNG: " },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    GError *error = NULL;
    g_assert_null(load(&cases[i].png, 0, -1, NULL, &error));
    aw_check_error(&error, cases[i].code, cases[i].parts);
  }
}

/* Cut anywhere, or with any byte of the compressed pixels changed, the file is refused. */
static void damaged(void)
{
  const PngBytes png = { 3, 3, 8, 0, 0, "\0\1\2\3\0\4\5\6\0\7\x8\x9", 12, 0, NULL };
  GError *error = NULL;
  char *folder = aw_scratch_new();
  g_autoptr(GByteArray) bytes = png_bytes(&png);
  for (guint n = 9; n < bytes->len; n++) {
    g_autofree char *path = png_bytes_save(bytes, folder, "a.png", n);
    g_assert_null(aw_image_load(path, 0, -1, NULL, &error));
    aw_check_error(&error, AW_ERROR_FORMAT, "a.png is a damaged PNG: ");
  }
  for (guint at = 33 + 8; at < bytes->len - 16; at++) {
    bytes->data[at] ^= 0x10;
    g_autofree char *path = png_bytes_save(bytes, folder, "a.png", 0);
    g_assert_null(aw_image_load(path, 0, -1, NULL, &error));
    aw_check_error(&error, AW_ERROR_FORMAT, "a.png is a damaged PNG: ");
    bytes->data[at] ^= 0x10;
  }
  aw_scratch_remove(folder);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/image/png/depths", depths);
  g_test_add_func("/image/png/pixel-size", pixel_size);
  g_test_add_func("/image/png/rectangles", rectangles);
  g_test_add_func("/image/png/colours", colours);
  g_test_add_func("/image/png/refused-forms", refused_forms);
  g_test_add_func("/image/png/damaged", damaged);
  return g_test_run();
}

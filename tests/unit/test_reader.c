/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Pixels and metadata of well-formed files, built byte by byte; bad files are in test_reader_bad.c, files written by
 * other programs in tests/reference/test_images.py. */
#include "image/reader.h"

#include <string.h>

#include "../support/check.h"
#include "../support/tiff_bytes.h"
#include "base/pool.h"

static void check_values(const AwImage *image, const double *want)
{
  for (int y = 0; y < image->height_px; y++)
    for (int x = 0; x < image->width_px; x++)
      g_assert_cmpfloat(aw_image_value(image, x, y), ==, want[y * image->width_px + x]);
}

/* Saves, loads page 0 and compares. */
static void check_load(TiffBytes *t, int channel, const double *want, AwImageInfo *info, double full_scale)
{
  g_autoptr(GError) error = NULL;
  char *folder = aw_scratch_new();
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  AwImageInfo about;
  g_autoptr(AwImage) image = aw_image_load(path, 0, channel, &about, &error);
  g_assert_no_error(error);
  check_values(image, want);
  g_assert_cmpfloat(image->full_scale, ==, full_scale);
  if (info)
    *info = about;
  aw_scratch_remove(folder);
}

static void eight_bit(void)
{
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  AwImageInfo info;
  tiff_bytes_grey(t, 3, 2, 8, "\x01\x7f\xff\x00\x13\x80", 6);
  check_load(t, -1, (double[]){ 1, 127, 255, 0, 19, 128 }, &info, 255);
  g_assert_cmpint(info.sample, ==, AW_SAMPLE_U8);
  g_assert_cmpint(info.width_px, ==, 3);
  g_assert_cmpint(info.height_px, ==, 2);
  g_assert_cmpfloat(info.pixel_um, ==, 0);
  g_assert_false(info.has_position);
  g_assert_true(isnan(info.taken_at_unix_s));
}

static void sixteen_bit(void)
{
  for (int big = 0; big < 2; big++) {
    g_autoptr(TiffBytes) t = tiff_bytes_new(big);
    tiff_bytes_grey(t, 2, 2, 16, big ? "\x01\x02\xff\xff\x00\x05\x10\x00" : "\x02\x01\xff\xff\x05\x00\x00\x10", 8);
    check_load(t, -1, (double[]){ 0x102, 65535, 5, 4096 }, NULL, 65535);
  }
}

static void white_is_zero(void)
{
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 2, 1, 16, "\x00\x00\x01\x10", 4);
  tiff_bytes_set(t, 262, TIFF_U16, 0);
  check_load(t, 0, (double[]){ 65535, 65535 - 0x1001 }, NULL, 65535);
  g_autoptr(TiffBytes) u8 = tiff_bytes_new(FALSE);
  tiff_bytes_grey(u8, 2, 1, 8, "\x00\xfe", 2);
  tiff_bytes_set(u8, 262, TIFF_U16, 0);
  check_load(u8, 0, (double[]){ 255, 1 }, NULL, 255);
}

static void twelve_in_sixteen(void)
{
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 2, 1, 16, "\xff\x0f\x01\x00", 4);
  tiff_bytes_set(t, 281, TIFF_U16, 4095);
  check_load(t, -1, (double[]){ 4095, 1 }, NULL, 4095);
  /* a pixel above the declared largest value shows that it is none */
  g_autoptr(TiffBytes) above = tiff_bytes_new(FALSE);
  tiff_bytes_grey(above, 2, 1, 16, "\x00\x10\x01\x00", 4);
  tiff_bytes_set(above, 281, TIFF_U16, 4095);
  check_load(above, -1, (double[]){ 4096, 1 }, NULL, 65535);
  /* the largest value of this one picture, as tag 281 is also used */
  g_autoptr(TiffBytes) largest = tiff_bytes_new(FALSE);
  tiff_bytes_grey(largest, 2, 1, 16, "\xb8\x0b\x01\x00", 4);
  tiff_bytes_set(largest, 281, TIFF_U16, 3000);
  check_load(largest, -1, (double[]){ 3000, 1 }, NULL, 65535);
  g_autoptr(TiffBytes) smax = tiff_bytes_new(FALSE);
  tiff_bytes_grey(smax, 2, 1, 16, "\xb8\x0b\x01\x00", 4);
  tiff_bytes_set(smax, 341, TIFF_U16, 16383);
  check_load(smax, -1, (double[]){ 3000, 1 }, NULL, 16383);
}

/* Three 12-bit values in five bytes, the rows byte-aligned. */
static void twelve_packed(void)
{
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  AwImageInfo info;
  tiff_bytes_grey(t, 3, 2, 12, "\xab\xc1\x23\xff\xf0\x00\x10\x02\x7f\xe0", 10);
  check_load(t, -1, (double[]){ 0xabc, 0x123, 0xfff, 1, 2, 0x7fe }, &info, 4095);
  g_assert_cmpint(info.sample, ==, AW_SAMPLE_U16);
  g_autoptr(TiffBytes) ten = tiff_bytes_new(TRUE);
  tiff_bytes_grey(ten, 2, 1, 10, "\xff\xc0\x10", 3);
  check_load(ten, -1, (double[]){ 1023, 1 }, NULL, 1023);
}

static void part_of_packed(void)
{
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 3, 2, 12, "\xab\xc1\x23\xff\xf0\x00\x10\x02\x7f\xe0", 10);
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, NULL);
  g_autoptr(AwImage) part = aw_image_reader_read(reader, (AwRect){ 1, 0, 3, 2 }, NULL);
  check_values(part, (double[]){ 0x123, 0xfff, 2, 0x7fe });
  aw_scratch_remove(folder);
}

static void floats(void)
{
  const float values[] = { -2.75f, 1e6f, 0, 0.1f };
  g_autoptr(TiffBytes) t = tiff_bytes_new(G_BYTE_ORDER == G_BIG_ENDIAN);
  tiff_bytes_grey(t, 2, 2, 32, values, sizeof values);
  tiff_bytes_set(t, 339, TIFF_U16, 3);
  check_load(t, -1, (double[]){ -2.75, 1e6, 0, (double)0.1f }, NULL, 0);
}

static TiffBytes *rgb(const char *pixels, gboolean separate)
{
  TiffBytes *t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 2, 2, 8, pixels, 12);
  guint32 at = 8;
  tiff_bytes_set_list(t, 258, TIFF_U16, (guint32[]){ 8, 8, 8 }, 3);
  tiff_bytes_set(t, 262, TIFF_U16, 2);
  tiff_bytes_set(t, 277, TIFF_U16, 3);
  if (separate) {
    tiff_bytes_set(t, 284, TIFF_U16, 2);
    tiff_bytes_set_list(t, 273, TIFF_U32, (guint32[]){ at, at + 4, at + 8 }, 3);
    tiff_bytes_set_list(t, 279, TIFF_U32, (guint32[]){ 4, 4, 4 }, 3);
  }
  return t;
}

static void grey_in_rgb(void)
{
  g_autoptr(TiffBytes) side = rgb("\1\1\1\5\5\5\x63\x63\x63\7\7\7", FALSE);
  check_load(side, -1, (double[]){ 1, 5, 99, 7 }, NULL, 255);
  g_autoptr(TiffBytes) planes = rgb("\1\5\x63\7\1\5\x63\7\1\5\x63\7", TRUE);
  check_load(planes, -1, (double[]){ 1, 5, 99, 7 }, NULL, 255);
}

/* 16-bit RGB and big-endian floats, the forms whose bytes are moved one by one. */
static void wide_samples(void)
{
  g_autoptr(TiffBytes) colour = tiff_bytes_new(TRUE);
  tiff_bytes_grey(colour, 2, 1, 16, "\1\0\1\0\1\0\2\1\2\1\2\1", 12);
  tiff_bytes_set_list(colour, 258, TIFF_U16, (guint32[]){ 16, 16, 16 }, 3);
  tiff_bytes_set(colour, 262, TIFF_U16, 2);
  tiff_bytes_set(colour, 277, TIFF_U16, 3);
  check_load(colour, -1, (double[]){ 256, 513 }, NULL, 65535);
  g_autoptr(TiffBytes) real = tiff_bytes_new(TRUE);
  tiff_bytes_grey(real, 2, 1, 32, "\xc0\x30\0\0\x3f\x80\0\0", 8);
  tiff_bytes_set(real, 339, TIFF_U16, 3);
  check_load(real, -1, (double[]){ -2.75, 1 }, NULL, 0);
  g_autoptr(TiffBytes) no_format = tiff_bytes_new(TRUE);
  tiff_bytes_grey(no_format, 1, 1, 16, "\1\2", 2);
  tiff_bytes_set(no_format, 339, TIFF_U16, 4);
  check_load(no_format, -1, (double[]){ 258 }, NULL, 65535);
}

static void chosen_channel(void)
{
  g_autoptr(TiffBytes) side = rgb("\1\2\3\5\6\7\11\12\13\15\16\17", FALSE);
  check_load(side, 1, (double[]){ 2, 6, 10, 14 }, NULL, 255);
  g_autoptr(TiffBytes) planes = rgb("\1\2\3\5\6\7\11\12\13\15\16\17", TRUE);
  check_load(planes, 2, (double[]){ 11, 13, 14, 15 }, NULL, 255);
}

static void resolution(void)
{
  static const struct {
    int unit; /* 0: no tag */
    guint32 over, under;
    double um;
  } cases[] = {
    { 3, 31007752, 1000, 0.3225 }, /* check-values of the project: 0.3225 um = 31007.752 px/cm = 78759.690 px/in */
    { 2, 78759690, 1000, 0.3225 },
    { 0, 78759690, 1000, 0.3225 },
    { 1, 31007752, 1000, 0 }, /* no unit */
    { 2, 72, 1, 0 },          /* a screen's */
    { 2, 300, 1, 0 },         /* a printer's */
    { 3, 0, 1, 0 },
    { 3, 1, 0, 0 },
    { 3, 200, 1, 50 },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
    AwImageInfo info;
    tiff_bytes_grey(t, 1, 1, 8, "\x09", 1);
    tiff_bytes_set_ratio(t, 282, cases[i].over, cases[i].under);
    if (cases[i].unit)
      tiff_bytes_set(t, 296, TIFF_U16, (guint32)cases[i].unit);
    check_load(t, -1, (double[]){ 9 }, &info, 255);
    g_assert_cmpfloat_with_epsilon(info.pixel_um, cases[i].um, 1e-7);
    g_assert_cmpfloat(info.pixel_y_um, ==, info.pixel_um);
  }
}

static void oblong_pixels(void)
{
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  AwImageInfo info;
  tiff_bytes_grey(t, 1, 1, 8, "\x09", 1);
  tiff_bytes_set_ratio(t, 282, 20000, 1);
  tiff_bytes_set_ratio(t, 283, 10000, 1);
  tiff_bytes_set(t, 296, TIFF_U16, 3);
  check_load(t, -1, (double[]){ 9 }, &info, 255);
  g_assert_cmpfloat_with_epsilon(info.pixel_um, 0.5, 1e-9);
  g_assert_cmpfloat_with_epsilon(info.pixel_y_um, 1.0, 1e-9);
}

static void other_description(void)
{
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 1, 1, 8, "\x09", 1);
  tiff_bytes_set_text(t, 270, "<note>PhysicalSizeX=\"3\" unit=micron</note>");
  check_load(t, -1, (double[]){ 9 }, NULL, 255);
}

static void pages(void)
{
  g_autoptr(GError) error = NULL;
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  for (int page = 0; page < 3; page++) {
    guint8 value = (guint8)(10 + page);
    tiff_bytes_grey(t, 1, 1, 8, &value, 1);
    tiff_bytes_end_page(t);
  }
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  for (int page = 2; page >= 0; page--) {
    g_autoptr(AwImageReader) reader = aw_image_reader_open(path, page, -1, &error);
    g_assert_no_error(error);
    g_assert_cmpint(aw_image_reader_n_pages(reader), ==, 3);
    g_assert_cmpint(aw_image_reader_n_channels(reader), ==, 1);
    g_autoptr(AwImage) image = aw_image_reader_read(reader, (AwRect){ 0, 0, 1, 1 }, &error);
    check_values(image, (double[]){ 10 + page });
  }
  aw_scratch_remove(folder);
}

/* Every rectangle of a 7 x 9 picture whose pixels count from 0. */
static void check_rectangles(AwImageReader *reader)
{
  for (int y0 = 0; y0 < 9; y0++)
    for (int y1 = y0 + 1; y1 <= 9; y1++)
      for (int x0 = 0; x0 < 7; x0 += 3)
        for (int x1 = x0 + 1; x1 <= 7; x1 += 2) {
          g_autoptr(AwImage) image = aw_image_reader_read(reader, (AwRect){ x0, y0, x1, y1 }, NULL);
          for (int y = y0; y < y1; y++)
            for (int x = x0; x < x1; x++)
              g_assert_cmpfloat(aw_image_value(image, x - x0, y - y0), ==, y * 7 + x);
        }
}

/* Strips of two rows, the last of one, in the order given: strip i begins at byte 8 + 14 order[i]. */
static void check_strips(const guint32 *order)
{
  char *folder = aw_scratch_new();
  guint8 pixels[70] = { 0 };
  guint32 at[5], n_bytes[5];
  for (guint32 i = 0; i < 5; i++) {
    at[i] = 8 + 14 * order[i];
    n_bytes[i] = i < 4 ? 14 : 7;
    for (guint32 k = 0; k < n_bytes[i]; k++)
      pixels[14 * order[i] + k] = (guint8)(14 * i + k);
  }
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 7, 9, 8, pixels, sizeof pixels);
  tiff_bytes_set(t, 278, TIFF_U32, 2);
  tiff_bytes_set_list(t, 273, TIFF_U32, at, 5);
  tiff_bytes_set_list(t, 279, TIFF_U32, n_bytes, 5);
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, NULL);
  check_rectangles(reader);
  aw_scratch_remove(folder);
}

static void rectangles_of_strips(void)
{
  check_strips((guint32[]){ 0, 1, 2, 3, 4 }); /* in one piece */
  check_strips((guint32[]){ 3, 1, 4, 0, 2 });
}

static void rectangles_of_tiles(void)
{
  char *folder = aw_scratch_new();
  guint8 pixels[4 * 16 * 16]; /* 2 x 2 tiles of 16 x 16 for 20 x 18 px */
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  for (int y = 0; y < 32; y++)
    for (int x = 0; x < 32; x++)
      pixels[((y / 16) * 2 + x / 16) * 256 + (y % 16) * 16 + x % 16] = (guint8)(y * 13 + x);
  tiff_bytes_grey(t, 20, 18, 8, pixels, sizeof pixels);
  tiff_bytes_drop(t, 273);
  tiff_bytes_drop(t, 278);
  tiff_bytes_drop(t, 279);
  tiff_bytes_set(t, 322, TIFF_U32, 16);
  tiff_bytes_set(t, 323, TIFF_U32, 16);
  tiff_bytes_set_list(t, 324, TIFF_U32, (guint32[]){ 8, 264, 520, 776 }, 4);
  tiff_bytes_set_list(t, 325, TIFF_U32, (guint32[]){ 256, 256, 256, 256 }, 4);
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, NULL);
  const AwRect rects[] = { { 0, 0, 20, 18 }, { 15, 15, 17, 17 }, { 16, 0, 20, 16 }, { 3, 17, 4, 18 } };
  for (gsize i = 0; i < G_N_ELEMENTS(rects); i++) {
    AwRect r = rects[i];
    g_autoptr(AwImage) image = aw_image_reader_read(reader, r, NULL);
    for (int y = r.y0; y < r.y1; y++)
      for (int x = r.x0; x < r.x1; x++)
        g_assert_cmpfloat(aw_image_value(image, x - r.x0, y - r.y0), ==, (guint8)(y * 13 + x));
  }
  aw_scratch_remove(folder);
}

/* One PackBits strip of 16400 x 8200 px, too long to be held whole; row y is all y mod 251. */
static TiffBytes *long_strip(void)
{
  g_autoptr(GByteArray) packed = g_byte_array_new();
  for (int y = 0; y < 8200; y++)
    for (int x = 0; x < 16400; x += 128)
      g_byte_array_append(packed, (guint8[]){ (guint8)(257 - MIN(128, 16400 - x)), (guint8)(y % 251) }, 2);
  TiffBytes *t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 16400, 8200, 8, packed->data, packed->len);
  tiff_bytes_set(t, 259, TIFF_U16, 32773);
  tiff_bytes_end_page(t);
  return t;
}

static void long_strips(void)
{
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = long_strip();
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, NULL);
  /* on from the last row, back to the top, and over a gap */
  const AwRect rects[] = { { 0, 0, 9, 300 }, { 16390, 300, 16400, 310 }, { 5, 2, 6, 4 }, { 100, 8190, 104, 8200 } };
  for (gsize i = 0; i < G_N_ELEMENTS(rects); i++) {
    AwRect r = rects[i];
    g_autoptr(AwImage) image = aw_image_reader_read(reader, r, NULL);
    for (int y = r.y0; y < r.y1; y++)
      for (int x = r.x0; x < r.x1; x++)
        g_assert_cmpfloat(aw_image_value(image, x - r.x0, y - r.y0), ==, y % 251);
  }
  aw_scratch_remove(folder);
}

/* A run over the end of row 1000; what stands above it can still be read. */
static void broken_long_strip(void)
{
  char *folder = aw_scratch_new();
  GError *error = NULL;
  g_autoptr(TiffBytes) t = long_strip();
  GByteArray *all = tiff_bytes_all(t);
  for (guint i = 8 + 1000 * 258; i < all->len - 200; i++)
    all->data[i] = 0x80; /* no operation */
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, &error);
  g_assert_no_error(error);
  g_assert_null(aw_image_reader_read(reader, (AwRect){ 0, 990, 3, 1010 }, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "a.tif, page 0 is damaged: row 1000 cannot be decoded: ");
  g_autoptr(AwImage) above = aw_image_reader_read(reader, (AwRect){ 0, 990, 3, 1000 }, &error);
  g_assert_no_error(error);
  g_assert_cmpfloat(aw_image_value(above, 2, 9), ==, 999 % 251);
  aw_scratch_remove(folder);
}

static gboolean read_page(gsize item, guint worker, gpointer data, GError **error)
{
  (void)worker;
  g_autoptr(AwImage) image = aw_image_load(data, (int)item % 40, -1, NULL, error);
  return image && aw_image_value(image, 3, 2) == (double)(item % 40);
}

/* Many readers on one file at a time. */
static void side_by_side(void)
{
  char *folder = aw_scratch_new();
  g_autoptr(GError) error = NULL;
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  for (int page = 0; page < 40; page++) {
    const guint8 packed[] = { 0xf5, (guint8)page }; /* PackBits: twelve times */
    tiff_bytes_grey(t, 4, 3, 8, packed, sizeof packed);
    tiff_bytes_set(t, 259, TIFF_U16, 32773);
    tiff_bytes_set(t, 278, TIFF_U32, 3);
    tiff_bytes_end_page(t);
  }
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  g_assert_true(aw_pool_run(4, 400, read_page, path, "reading", NULL, &error));
  g_assert_no_error(error);
  aw_scratch_remove(folder);
}

/* The name says PNG, the bytes TIFF: the bytes count. */
static void content_not_name(void)
{
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 1, 1, 8, "\x2a", 1);
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "a.png", 0);
  g_autoptr(AwImage) image = aw_image_load(path, 0, -1, NULL, NULL);
  g_assert_nonnull(image);
  check_values(image, (double[]){ 42 });
  aw_scratch_remove(folder);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/image/reader/eight-bit", eight_bit);
  g_test_add_func("/image/reader/sixteen-bit", sixteen_bit);
  g_test_add_func("/image/reader/white-is-zero", white_is_zero);
  g_test_add_func("/image/reader/twelve-in-sixteen", twelve_in_sixteen);
  g_test_add_func("/image/reader/twelve-packed", twelve_packed);
  g_test_add_func("/image/reader/part-of-packed", part_of_packed);
  g_test_add_func("/image/reader/floats", floats);
  g_test_add_func("/image/reader/grey-in-rgb", grey_in_rgb);
  g_test_add_func("/image/reader/wide-samples", wide_samples);
  g_test_add_func("/image/reader/chosen-channel", chosen_channel);
  g_test_add_func("/image/reader/resolution", resolution);
  g_test_add_func("/image/reader/oblong-pixels", oblong_pixels);
  g_test_add_func("/image/reader/other-description", other_description);
  g_test_add_func("/image/reader/pages", pages);
  g_test_add_func("/image/reader/rectangles-of-strips", rectangles_of_strips);
  g_test_add_func("/image/reader/rectangles-of-tiles", rectangles_of_tiles);
  g_test_add_func("/image/reader/long-strips", long_strips);
  g_test_add_func("/image/reader/broken-long-strip", broken_long_strip);
  g_test_add_func("/image/reader/side-by-side", side_by_side);
  g_test_add_func("/image/reader/content-not-name", content_not_name);
  return g_test_run();
}

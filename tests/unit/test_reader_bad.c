/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Damaged, hostile and unsupported TIFF files: each message names the file, the place, the value and the limit. */
#include <math.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>
#include <zlib.h>

#include "../support/check.h"
#include "../support/tiff_bytes.h"
#include "image/reader.h"

#define PIXELS "\1\2\3\4\5\6\7\10\11\12\13\14"

static TiffBytes *small(void)
{
  TiffBytes *t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 4, 3, 8, PIXELS, 12);
  return t;
}

static void check_path(const char *path, int page, int channel, AwErrorCode code, const char *parts)
{
  GError *error = NULL;
  g_assert_null(aw_image_load(path, page, channel, NULL, &error));
  g_assert_nonnull(strstr(error->message, path));
  aw_check_error(&error, code, parts);
}

/* Saves t and checks how loading it is refused. */
static void check_refused(TiffBytes *t, int page, int channel, AwErrorCode code, const char *parts)
{
  char *folder = aw_scratch_new();
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "bad.tif", 0);
  check_path(path, page, channel, code, parts);
  aw_scratch_remove(folder);
}

static void no_image(void)
{
  static const struct {
    const char *text;
    const char *parts;
  } cases[] = { { "", "is empty" },
                { "file,stage_x_um\n", "is neither a TIFF nor a PNG file" },
                { "II", "is neither a TIFF nor a PNG file" },
                { "II*", "is neither a TIFF nor a PNG file" } };
  char *folder = aw_scratch_new();
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autofree char *path = aw_scratch_write(folder, "a.tif", cases[i].text);
    check_path(path, 0, -1, AW_ERROR_FORMAT, cases[i].parts);
  }
  aw_scratch_remove(folder);
}

static void no_file(void)
{
  char *folder = aw_scratch_new();
  g_autofree char *missing = g_build_filename(folder, "none.tif", NULL);
  g_autofree char *pipe = g_build_filename(folder, "pipe", NULL);
  check_path(missing, 0, -1, AW_ERROR_NOT_FOUND, "cannot be read: No such file");
  check_path(folder, 0, -1, AW_ERROR_IO, "is not a regular file");
  g_assert_cmpint(mkfifo(pipe, 0600), ==, 0);
  check_path(pipe, 0, -1, AW_ERROR_IO, "is not a regular file");
  aw_scratch_remove(folder);
}

static void cut_header(void)
{
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = small();
  tiff_bytes_end_page(t);
  for (gsize n = 4; n < 8; n++) {
    g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", n);
    check_path(path, 0, -1, AW_ERROR_FORMAT, "is cut off within its TIFF header");
  }
  g_autofree char *big = g_build_filename(folder, "big.tif", NULL);
  g_file_set_contents(big, "II+\0\x08\0\0\0\x10\0\0\0\0\0\0", 15, NULL);
  check_path(big, 0, -1, AW_ERROR_FORMAT, "is cut off within its TIFF header");
  aw_scratch_remove(folder);
}

/* Every beginning of a file is refused: the directory is last, its long values before it. */
static void cut_directory(void)
{
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = small();
  tiff_bytes_set_text(t, 270, "a description");
  tiff_bytes_set_ratio(t, 282, 40000, 1);
  tiff_bytes_end_page(t);
  for (gsize n = 8; n < tiff_bytes_all(t)->len; n++) {
    g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", n);
    check_path(path, 0, -1, AW_ERROR_FORMAT, "is damaged");
  }
  aw_scratch_remove(folder);
}

/* The same with directory, description and pixels in this order. */
static void cut_after_directory(void)
{
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = small();
  guint32 text_at = 8 + 12 + 2 + 10 * 12 + 4, pixels_at = text_at + 20;
  tiff_bytes_set(t, 270, TIFF_U32, 0);
  tiff_bytes_set(t, 273, TIFF_U32, pixels_at);
  tiff_bytes_end_page(t);
  GByteArray *all = tiff_bytes_all(t);
  for (gsize at = 22; at < all->len; at += 12) /* the description's type, count and place, set by hand */
    if (all->data[at] == 0x0e && all->data[at + 1] == 1) {
      const guint8 entry[] = { 0x0e, 1, 2, 0, 20, 0, 0, 0, (guint8)text_at, 0, 0, 0 };
      memcpy(all->data + at, entry, sizeof entry);
    }
  g_assert_cmpuint(all->len, ==, text_at);
  tiff_bytes_data(t, "a description, long", 20);
  tiff_bytes_data(t, PIXELS, 12);
  g_autofree char *whole = tiff_bytes_save(t, folder, "a.tif", 0);
  g_autoptr(AwImage) image = aw_image_load(whole, 0, -1, NULL, NULL);
  g_assert_nonnull(image);
  for (gsize n = 8; n < all->len; n++) {
    g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", n);
    check_path(path, 0, -1, AW_ERROR_FORMAT, "is ");
  }
  aw_scratch_remove(folder);
}

static void sizes(void)
{
  static const struct {
    guint32 width, height;
    AwErrorCode code;
    const char *parts;
  } cases[] = {
    { 0, 3, AW_ERROR_RANGE, "claims 0 x 3 px|200000" },
    { 4, 0, AW_ERROR_RANGE, "claims 4 x 0 px" },
    { 4000000000u, 3, AW_ERROR_RANGE, "claims 4000000000 x 3 px|200000" },
    { 200001, 1, AW_ERROR_RANGE, "claims 200001 x 1 px|200000" },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autoptr(TiffBytes) t = small();
    tiff_bytes_set(t, 256, TIFF_U32, cases[i].width);
    tiff_bytes_set(t, 257, TIFF_U32, cases[i].height);
    check_refused(t, 0, -1, cases[i].code, cases[i].parts);
  }
}

/* Nothing is allocated for what the file's size cannot hold, whatever the compression. */
static void claims(void)
{
  static const guint32 compression[] = { 1, 5, 8, 32773, 50000 };
  for (gsize i = 0; i < G_N_ELEMENTS(compression); i++) {
    g_autoptr(TiffBytes) strip = small();
    tiff_bytes_set(strip, 256, TIFF_U32, 150000);
    tiff_bytes_set(strip, 257, TIFF_U32, 150000);
    tiff_bytes_set(strip, 278, TIFF_U32, 150000);
    tiff_bytes_set(strip, 259, TIFF_U16, compression[i]);
    check_refused(strip, 0, -1, AW_ERROR_FORMAT,
                  "page 0|claims 150000 x 150000 px, 22500000000 bytes of pixels, in a file of |bytes");
    g_autoptr(TiffBytes) tile = small();
    tiff_bytes_set(tile, 259, TIFF_U16, compression[i]);
    tiff_bytes_set(tile, 322, TIFF_U32, 65536);
    tiff_bytes_set(tile, 323, TIFF_U32, 65536);
    check_refused(tile, 0, -1, AW_ERROR_UNSUPPORTED, "has tiles of 4294967296 bytes; the limit is 134217728");
  }
  g_autoptr(TiffBytes) many = small();
  tiff_bytes_set(many, 256, TIFF_U32, 1600);
  tiff_bytes_set(many, 257, TIFF_U32, 1600);
  tiff_bytes_set(many, 322, TIFF_U32, 16);
  tiff_bytes_set(many, 323, TIFF_U32, 16);
  tiff_bytes_set(many, 259, TIFF_U16, 50000);
  check_refused(many, 0, -1, AW_ERROR_FORMAT, "claims 10000 tiles in a file of|bytes");
}

static void pixel_forms(void)
{
  static const struct {
    guint32 bits, format;
    const char *parts;
  } cases[] = {
    { 1, 1, "1-bit unsigned integer" },   { 4, 1, "4-bit unsigned integer" }, { 16, 2, "16-bit signed integer" },
    { 32, 1, "32-bit unsigned integer" }, { 16, 3, "16-bit float" },          { 64, 3, "64-bit float" },
    { 32, 6, "32-bit complex" },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
    tiff_bytes_grey(t, 1, 1, (int)cases[i].bits, PIXELS, 8);
    tiff_bytes_set(t, 339, TIFF_U16, cases[i].format);
    g_autofree char *parts = g_strdup_printf("page 0|%s|which are not read; 8, 10, 12, 14 and 16-bit", cases[i].parts);
    check_refused(t, 0, -1, AW_ERROR_UNSUPPORTED, parts);
  }
}

static void compressions(void)
{
  static const struct {
    guint32 value;
    const char *parts;
  } cases[] = {
    { 2, "compression 2 (CCITT" }, { 4, "compression 4 (CCITT Group 4)" }, { 6, "compression 6 (" },
    { 7, "compression 7 (JPEG)" }, { 34925, "compression 34925 (LZMA)" },  { 60001, "compression 60001 (unknown)" }
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autoptr(TiffBytes) t = small();
    tiff_bytes_set(t, 259, TIFF_U16, cases[i].value);
    g_autofree char *parts = g_strdup_printf("page 0|%s|none, LZW, Deflate, PackBits", cases[i].parts);
    check_refused(t, 0, -1, AW_ERROR_UNSUPPORTED, parts);
  }
}

static void colour_forms(void)
{
  g_autoptr(TiffBytes) palette = small();
  tiff_bytes_set(palette, 262, TIFF_U16, 3);
  guint32 map[768] = { 0 };
  tiff_bytes_set_list(palette, 320, TIFF_U16, map, 768);
  check_refused(palette, 0, -1, AW_ERROR_UNSUPPORTED, "page 0|colour form 3 (palette)|grey and RGB are");
  g_autoptr(TiffBytes) ink = small();
  tiff_bytes_set(ink, 262, TIFF_U16, 5);
  check_refused(ink, 0, -1, AW_ERROR_UNSUPPORTED, "colour form 5 (CMYK)");
  g_autoptr(TiffBytes) filter = small();
  tiff_bytes_set(filter, 262, TIFF_U16, 32803);
  check_refused(filter, 0, -1, AW_ERROR_UNSUPPORTED, "colour form 32803 (colour filter array)");
}

static TiffBytes *coloured(guint32 n_samples, guint32 photometric)
{
  static const guint32 bits[] = { 8, 8, 8, 8 };
  TiffBytes *t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 2, 1, 8, "\5\5\5\5\6\7\10\11", 2 * n_samples);
  tiff_bytes_set_list(t, 258, TIFF_U16, bits, n_samples);
  tiff_bytes_set(t, 262, TIFF_U16, photometric);
  tiff_bytes_set(t, 277, TIFF_U16, n_samples);
  return t;
}

static void channels(void)
{
  g_autoptr(TiffBytes) rgb = coloured(3, 2);
  check_refused(rgb, 0, -1, AW_ERROR_UNSUPPORTED,
                "page 0|colour image whose channels differ (first at x 1, y 0)|--channel 0 to 2");
  g_autoptr(TiffBytes) no_such = coloured(3, 2);
  check_refused(no_such, 0, 3, AW_ERROR_NOT_FOUND, "page 0|no channel 3; it has 3, counted from 0");
  g_autoptr(TiffBytes) alpha = coloured(4, 2);
  check_refused(alpha, 0, -1, AW_ERROR_UNSUPPORTED, "page 0|has 4 channels|--channel 0 to 3");
  g_autoptr(TiffBytes) two = coloured(2, 1);
  check_refused(two, 0, -1, AW_ERROR_UNSUPPORTED, "page 0|has 2 channels|--channel 0 to 1");
  g_autoptr(TiffBytes) grey = small();
  check_refused(grey, 0, 1, AW_ERROR_NOT_FOUND, "page 0|no channel 1; it has 1, counted from 0");
}

static void unequal_planes(void)
{
  g_autoptr(TiffBytes) t = coloured(3, 2);
  tiff_bytes_set(t, 284, TIFF_U16, 2);
  tiff_bytes_set_list(t, 273, TIFF_U32, (guint32[]){ 8, 10, 12 }, 3);
  tiff_bytes_set_list(t, 279, TIFF_U32, (guint32[]){ 2, 2, 2 }, 3);
  check_refused(t, 0, -1, AW_ERROR_UNSUPPORTED, "channels differ (first at x 0, y 0)|--channel 0 to 2");
}

static void no_such_page(void)
{
  g_autoptr(TiffBytes) t = small();
  check_refused(t, 1, -1, AW_ERROR_NOT_FOUND, "has no page 1; it has 1, counted from 0");
}

static void turned(void)
{
  g_autoptr(TiffBytes) t = small();
  tiff_bytes_set(t, 274, TIFF_U16, 6);
  check_refused(t, 0, -1, AW_ERROR_UNSUPPORTED, "page 0|turned or mirrored (orientation 6)");
}

static void not_finite(void)
{
  const float values[] = { 1, 2, 3, INFINITY, NAN, 6 };
  g_autoptr(TiffBytes) t = tiff_bytes_new(G_BYTE_ORDER == G_BIG_ENDIAN);
  tiff_bytes_grey(t, 3, 2, 32, values, sizeof values);
  tiff_bytes_set(t, 339, TIFF_U16, 3);
  check_refused(t, 0, -1, AW_ERROR_FORMAT, "page 0|pixel at x 0, y 1 that is infinite or no number");
}

/* The third page points back to the first, then into the void. */
static void broken_chain(void)
{
  guint32 first = 0;
  g_autoptr(TiffBytes) loop = tiff_bytes_new(FALSE);
  g_autoptr(TiffBytes) void_end = tiff_bytes_new(FALSE);
  for (int page = 0; page < 3; page++) {
    TiffBytes *both[] = { loop, void_end };
    for (int i = 0; i < 2; i++) {
      tiff_bytes_grey(both[i], 4, 3, 8, PIXELS, 12);
      guint32 at = tiff_bytes_end_page(both[i]);
      first = first ? first : at;
    }
  }
  tiff_bytes_link(loop, first);
  tiff_bytes_link(void_end, 5000);
  char *folder = aw_scratch_new();
  g_autofree char *loop_path = tiff_bytes_save(loop, folder, "loop.tif", 0);
  g_autofree char *void_path = tiff_bytes_save(void_end, folder, "void.tif", 0);
  check_path(loop_path, 0, -1, AW_ERROR_FORMAT, "is damaged: its chain of pages breaks off after 3");
  check_path(void_path, 0, -1, AW_ERROR_FORMAT, "is damaged: its chain of pages breaks off after 3");
  aw_scratch_remove(folder);
}

static void strips_missing(void)
{
  g_autoptr(TiffBytes) t = small();
  tiff_bytes_set(t, 278, TIFF_U32, 1);
  tiff_bytes_set_list(t, 273, TIFF_U32, (guint32[]){ 8, 12 }, 2);
  tiff_bytes_set_list(t, 279, TIFF_U32, (guint32[]){ 4, 4 }, 2);
  check_refused(t, 0, -1, AW_ERROR_FORMAT, "page 0|is damaged: strip 2 of 3 is missing");
  g_autoptr(TiffBytes) thin = small(); /* too few bytes for its rows, with others behind */
  tiff_bytes_set(thin, 278, TIFF_U32, 2);
  tiff_bytes_set_list(thin, 273, TIFF_U32, (guint32[]){ 8, 16 }, 2);
  tiff_bytes_set_list(thin, 279, TIFF_U32, (guint32[]){ 7, 4 }, 2);
  check_refused(thin, 0, -1, AW_ERROR_FORMAT, "page 0|is damaged: strip 0 of 2 claims 8 bytes of pixels in 7 bytes");
  g_autoptr(TiffBytes) beyond = small();
  tiff_bytes_set(beyond, 278, TIFF_U32, 2);
  tiff_bytes_set_list(beyond, 273, TIFF_U32, (guint32[]){ 8, 900 }, 2);
  tiff_bytes_set_list(beyond, 279, TIFF_U32, (guint32[]){ 8, 4 }, 2);
  check_refused(beyond, 0, -1, AW_ERROR_FORMAT, "is cut off: strip 1 of 2 takes 4 bytes from byte 900, the file has");
}

static void strile_sizes(void)
{
  static const struct {
    guint32 width, height;
    const char *parts;
  } cases[] = { { 300000, 16, "page 0|claims tiles of 300000 x 16 px; the limits are 1 to 200000" },
                { 16, 300000, "page 0|claims tiles of 16 x 300000 px" },
                { 0, 16, "bad.tif" },
                { 16, 0, "bad.tif" } };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autoptr(TiffBytes) t = small();
    tiff_bytes_set(t, 322, TIFF_U32, cases[i].width);
    tiff_bytes_set(t, 323, TIFF_U32, cases[i].height);
    check_refused(t, 0, -1, AW_ERROR_FORMAT, cases[i].parts);
  }
  g_autoptr(TiffBytes) no_rows = small();
  tiff_bytes_set(no_rows, 278, TIFF_U32, 0);
  check_refused(no_rows, 0, -1, AW_ERROR_FORMAT, "bad.tif");
}

static void volumes_and_samples(void)
{
  g_autoptr(TiffBytes) volume = small();
  tiff_bytes_set(volume, 32997, TIFF_U32, 3);
  check_refused(volume, 0, -1, AW_ERROR_UNSUPPORTED, "page 0|is a volume of depth 3; only flat planes are read");
  guint32 bits[65];
  for (int i = 0; i < 65; i++)
    bits[i] = 8;
  g_autoptr(TiffBytes) many = small();
  tiff_bytes_set_list(many, 258, TIFF_U16, bits, 65);
  tiff_bytes_set(many, 277, TIFF_U16, 65);
  check_refused(many, 0, 0, AW_ERROR_UNSUPPORTED, "page 0|has 65 samples a pixel; the limit is 64");
}

/* The file is cut while it is open, as an unfinished copy over a network may do. */
static void shrinking(void)
{
  GError *error = NULL;
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = small();
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, &error);
  g_assert_no_error(error);
  g_assert_cmpint(truncate(path, 15), ==, 0);
  g_assert_null(aw_image_reader_read(reader, (AwRect){ 0, 0, 4, 3 }, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "a.tif, page 0 is cut off: it ends at byte 15");
  g_assert_null(aw_image_reader_read(reader, (AwRect){ 1, 2, 2, 3 }, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "a.tif, page 0 is cut off: it ends at byte ");
  aw_scratch_remove(folder);
}

static void broken_data(void)
{
  static const guint32 compression[] = { 5, 8, 32773, 50000 };
  for (gsize i = 0; i < G_N_ELEMENTS(compression); i++) {
    g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
    tiff_bytes_grey(t, 40, 30, 8, "\x03\x77\x12\xfe\x80\x31\x55\x44\x03\x10\x20\x30\x22\x11\x7f\x00\x13\x12\x41\x52",
                    20);
    tiff_bytes_set(t, 259, TIFF_U16, compression[i]);
    check_refused(t, 0, -1, AW_ERROR_FORMAT, "page 0|is damaged: strip 0 ");
  }
}

/* A Deflate stream that ends before the strip's last row. */
static void short_data(void)
{
  guint8 rows[200] = { 0 }, packed[100];
  uLongf n = sizeof packed;
  g_assert_cmpint(compress(packed, &n, rows, sizeof rows), ==, Z_OK);
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 20, 11, 8, packed, n);
  tiff_bytes_set(t, 259, TIFF_U16, 8);
  check_refused(t, 0, -1, AW_ERROR_FORMAT, "page 0|is damaged: strip 0 cannot be decoded: ");
}

/* libtiff warns of the private tag and of the missing ones; none of it may be seen. */
static void quiet(void)
{
  if (g_test_subprocess()) {
    char *folder = aw_scratch_new();
    g_autoptr(TiffBytes) t = small();
    tiff_bytes_set(t, 65001, TIFF_U16, 5);
    tiff_bytes_set_text(t, 306, "no date");
    tiff_bytes_drop(t, 279);
    tiff_bytes_end_page(t);
    g_autofree char *path = tiff_bytes_save(t, folder, "a.tif", 0);
    g_autoptr(AwImage) image = aw_image_load(path, 0, -1, NULL, NULL);
    g_assert_nonnull(image);
    aw_scratch_remove(folder);
    return;
  }
  g_test_trap_subprocess(NULL, 0, (GTestSubprocessFlags)0);
  g_test_trap_assert_passed();
  g_test_trap_assert_stderr("");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/image/reader-bad/no-image", no_image);
  g_test_add_func("/image/reader-bad/no-file", no_file);
  g_test_add_func("/image/reader-bad/cut-header", cut_header);
  g_test_add_func("/image/reader-bad/cut-directory", cut_directory);
  g_test_add_func("/image/reader-bad/cut-after-directory", cut_after_directory);
  g_test_add_func("/image/reader-bad/sizes", sizes);
  g_test_add_func("/image/reader-bad/claims", claims);
  g_test_add_func("/image/reader-bad/pixel-forms", pixel_forms);
  g_test_add_func("/image/reader-bad/compressions", compressions);
  g_test_add_func("/image/reader-bad/colour-forms", colour_forms);
  g_test_add_func("/image/reader-bad/channels", channels);
  g_test_add_func("/image/reader-bad/unequal-planes", unequal_planes);
  g_test_add_func("/image/reader-bad/no-such-page", no_such_page);
  g_test_add_func("/image/reader-bad/turned", turned);
  g_test_add_func("/image/reader-bad/not-finite", not_finite);
  g_test_add_func("/image/reader-bad/broken-chain", broken_chain);
  g_test_add_func("/image/reader-bad/strips-missing", strips_missing);
  g_test_add_func("/image/reader-bad/strile-sizes", strile_sizes);
  g_test_add_func("/image/reader-bad/volumes-and-samples", volumes_and_samples);
  g_test_add_func("/image/reader-bad/shrinking", shrinking);
  g_test_add_func("/image/reader-bad/broken-data", broken_data);
  g_test_add_func("/image/reader-bad/short-data", short_data);
  g_test_add_func("/image/reader-bad/quiet", quiet);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "png_bytes.h"

#include <zlib.h>

static void put32(GByteArray *out, guint32 value)
{
  const guint32 big = GUINT32_TO_BE(value);
  g_byte_array_append(out, (const guint8 *)&big, 4);
}

static void chunk(GByteArray *out, const char *type, const GByteArray *data)
{
  put32(out, data->len);
  guint from = out->len;
  g_byte_array_append(out, (const guint8 *)type, 4);
  g_byte_array_append(out, data->data, data->len);
  put32(out, (guint32)crc32(0, out->data + from, out->len - from));
}

static void text_chunk(GByteArray *out, const char *type, const void *bytes, gsize n)
{
  g_autoptr(GByteArray) data = g_byte_array_new();
  g_byte_array_append(data, bytes, (guint)n);
  chunk(out, type, data);
}

GByteArray *png_bytes(const PngBytes *png)
{
  GByteArray *out = g_byte_array_new();
  g_autoptr(GByteArray) data = g_byte_array_new();
  g_byte_array_append(out, (const guint8 *)"\x89PNG\r\n\x1a\n", 8);
  put32(data, png->width_px);
  put32(data, png->height_px);
  g_byte_array_append(data, (const guint8[]){ png->depth, png->colour, 0, 0, png->interlace }, 5);
  chunk(out, "IHDR", data);
  if (png->per_metre) {
    g_byte_array_set_size(data, 0);
    put32(data, png->per_metre);
    put32(data, png->per_metre);
    g_byte_array_append(data, (const guint8 *)"\1", 1);
    chunk(out, "pHYs", data);
  }
  if (png->palette)
    text_chunk(out, "PLTE", png->palette, 6);
  uLongf n = compressBound(png->n);
  g_autofree guint8 *packed = g_malloc(n);
  g_assert_cmpint(compress(packed, &n, (const guint8 *)png->rows, png->n), ==, Z_OK);
  text_chunk(out, "IDAT", packed, n);
  text_chunk(out, "IEND", "", 0);
  return out;
}

char *png_bytes_save(const GByteArray *bytes, const char *folder, const char *name, gsize n)
{
  char *path = g_build_filename(folder, name, NULL);
  g_assert_true(g_file_set_contents(path, (const char *)bytes->data, (gssize)(n ? n : bytes->len), NULL));
  return path;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <png.h>

#include "base/error.h"
#include "image/png_file.h"

/* The level and filter are fixed, so that the same pixels give the same bytes. */
#define LEVEL 3

static void on_error(png_structp png, const char *message)
{
  (void)message;
  png_longjmp(png, 1);
}

static void on_warning(png_structp png, const char *message)
{
  (void)png;
  (void)message;
}

static void append(png_structp png, png_bytep data, size_t n)
{
  g_byte_array_append(png_get_io_ptr(png), data, (guint)n);
}

static void flush(png_structp png)
{
  (void)png;
}

static gboolean guarded_write(png_structp png, png_infop info, const AwImage *image, GByteArray *out)
{
  if (setjmp(png_jmpbuf(png)))
    return FALSE;
  png_set_write_fn(png, out, append, flush);
  png_set_compression_level(png, LEVEL);
  png_set_filter(png, PNG_FILTER_TYPE_BASE, PNG_FILTER_UP);
  png_set_IHDR(png, info, (png_uint_32)image->width_px, (png_uint_32)image->height_px, 8, PNG_COLOR_TYPE_GRAY,
               PNG_INTERLACE_NONE, PNG_COMPRESSION_TYPE_DEFAULT, PNG_FILTER_TYPE_DEFAULT);
  png_write_info(png, info);
  for (int y = 0; y < image->height_px; y++)
    png_write_row(png, (const guint8 *)image->pixels + (gsize)y * (gsize)image->width_px);
  png_write_end(png, info);
  return TRUE;
}

GBytes *aw_png_encode(const AwImage *image, GError **error)
{
  g_return_val_if_fail(image && image->sample == AW_SAMPLE_U8, NULL);
  g_autoptr(GByteArray) out = g_byte_array_new();
  png_structp png = png_create_write_struct(PNG_LIBPNG_VER_STRING, NULL, on_error, on_warning);
  png_infop info = png ? png_create_info_struct(png) : NULL;
  gboolean ok = info && guarded_write(png, info, image, out);
  png_destroy_write_struct(&png, &info);
  if (ok)
    return g_byte_array_free_to_bytes(g_steal_pointer(&out));
  g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "not enough memory to compress a picture of %d x %d px",
              image->width_px, image->height_px);
  return NULL;
}

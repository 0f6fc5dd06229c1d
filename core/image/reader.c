/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/reader.h"

#include <errno.h>
#include <stdio.h>
#include <string.h>

#include "base/error.h"
#include "base/limits.h"
#include "image/pixels.h"
#include "image/png_file.h"
#include "image/tiff_plane.h"

#define PNG_SIGNATURE "\x89PNG\r\n\x1a\n"

struct AwImageReader {
  char *path;
  AwTiffPlane *tiff; /* either this */
  AwPngFile *png;    /* or this */
};

typedef enum { KIND_UNKNOWN, KIND_TIFF, KIND_PNG } Kind;

static gboolean fail(const char *path, AwErrorCode code, const char *text, GError **error)
{
  g_set_error(error, AW_ERROR, code, "%s %s", path, text);
  return FALSE;
}

/* The first bytes decide, never the name. */
static gboolean find_kind(const char *path, Kind *kind, GError **error)
{
  static const char tiff_marks[][5] = { "II*\0", "MM\0*", "II+\0", "MM\0+" };
  char head[17] = { 0 };
  if (g_file_test(path, G_FILE_TEST_EXISTS) && !g_file_test(path, G_FILE_TEST_IS_REGULAR))
    return fail(path, AW_ERROR_IO, "is not a regular file", error);
  FILE *file = fopen(path, "rbe");
  if (!file) {
    g_set_error(error, AW_ERROR, errno == ENOENT ? AW_ERROR_NOT_FOUND : AW_ERROR_IO, "%s cannot be read: %s", path,
                g_strerror(errno));
    return FALSE;
  }
  gsize n = fread(head, 1, 16, file);
  fclose(file);
  if (n == 0)
    return fail(path, AW_ERROR_FORMAT, "is empty", error);
  *kind = n >= 8 && memcmp(head, PNG_SIGNATURE, 8) == 0 ? KIND_PNG : KIND_UNKNOWN;
  for (gsize i = 0; i < G_N_ELEMENTS(tiff_marks); i++)
    if (n >= 4 && memcmp(head, tiff_marks[i], 4) == 0)
      *kind = KIND_TIFF;
  gboolean is_big = *kind == KIND_TIFF && memchr(head, '+', 4);
  if (*kind == KIND_TIFF && n < (is_big ? 16 : 8))
    return fail(path, AW_ERROR_FORMAT, "is cut off within its TIFF header", error);
  return *kind != KIND_UNKNOWN || fail(path, AW_ERROR_FORMAT, "is neither a TIFF nor a PNG file", error);
}

static gboolean open_png(AwImageReader *reader, int page, int channel, GError **error)
{
  if (page > 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s has no page %d; a PNG file has 1, counted from 0",
                reader->path, page);
    return FALSE;
  }
  reader->png = aw_png_file_open(reader->path, channel, error);
  return reader->png != NULL;
}

AwImageReader *aw_image_reader_open(const char *path, int page, int channel, GError **error)
{
  g_return_val_if_fail(path && page >= 0 && channel >= -1, NULL);
  Kind kind;
  if (!find_kind(path, &kind, error))
    return NULL;
  g_autoptr(AwImageReader) reader = g_new0(AwImageReader, 1);
  reader->path = g_strdup(path);
  if (kind == KIND_PNG)
    return open_png(reader, page, channel, error) ? g_steal_pointer(&reader) : NULL;
  reader->tiff = aw_tiff_plane_open(path, page, channel, error);
  return reader->tiff ? g_steal_pointer(&reader) : NULL;
}

void aw_image_reader_free(AwImageReader *reader)
{
  if (!reader)
    return;
  aw_tiff_plane_free(reader->tiff);
  aw_png_file_free(reader->png);
  g_free(reader->path);
  g_free(reader);
}

const AwImageInfo *aw_image_reader_info(const AwImageReader *reader)
{
  return reader->tiff ? aw_tiff_plane_info(reader->tiff) : aw_png_file_info(reader->png);
}

int aw_image_reader_n_pages(const AwImageReader *reader)
{
  return reader->tiff ? aw_tiff_plane_n_pages(reader->tiff) : 1;
}

int aw_image_reader_n_channels(const AwImageReader *reader)
{
  return reader->tiff ? aw_tiff_plane_n_channels(reader->tiff) : aw_png_file_n_channels(reader->png);
}

AwImage *aw_image_reader_read(AwImageReader *reader, AwRect rect, GError **error)
{
  const AwImageInfo *info = aw_image_reader_info(reader);
  g_return_val_if_fail(rect.x0 >= 0 && rect.y0 >= 0 && rect.x0 < rect.x1 && rect.y0 < rect.y1, NULL);
  g_return_val_if_fail(rect.x1 <= info->width_px && rect.y1 <= info->height_px, NULL);
  g_autoptr(AwImage) image = aw_image_new(rect.x1 - rect.x0, rect.y1 - rect.y0, info->sample, error);
  if (!image)
    return NULL;
  gboolean ok = reader->tiff ? aw_tiff_plane_read(reader->tiff, rect, image, error)
                             : aw_png_file_read(reader->png, rect, image, error);
  if (!ok)
    return NULL;
  aw_pixels_settle_full_scale(image);
  return g_steal_pointer(&image);
}

AwImage *aw_image_load(const char *path, int page, int channel, AwImageInfo *info, GError **error)
{
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, page, channel, error);
  if (!reader)
    return NULL;
  const AwImageInfo *about = aw_image_reader_info(reader);
  AwImage *image = aw_image_reader_read(reader, (AwRect){ 0, 0, about->width_px, about->height_px }, error);
  if (image && info)
    *info = *about;
  return image;
}

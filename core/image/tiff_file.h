/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_TIFF_FILE_H
#define AW_IMAGE_TIFF_FILE_H

#include <glib.h>
#include <tiffio.h>

#include "base/error.h"

/* Between the tiff files of this room, the only users of libtiff: a handle whose complaints go nowhere else. */

#define AW_TIFF_MAX_ALLOC ((tmsize_t)1 << 29) /* one allocation within libtiff, bytes */

/* What libtiff said since aw_tiff_log_clear: the first error, or the first data it could not read and passed over. */
typedef struct {
  char *complaint;
  gboolean keep_warnings; /* warnings of every kind count as well */
} AwTiffLog;

void aw_tiff_log_clear(AwTiffLog *log);

/* Open options with the memory limit and both handlers set to `log`. Free with TIFFOpenOptionsFree. */
TIFFOpenOptions *aw_tiff_options(AwTiffLog *log);

typedef struct {
  char *path;
  char *place; /* path, or "path, page n" once a page was chosen */
  TIFF *tif;
  AwTiffLog log;
  gint64 n_bytes; /* of the file */
  int n_directories;
} AwTiffFile;

/* Opens for reading and counts the directories; the first one is current. Errors name the file. */
AwTiffFile *aw_tiff_file_open(const char *path, GError **error);
void aw_tiff_file_free(AwTiffFile *file);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTiffFile, aw_tiff_file_free)

/* Makes a directory current; `page` is what the user calls it. */
gboolean aw_tiff_file_choose(AwTiffFile *file, int directory, int page, GError **error);

/* The n bytes from byte `at` on. */
gboolean aw_tiff_file_bytes(const AwTiffFile *file, gint64 at, void *out, gsize n, GError **error);

/* AW_ERROR_RANGE when the current directory's width or height is outside the limits. */
gboolean aw_tiff_file_check_size(const AwTiffFile *file, GError **error);

/* Sets "PLACE TEXT", followed by libtiff's complaint if there is one; always FALSE. */
gboolean aw_tiff_fail(const AwTiffFile *file, AwErrorCode code, GError **error, const char *format, ...)
    G_GNUC_PRINTF(4, 5);

#endif

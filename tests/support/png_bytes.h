/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_TESTS_PNG_BYTES_H
#define AW_TESTS_PNG_BYTES_H

#include <glib.h>

/* Builds PNG files chunk by chunk (ISO/IEC 15948) without libpng. */

typedef struct {
  guint32 width_px, height_px;
  guint8 depth, colour, interlace; /* as in IHDR */
  const char *rows;                /* decoded bytes, each row after its filter byte */
  gsize n;
  guint32 per_metre;   /* pHYs when not 0 */
  const char *palette; /* PLTE when not NULL: 6 bytes */
} PngBytes;

/* The file's bytes. */
GByteArray *png_bytes(const PngBytes *png);

/* Writes the first n bytes (0: all) of `bytes` to folder/name and gives that path. Free with g_free. */
char *png_bytes_save(const GByteArray *bytes, const char *folder, const char *name, gsize n);

#endif

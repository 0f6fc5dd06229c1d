/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_SAMPLE_PLAIN_H
#define AW_SAMPLE_PLAIN_H

#include <glib.h>

/**
 * PlainTiff: an uncompressed 16-bit grey TIFF written front to back, a few rows or tiles at a time, for load tests.
 * tile_px 0: one strip per call of plain_tiff_add; otherwise square tiles, row by row. big: BigTIFF.
 * (TIFF 6.0, Adobe 1992; BigTIFF differs in its 64-bit offsets and magic number 43.)
 */
typedef struct PlainTiff PlainTiff;

PlainTiff *plain_tiff_open(const char *path, int width_px, int height_px, int tile_px, gboolean big, GError **error);

/* The next strip or tile: n pixels in the machine's byte order. A tile is whole, also where it passes the edge. */
void plain_tiff_add(PlainTiff *tiff, const guint16 *pixels, gsize n);

/* Writes the directory and renames the file to its name. rows_per_strip: of all strips but the last; 0 with tiles. */
gboolean plain_tiff_finish(PlainTiff *tiff, int rows_per_strip, double full_scale, GError **error);
void plain_tiff_free(PlainTiff *tiff);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(PlainTiff, plain_tiff_free)

#endif

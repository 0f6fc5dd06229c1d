/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_PICTURES_H
#define AW_VIEW_PICTURES_H

#include "view/tilecache.h"

/**
 * AwPictures: the frames of a dish as one picture that can be drawn at any zoom.
 *
 * Far out the overviews of the record are drawn, which are there at once; closer in tiles from the image files, which
 * the caller reads (aw_pictures_missing, aw_tile_read in any thread, aw_pictures_put). What is not there yet is drawn
 * from the next coarser piece at hand. Used from one thread; borrows upright and frames.
 */
typedef struct AwPictures AwPictures;

/**
 * overview_low, overview_high: the pixel values that overviews show as 0 and 255; NaN when unknown, overviews then
 * keep their own contrast. max_bytes: memory for tiles and greys.
 */
AwPictures *aw_pictures_new(const AwUpright *upright, GPtrArray *frames, double overview_low, double overview_high,
                            gsize max_bytes);
void aw_pictures_free(AwPictures *pictures);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwPictures, aw_pictures_free)

void aw_pictures_set_contrast(AwPictures *pictures, const AwContrast *contrast);
const AwContrast *aw_pictures_contrast(const AwPictures *pictures);

/* Percentiles over the overviews (at most 64 of them), as pixel values where their range is known; gamma and
 * inversion stay. The automatic contrast is 0.01, 0.998. */
void aw_pictures_set_percentiles(AwPictures *pictures, double low_frac, double high_frac);

/**
 * Draws what `view` shows; context units are device px. At most max_decodes overviews are decoded (3 ms each), so
 * that a first paint of many frames can be spread. Returns how many pieces were missing or drawn too coarsely: ask
 * for tiles and draw again while it is not 0.
 */
gsize aw_pictures_draw(AwPictures *pictures, cairo_t *cr, const AwViewport *view, guint max_decodes);

/* The tiles to read for `view`, nearest to its middle first; GArray of AwTileKey, g_array_unref. */
GArray *aw_pictures_missing(AwPictures *pictures, const AwViewport *view);

/* Takes over a tile that was read. */
void aw_pictures_put(AwPictures *pictures, AwTileKey key, AwImage *tile);

/* The pixel value at a point of a frame from the tiles at hand; FALSE when that tile is not there at full size. */
gboolean aw_pictures_value(const AwPictures *pictures, int frame, AwPixelPoint pixel, double *value);

/* Strokes the edges of the frames in view, one line of `u` px. */
void aw_pictures_draw_edges(const AwPictures *pictures, cairo_t *cr, const AwViewport *view, double u);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_TILES_H
#define AW_VIEW_TILES_H

#include "image/reader.h"
#include "view/viewport.h"

#define AW_TILE_PX 256 /* side of a tile */
#define AW_MAX_TILE_LEVEL 16

/**
 * A piece of one frame's pyramid: level l holds the frame shrunk by 2^l (a tile pixel is the mean of 2^l x 2^l frame
 * pixels, fewer at the right and lower rim), cut into tiles of AW_TILE_PX a side from the frame's first pixel.
 */
typedef struct {
  int frame, level, column, row;
} AwTileKey;

guint aw_tile_hash(gconstpointer key);
gboolean aw_tile_equal(gconstpointer a, gconstpointer b);

/* The level that suits a zoom (screen px per dish px): tile pixels are shown at 0.71 to 1.41 screen px. */
int aw_tile_level(double zoom);

/* The frame pixels a tile stands for, cut to the frame; empty (x0 >= x1) outside of it. */
AwRect aw_tile_rect(AwTileKey key, int width_px, int height_px);

/* Where a tile of n_across x n_down pixels lies on the dish. */
AwBox aw_tile_box(const AwUpright *upright, const AwFrame *frame, AwTileKey key, int n_across, int n_down);

/* The tiles of one frame at one level that `view` shows, appended to `keys` (GArray of AwTileKey), by row and column.
 */
void aw_tiles_in_view(const AwUpright *upright, const AwFrame *frame, int frame_index, int level,
                      const AwViewport *view, GArray *keys);

/* Sorts tiles so that those nearest to the middle of the view come first. */
void aw_tiles_sort(const AwUpright *upright, GPtrArray *frames, const AwViewport *view, GArray *keys);

/**
 * aw_tile_read: reads one tile from its frame's file, in the file's own sample form; means are rounded to the nearest.
 * Memory is bounded by a band of about four million pixels. Safe in any thread that owns the reader.
 * AW_ERROR_RANGE for a tile outside the plane; errors of the reader are passed on.
 */
AwImage *aw_tile_read(AwImageReader *reader, AwTileKey key, GError **error);

/* The image shrunk by two, in the same way. */
AwImage *aw_tile_halve(const AwImage *image, GError **error);

#endif

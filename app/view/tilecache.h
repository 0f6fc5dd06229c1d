/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_TILECACHE_H
#define AW_VIEW_TILECACHE_H

#include "view/contrast.h"
#include "view/tiles.h"

/**
 * AwTileCache: tiles in memory, the least recently asked for dropped first once they take more than a limit.
 * Keeps pixel values; greys are made when a tile is asked for and made again after the contrast changed.
 */
typedef struct AwTileCache AwTileCache;

/* max_bytes: limit over pixel values and greys together; one tile is always kept. */
AwTileCache *aw_tile_cache_new(gsize max_bytes);
void aw_tile_cache_free(AwTileCache *cache);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTileCache, aw_tile_cache_free)

/* Takes over `tile`; replaces one that was there. */
void aw_tile_cache_put(AwTileCache *cache, AwTileKey key, AwImage *tile);

gboolean aw_tile_cache_has(const AwTileCache *cache, AwTileKey key);

/* The pixel values of a tile, or NULL; owned by the cache, until the next put or get. */
const AwImage *aw_tile_cache_image(const AwTileCache *cache, AwTileKey key);

/* A tile in greys, or NULL; owned by the cache, until the next put or get. `version` tells contrasts apart: a surface
 * is kept as long as it stays the same. */
cairo_surface_t *aw_tile_cache_get(AwTileCache *cache, AwTileKey key, const AwGreys *greys, guint version);

gsize aw_tile_cache_n_bytes(const AwTileCache *cache);
guint aw_tile_cache_n_tiles(const AwTileCache *cache);

#endif

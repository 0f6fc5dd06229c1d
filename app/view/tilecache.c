/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/tilecache.h"

typedef struct {
  AwTileKey key;
  AwImage *image;
  cairo_surface_t *surface; /* may be NULL */
  guint version;            /* of the contrast of `surface` */
  GList link;               /* in `recent` */
} Entry;

struct AwTileCache {
  GHashTable *entries; /* AwTileKey inside the entry -> Entry */
  GQueue recent;       /* the latest asked for at the head */
  gsize n_bytes, max_bytes;
};

static gsize entry_bytes(const Entry *entry)
{
  gsize n = (gsize)entry->image->width_px * (gsize)entry->image->height_px;
  return n * (aw_sample_bytes(entry->image->sample) + (entry->surface ? 4 : 0)) + sizeof(Entry);
}

static void free_entry(gpointer p)
{
  Entry *entry = p;
  g_clear_pointer(&entry->surface, cairo_surface_destroy);
  aw_image_free(entry->image);
  g_free(entry);
}

AwTileCache *aw_tile_cache_new(gsize max_bytes)
{
  AwTileCache *cache = g_new0(AwTileCache, 1);
  cache->entries = g_hash_table_new_full(aw_tile_hash, aw_tile_equal, NULL, free_entry);
  g_queue_init(&cache->recent);
  cache->max_bytes = max_bytes;
  return cache;
}

void aw_tile_cache_free(AwTileCache *cache)
{
  if (!cache)
    return;
  g_hash_table_unref(cache->entries);
  g_free(cache);
}

static void drop(AwTileCache *cache, Entry *entry)
{
  cache->n_bytes -= entry_bytes(entry);
  g_queue_unlink(&cache->recent, &entry->link);
  g_hash_table_remove(cache->entries, &entry->key);
}

static void make_room(AwTileCache *cache)
{
  while (cache->n_bytes > cache->max_bytes && cache->recent.length > 1)
    drop(cache, cache->recent.tail->data);
}

void aw_tile_cache_put(AwTileCache *cache, AwTileKey key, AwImage *tile)
{
  g_return_if_fail(cache && tile);
  Entry *entry = g_hash_table_lookup(cache->entries, &key);
  if (entry)
    drop(cache, entry);
  entry = g_new0(Entry, 1);
  entry->key = key;
  entry->image = tile;
  entry->link.data = entry;
  g_hash_table_insert(cache->entries, &entry->key, entry);
  g_queue_push_head_link(&cache->recent, &entry->link);
  cache->n_bytes += entry_bytes(entry);
  make_room(cache);
}

gboolean aw_tile_cache_has(const AwTileCache *cache, AwTileKey key)
{
  return g_hash_table_contains(cache->entries, &key);
}

const AwImage *aw_tile_cache_image(const AwTileCache *cache, AwTileKey key)
{
  const Entry *entry = g_hash_table_lookup(cache->entries, &key);
  return entry ? entry->image : NULL;
}

cairo_surface_t *aw_tile_cache_get(AwTileCache *cache, AwTileKey key, const AwGreys *greys, guint version)
{
  Entry *entry = g_hash_table_lookup(cache->entries, &key);
  if (!entry)
    return NULL;
  g_queue_unlink(&cache->recent, &entry->link);
  g_queue_push_head_link(&cache->recent, &entry->link);
  if (entry->surface && entry->version == version)
    return entry->surface;
  cache->n_bytes -= entry_bytes(entry);
  g_clear_pointer(&entry->surface, cairo_surface_destroy);
  entry->surface = aw_greys_render(greys, entry->image);
  entry->version = version;
  cache->n_bytes += entry_bytes(entry);
  make_room(cache);
  return entry->surface;
}

gsize aw_tile_cache_n_bytes(const AwTileCache *cache)
{
  return cache->n_bytes;
}

guint aw_tile_cache_n_tiles(const AwTileCache *cache)
{
  return cache->recent.length;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/tiles.h"

#include <stdlib.h>

#include "base/error.h"
#include "base/limits.h"

#define BAND_PIXELS (1 << 22)

guint aw_tile_hash(gconstpointer key)
{
  const AwTileKey *k = key;
  guint h = (guint)k->frame * 2654435761u + (guint)k->level;
  return (h * 31 + (guint)k->column) * 40503u + (guint)k->row;
}

gboolean aw_tile_equal(gconstpointer a, gconstpointer b)
{
  const AwTileKey *x = a, *y = b;
  return x->frame == y->frame && x->level == y->level && x->column == y->column && x->row == y->row;
}

int aw_tile_level(double zoom)
{
  return (int)CLAMP(floor(0.5 - log2(zoom)), 0, AW_MAX_TILE_LEVEL);
}

AwRect aw_tile_rect(AwTileKey key, int width_px, int height_px)
{
  gint64 side = (gint64)AW_TILE_PX << key.level;
  gint64 x0 = key.column * side, y0 = key.row * side;
  return (AwRect){ (int)MIN(x0, width_px), (int)MIN(y0, height_px), (int)MIN(x0 + side, width_px),
                   (int)MIN(y0 + side, height_px) };
}

AwBox aw_tile_box(const AwUpright *upright, const AwFrame *frame, AwTileKey key, int n_across, int n_down)
{
  AwBox box = aw_upright_frame_box(upright, frame);
  double step = (double)(1 << key.level), side = AW_TILE_PX * step;
  double x0 = box.x0 + key.column * side, y0 = box.y0 + key.row * side;
  return (AwBox){ x0, y0, x0 + n_across * step, y0 + n_down * step };
}

/* The first and last tile along one side that a stretch of the frame touches; none when last < first. */
static void tile_range(double from_px, double to_px, int length_px, int level, int *first, int *last)
{
  double side = (double)AW_TILE_PX * (1 << level);
  *first = (int)floor(CLAMP(from_px, 0, length_px) / side);
  *last = (int)ceil(CLAMP(to_px, 0, length_px) / side) - 1;
}

void aw_tiles_in_view(const AwUpright *upright, const AwFrame *frame, int frame_index, int level,
                      const AwViewport *view, GArray *keys)
{
  AwBox seen = aw_viewport_visible(view), box = aw_upright_frame_box(upright, frame);
  int c0, c1, r0, r1;
  if (!aw_box_overlap(seen, box))
    return;
  tile_range(seen.x0 - box.x0, seen.x1 - box.x0, frame->width_px, level, &c0, &c1);
  tile_range(seen.y0 - box.y0, seen.y1 - box.y0, frame->height_px, level, &r0, &r1);
  for (int row = r0; row <= r1; row++)
    for (int column = c0; column <= c1; column++) {
      AwTileKey key = { frame_index, level, column, row };
      g_array_append_val(keys, key);
    }
}

typedef struct {
  double distance;
  AwTileKey key;
} Ranked;

static int by_distance(const void *a, const void *b)
{
  const Ranked *x = a, *y = b;
  if (x->distance != y->distance)
    return x->distance < y->distance ? -1 : 1;
  if (x->key.frame != y->key.frame)
    return x->key.frame - y->key.frame;
  return x->key.row != y->key.row ? x->key.row - y->key.row : x->key.column - y->key.column;
}

void aw_tiles_sort(const AwUpright *upright, GPtrArray *frames, const AwViewport *view, GArray *keys)
{
  g_autofree Ranked *ranked = g_new(Ranked, keys->len + 1);
  for (guint i = 0; i < keys->len; i++) {
    AwTileKey key = g_array_index(keys, AwTileKey, i);
    AwBox box = aw_tile_box(upright, frames->pdata[key.frame], key, AW_TILE_PX, AW_TILE_PX);
    double dx = (box.x0 + box.x1) / 2 - view->centre.x_px, dy = (box.y0 + box.y1) / 2 - view->centre.y_px;
    ranked[i] = (Ranked){ dx * dx + dy * dy, key };
  }
  qsort(ranked, keys->len, sizeof *ranked, by_distance);
  for (guint i = 0; i < keys->len; i++)
    g_array_index(keys, AwTileKey, i) = ranked[i].key;
}

static double pixel(const AwImage *image, gsize i)
{
  if (image->sample == AW_SAMPLE_U8)
    return ((const guint8 *)image->pixels)[i];
  if (image->sample == AW_SAMPLE_U16)
    return ((const guint16 *)image->pixels)[i];
  return (double)((const float *)image->pixels)[i];
}

static void set_pixel(AwImage *image, gsize i, double value)
{
  if (image->sample == AW_SAMPLE_U8)
    ((guint8 *)image->pixels)[i] = (guint8)(value + 0.5);
  else if (image->sample == AW_SAMPLE_U16)
    ((guint16 *)image->pixels)[i] = (guint16)(value + 0.5);
  else
    ((float *)image->pixels)[i] = (float)value;
}

/* Shrinks `band` by k into the rows of `out` from `row` on. */
static void shrink_band(const AwImage *band, int k, AwImage *out, int row)
{
  int width = band->width_px, n_down = (band->height_px + k - 1) / k;
  for (int y = 0; y < n_down; y++)
    for (int x = 0; x < out->width_px; x++) {
      int x1 = MIN((x + 1) * k, width), y1 = MIN((y + 1) * k, band->height_px);
      double sum = 0;
      for (int v = y * k; v < y1; v++)
        for (int u = x * k; u < x1; u++)
          sum += pixel(band, (gsize)v * (gsize)width + (gsize)u);
      set_pixel(out, (gsize)(row + y) * (gsize)out->width_px + (gsize)x, sum / ((double)(x1 - x * k) * (y1 - y * k)));
    }
}

static AwImage *new_small(int width_px, int height_px, int k, const AwImage *like, const AwImageInfo *info,
                          GError **error)
{
  AwImage *out =
      aw_image_new((width_px + k - 1) / k, (height_px + k - 1) / k, like ? like->sample : info->sample, error);
  if (out)
    out->full_scale = like ? like->full_scale : info->full_scale;
  return out;
}

AwImage *aw_tile_read(AwImageReader *reader, AwTileKey key, GError **error)
{
  const AwImageInfo *info = aw_image_reader_info(reader);
  AwRect rect = aw_tile_rect(key, info->width_px, info->height_px);
  int k = 1 << key.level;
  if (rect.x0 >= rect.x1 || rect.y0 >= rect.y1) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "tile %d, %d of level %d lies outside an image of %d x %d pixels",
                key.column, key.row, key.level, info->width_px, info->height_px);
    return NULL;
  }
  AwImage *out = new_small(rect.x1 - rect.x0, rect.y1 - rect.y0, k, NULL, info, error);
  int n_rows = MAX(BAND_PIXELS / (rect.x1 - rect.x0) / k, 1) * k;
  for (int y = rect.y0; out && y < rect.y1; y += n_rows) {
    AwRect part = { rect.x0, y, rect.x1, MIN(y + n_rows, rect.y1) };
    g_autoptr(AwImage) band = aw_image_reader_read(reader, part, error);
    if (band)
      shrink_band(band, k, out, (y - rect.y0) / k);
    else
      g_clear_pointer(&out, aw_image_free);
  }
  return out;
}

AwImage *aw_tile_halve(const AwImage *image, GError **error)
{
  AwImage *out = new_small(image->width_px, image->height_px, 2, image, NULL, error);
  if (out)
    shrink_band(image, 2, out, 0);
  return out;
}

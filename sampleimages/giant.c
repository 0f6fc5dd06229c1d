/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/limits.h"
#include "base/pool.h"
#include "large.h"
#include "plain.h"

#define TILE_PX 256
#define BLOCK_PX 2048      /* the dish is populated block by block, and a block is forgotten when it has been drawn */
#define BLOCK_EDGE_UM 12.0 /* free of nuclei's centres, so that those of two blocks do not overlap */
#define SEED G_GUINT64_CONSTANT(31337)

typedef struct {
  AwRenderView view;
  int n_blocks, nuclei_per_block; /* blocks a side */
  GPtrArray **block;              /* truths of each block; NULL before and after it is needed */
  GPtrArray *near;                /* the truths of all blocks at hand */
  guint16 **band;                 /* one row of tiles for each thread */
  int y0;                         /* first row of the first band */
} Giant;

static double block_um(const Giant *giant)
{
  return BLOCK_PX * aw_pixel_map_scale(&giant->view.map);
}

/* Whether a block's surrounding circle comes near the rows y0 ... y1-1 of the frame. */
static gboolean is_needed(const Giant *giant, AwScanPoint middle, int y0, int y1)
{
  AwPixelPoint centre = aw_frame_centre(giant->view.width_px, giant->view.height_px);
  double y = aw_scan_to_pixel(&giant->view.map, giant->view.stage, centre, middle).y_px, reach = 0.8 * BLOCK_PX;
  return y + reach > y0 && y - reach < y1;
}

/* Makes the blocks that rows y0 ... y1-1 need and drops those they do not. */
static gboolean gather(Giant *giant, int y0, int y1, GError **error)
{
  double side = block_um(giant), half = side / 2.0 - BLOCK_EDGE_UM, first = -0.5 * (giant->n_blocks - 1) * side;
  g_ptr_array_set_size(giant->near, 0);
  for (int i = 0; i < giant->n_blocks * giant->n_blocks; i++) {
    int row = i / giant->n_blocks, column = i % giant->n_blocks;
    AwScanPoint m = { first + column * side, first + row * side };
    if (!is_needed(giant, m, y0, y1)) {
      g_clear_pointer(&giant->block[i], g_ptr_array_unref);
      continue;
    }
    if (!giant->block[i])
      giant->block[i] =
          sample_populate((AwScanPoint){ m.x_um - half, m.y_um - half }, (AwScanPoint){ m.x_um + half, m.y_um + half },
                          giant->nuclei_per_block, SEED + (guint64)i, error);
    if (!giant->block[i])
      return FALSE;
    for (guint k = 0; k < giant->block[i]->len; k++)
      g_ptr_array_add(giant->near, giant->block[i]->pdata[k]);
  }
  return TRUE;
}

static int band_end(const Giant *giant, int y)
{
  return MIN(y + TILE_PX, giant->view.height_px);
}

static gboolean draw_band(gsize item, guint worker, gpointer data, GError **error)
{
  (void)worker;
  Giant *giant = data;
  int y = giant->y0 + (int)item * TILE_PX;
  return aw_render_rows(giant->near, &giant->view, &sample_channel("nuclei")->camera, y, band_end(giant, y),
                        giant->band[item], error);
}

/* One row of tiles out of a band of rows; what lies beyond the image is 0. */
static void write_tiles(PlainTiff *tiff, const guint16 *band, int side_px, int n_rows)
{
  g_autofree guint16 *tile = g_new(guint16, TILE_PX * TILE_PX);
  for (int x = 0; x < side_px; x += TILE_PX) {
    memset(tile, 0, TILE_PX * TILE_PX * sizeof *tile);
    for (int j = 0; j < n_rows; j++)
      memcpy(tile + j * TILE_PX, band + (gsize)j * (gsize)side_px + x, (gsize)MIN(TILE_PX, side_px - x) * sizeof *tile);
    plain_tiff_add(tiff, tile, TILE_PX * TILE_PX);
  }
}

/* As many rows of tiles at a time as there are threads. */
static gboolean draw_bands(Giant *giant, PlainTiff *tiff, guint n_threads, GError **error)
{
  int side = giant->view.height_px, step = (int)n_threads * TILE_PX;
  for (giant->y0 = 0; giant->y0 < side; giant->y0 += step) {
    int end = MIN(giant->y0 + step, side), n = (end - giant->y0 + TILE_PX - 1) / TILE_PX;
    if (!gather(giant, giant->y0, end, error) ||
        !aw_pool_run(n_threads, (gsize)n, draw_band, giant, "drawing tiles", NULL, error))
      return FALSE;
    for (int i = 0; i < n; i++) {
      int y = giant->y0 + i * TILE_PX;
      write_tiles(tiff, giant->band[i], side, band_end(giant, y) - y);
    }
  }
  return plain_tiff_finish(tiff, 0, sample_channel("nuclei")->camera.full_scale, error);
}

static void giant_clear(Giant *giant, guint n_threads)
{
  for (int i = 0; i < giant->n_blocks * giant->n_blocks; i++)
    g_clear_pointer(&giant->block[i], g_ptr_array_unref);
  for (guint i = 0; i < n_threads; i++)
    g_free(giant->band[i]);
  g_free(giant->block);
  g_free(giant->band);
  g_ptr_array_unref(giant->near);
}

gboolean sample_write_bigtiff(const char *path, int side_px, int nuclei_per_block, guint n_threads, GError **error)
{
  Giant giant = { .view = { side_px, side_px, sample_pixel_map(), { 0.0, 0.0 }, 0 },
                  .nuclei_per_block = nuclei_per_block };
  n_threads = aw_pool_n_threads(n_threads);
  giant.n_blocks = (int)ceil(1.05 * side_px / BLOCK_PX);
  giant.block = g_new0(GPtrArray *, (gsize)giant.n_blocks * (gsize)giant.n_blocks);
  giant.near = g_ptr_array_new();
  giant.band = g_new0(guint16 *, n_threads);
  gboolean ok = TRUE;
  for (guint i = 0; ok && i < n_threads; i++) {
    giant.band[i] = aw_try_alloc(TILE_PX * (gsize)side_px, sizeof **giant.band, "a row of tiles", error);
    ok = giant.band[i] != NULL;
  }
  g_autoptr(PlainTiff) tiff = ok ? plain_tiff_open(path, side_px, side_px, TILE_PX, TRUE, error) : NULL;
  ok = tiff && draw_bands(&giant, tiff, n_threads, error);
  giant_clear(&giant, n_threads);
  return ok;
}

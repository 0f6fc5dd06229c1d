/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "large.h"

#include <tiffio.h>

#include "base/error.h"
#include "base/output.h"
#include "base/pool.h"
#include "base/text.h"
#include "nuclei/population.h"

#define SEED G_GUINT64_CONSTANT(977)
#define OVERLAP_FRAC 0.1
#define TILE_PX 256

static GPtrArray *populate(AwScanPoint from, AwScanPoint to, int n_nuclei, GError **error)
{
  AwPopulationPlan plan = { .from = from,
                            .to = to,
                            .n_nuclei = n_nuclei,
                            .clump_frac = 0.25,
                            .mitotic_frac = 0.03,
                            .debris_per_nucleus = 0.1,
                            .gap_um = 3.0,
                            .patchy_frac = 0.3,
                            .light_e = 4.8e5,
                            .seed = SEED };
  return aw_population_new(&plan, error);
}

static gboolean refuse(const char *path, GError **error)
{
  g_set_error(error, AW_ERROR, AW_ERROR_IO, "%s: could not be written", path);
  return FALSE;
}

static void describe(TIFF *tiff, int width_px, int height_px)
{
  TIFFSetField(tiff, TIFFTAG_IMAGEWIDTH, (guint32)width_px);
  TIFFSetField(tiff, TIFFTAG_IMAGELENGTH, (guint32)height_px);
  TIFFSetField(tiff, TIFFTAG_BITSPERSAMPLE, 16);
  TIFFSetField(tiff, TIFFTAG_SAMPLESPERPIXEL, 1);
  TIFFSetField(tiff, TIFFTAG_PHOTOMETRIC, PHOTOMETRIC_MINISBLACK);
  TIFFSetField(tiff, TIFFTAG_COMPRESSION, COMPRESSION_NONE);
}

static gboolean write_plain(const char *path, const guint16 *counts, int side_px, GError **error)
{
  TIFF *tiff = TIFFOpen(path, "w");
  if (!tiff)
    return refuse(path, error);
  describe(tiff, side_px, side_px);
  TIFFSetField(tiff, TIFFTAG_ROWSPERSTRIP, 64);
  gboolean ok = TRUE;
  for (int y = 0; ok && y < side_px; y += 64) {
    tmsize_t n = (tmsize_t)MIN(64, side_px - y) * side_px * 2;
    g_autofree void *strip = g_memdup2(counts + (gsize)y * (gsize)side_px, (gsize)n);
    ok = TIFFWriteEncodedStrip(tiff, (guint32)(y / 64), strip, n) == n;
  }
  ok = ok && TIFFFlush(tiff);
  TIFFClose(tiff);
  return ok || refuse(path, error);
}

typedef struct {
  const char *dir;
  const GPtrArray *truths;
  AwRenderCamera camera;
  AwRenderView *view;
} Stress;

static char *stress_file(guint frame)
{
  return g_strdup_printf("frame-%03u.tif", frame + 1);
}

static gboolean stress_item(gsize item, guint worker, gpointer data, GError **error)
{
  (void)worker;
  const Stress *stress = data;
  g_autofree char *file = stress_file((guint)item);
  g_autofree char *path = g_build_filename(stress->dir, file, NULL);
  g_autoptr(AwImage) image = aw_render_frame(stress->truths, stress->view + item, &stress->camera, (guint)item, error);
  return image && write_plain(path, image->pixels, image->width_px, error);
}

static gboolean write_table(const char *dir, const char *name, GString *table, GError **error)
{
  g_autofree char *path = g_build_filename(dir, name, NULL);
  return aw_output_write(path, table->str, table->len, error);
}

static void numbers(GString *out, const double *value, gsize n, const char *end)
{
  for (gsize i = 0; i < n; i++) {
    g_autofree char *text = aw_text_from_double(value[i], 3);
    g_string_append_printf(out, ",%s", text);
  }
  g_string_append(out, end);
}

static gboolean stress_tables(const Stress *stress, int n_frames, GError **error)
{
  g_autoptr(GString) scan = g_string_new("file,stage_x_um,stage_y_um,pixel_um\n");
  for (int i = 0; i < n_frames; i++) {
    g_autofree char *file = stress_file((guint)i);
    g_string_append(scan, file);
    numbers(scan, (double[]){ stress->view[i].stage.x_um, stress->view[i].stage.y_um, SAMPLE_NOMINAL_PIXEL_UM }, 3,
            "\n");
  }
  g_autoptr(GString) truth = g_string_new("id,kind,x_um,y_um,area_um2,gap_um\n");
  for (guint i = 0; i < stress->truths->len; i++) {
    const AwTruth *t = stress->truths->pdata[i];
    g_string_append_printf(truth, "%u,%s", i + 1, aw_truth_kind_name(t->kind));
    numbers(truth, (double[]){ t->centroid.x_um, t->centroid.y_um, t->area_um2, MIN(t->gap_um, SAMPLE_FAR_GAP_UM) }, 4,
            "\n");
  }
  return write_table(stress->dir, "scan.csv", scan, error) && write_table(stress->dir, "truth.csv", truth, error);
}

gboolean sample_write_stress(const char *dir, int n_frames, int side_px, int nuclei_per_frame, guint n_threads,
                             GError **error)
{
  if (g_mkdir_with_parents(dir, 0777) != 0)
    return refuse(dir, error);
  int columns = (int)ceil(sqrt(n_frames)), rows = (n_frames + columns - 1) / columns;
  AwPixelMap map = sample_pixel_map();
  double frame_um = side_px * aw_pixel_map_scale(&map), step = frame_um * (1.0 - OVERLAP_FRAC), edge = 0.56 * frame_um;
  AwScanPoint from = { -edge, -edge }, to = { (columns - 1) * step + edge, (rows - 1) * step + edge };
  double share = (to.x_um - from.x_um) * (to.y_um - from.y_um) / (frame_um * frame_um);
  g_autoptr(GPtrArray) truths = populate(from, to, (int)(nuclei_per_frame * share), error);
  if (!truths)
    return FALSE;
  g_autofree AwRenderView *view = g_new(AwRenderView, (gsize)n_frames);
  for (int i = 0; i < n_frames; i++) {
    AwScanPoint stage = { floor(10.0 * (i % columns) * step) / 10.0, floor(10.0 * (i / columns) * step) / 10.0 };
    view[i] = (AwRenderView){ side_px, side_px, map, stage };
  }
  Stress stress = { dir, truths, sample_channel("nuclei")->camera, view };
  return aw_pool_run(n_threads, (gsize)n_frames, stress_item, &stress, "drawing frames", NULL, error) &&
         stress_tables(&stress, n_frames, error);
}

/* One row of tiles out of a band of rows; what lies beyond the image is 0. */
static gboolean write_tiles(TIFF *tiff, const guint16 *band, int side_px, int y, int n_rows)
{
  g_autofree guint16 *tile = g_new(guint16, TILE_PX * TILE_PX);
  for (int x = 0; x < side_px; x += TILE_PX) {
    memset(tile, 0, TILE_PX * TILE_PX * sizeof *tile);
    for (int j = 0; j < n_rows; j++)
      memcpy(tile + j * TILE_PX, band + (gsize)j * (gsize)side_px + x, (gsize)MIN(TILE_PX, side_px - x) * sizeof *tile);
    guint32 index = TIFFComputeTile(tiff, (guint32)x, (guint32)y, 0, 0);
    if (TIFFWriteEncodedTile(tiff, index, tile, TILE_PX * TILE_PX * 2) < 0)
      return FALSE;
  }
  return TRUE;
}

static gboolean write_bands(TIFF *tiff, const char *path, const GPtrArray *truths, const AwRenderView *view,
                            GError **error)
{
  const AwRenderCamera *camera = &sample_channel("nuclei")->camera;
  int side_px = view->width_px;
  g_autofree guint16 *band = g_try_new(guint16, (gsize)TILE_PX * (gsize)side_px);
  if (!band)
    return refuse(path, error);
  for (int y = 0; y < side_px; y += TILE_PX) {
    int y1 = MIN(y + TILE_PX, side_px);
    if (!aw_render_rows(truths, view, camera, 0, y, y1, band, error))
      return FALSE;
    if (!write_tiles(tiff, band, side_px, y, y1 - y))
      return refuse(path, error);
  }
  return TIFFFlush(tiff) || refuse(path, error);
}

gboolean sample_write_bigtiff(const char *path, int side_px, int nuclei_per_mpx, GError **error)
{
  AwRenderView view = { side_px, side_px, sample_pixel_map(), { 0.0, 0.0 } };
  double edge = 0.53 * side_px * aw_pixel_map_scale(&view.map), mpx = 1e-6 * 1.06 * 1.06 * side_px * side_px;
  g_autoptr(GPtrArray) truths =
      populate((AwScanPoint){ -edge, -edge }, (AwScanPoint){ edge, edge }, (int)(nuclei_per_mpx * mpx), error);
  if (!truths)
    return FALSE;
  TIFF *tiff = TIFFOpen(path, "w8");
  if (!tiff)
    return refuse(path, error);
  describe(tiff, side_px, side_px);
  TIFFSetField(tiff, TIFFTAG_TILEWIDTH, TILE_PX);
  TIFFSetField(tiff, TIFFTAG_TILELENGTH, TILE_PX);
  gboolean ok = write_bands(tiff, path, truths, &view, error);
  TIFFClose(tiff);
  return ok;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "large.h"

#include "base/error.h"
#include "base/output.h"
#include "base/pool.h"
#include "base/text.h"
#include "nuclei/population.h"
#include "plain.h"

#define SEED G_GUINT64_CONSTANT(977)
#define OVERLAP_FRAC 0.1

GPtrArray *sample_populate(AwScanPoint from, AwScanPoint to, int n_nuclei, guint64 seed, GError **error)
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
                            .seed = seed };
  return aw_population_new(&plan, error);
}

static gboolean refuse(const char *path, GError **error)
{
  g_set_error(error, AW_ERROR, AW_ERROR_IO, "%s: could not be written", path);
  return FALSE;
}

#define STRIP_ROWS 64

static gboolean write_plain(const char *path, const AwImage *image, GError **error)
{
  int side_px = image->width_px;
  g_autoptr(PlainTiff) tiff = plain_tiff_open(path, side_px, side_px, 0, FALSE, error);
  if (!tiff)
    return FALSE;
  for (int y = 0; y < side_px; y += STRIP_ROWS)
    plain_tiff_add(tiff, (const guint16 *)image->pixels + (gsize)y * (gsize)side_px,
                   (gsize)MIN(STRIP_ROWS, side_px - y) * (gsize)side_px);
  return plain_tiff_finish(tiff, STRIP_ROWS, image->full_scale, error);
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
  g_autoptr(AwImage) image = aw_render_frame(stress->truths, stress->view + item, &stress->camera, error);
  return image && write_plain(path, image, error);
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
  g_autoptr(GPtrArray) truths = sample_populate(from, to, (int)(nuclei_per_frame * share), SEED, error);
  if (!truths)
    return FALSE;
  g_autofree AwRenderView *view = g_new(AwRenderView, (gsize)n_frames);
  for (int i = 0; i < n_frames; i++) {
    int row = i / columns, column = i % columns;
    AwScanPoint stage = { floor(10.0 * column * step) / 10.0, floor(10.0 * row * step) / 10.0 };
    view[i] = (AwRenderView){ side_px, side_px, map, stage, (guint)i };
  }
  Stress stress = { dir, truths, sample_channel("nuclei")->camera, view };
  return aw_pool_run(n_threads, (gsize)n_frames, stress_item, &stress, "drawing frames", NULL, error) &&
         stress_tables(&stress, n_frames, error);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * compare_seams IMAGE.tif: nuclei of one image worked in blocks against those of the whole image at once, by the same
 * scale; for test_seams.py. Prints "blocks whole same close missing extra": counts; `same` have the same mask to the
 * pixel, `close` share at least 0.9 of the union of their outlines.
 */
#include <stdio.h>

#include "base/grid.h"
#include "geometry/outline.h"
#include "image/reader.h"
#include "nuclei/scan.h"

static GPtrArray *whole_image(const char *path, const AwSegmentSettings *settings, const AwSegmentScale *scale,
                              GError **error)
{
  g_autoptr(AwImage) image = aw_image_load(path, 0, -1, NULL, error);
  g_autoptr(AwSegmentation) found = image ? aw_segment_image(image, settings, scale, NULL, error) : NULL;
  if (!found)
    return NULL;
  return aw_measure_masks(image, found->labels, found->info, 0, error);
}

static gboolean is_same(const AwNucleus *a, const AwNucleus *b)
{
  return a->n_runs == b->n_runs && memcmp(a->runs, b->runs, a->n_runs * sizeof *a->runs) == 0;
}

/* Outlines of both in frame px: the blocks' stand in scan um of a map of minus identity about the first pixel. */
static gboolean is_close(const AwNucleus *a, const AwNucleus *b)
{
  double common = aw_outline_common_area(a->outline, a->n_outline, b->outline, b->n_outline);
  return common >= 0.9 * (a->area + b->area - common);
}

static void compare(GPtrArray *blocks, GPtrArray *whole)
{
  g_autofree double *xy = g_new(double, 2 * blocks->len + 1);
  for (guint i = 0; i < blocks->len; i++) {
    const AwNucleus *a = blocks->pdata[i];
    xy[2 * i] = a->centroid_px.x_px;
    xy[2 * i + 1] = a->centroid_px.y_px;
  }
  g_autoptr(AwGrid) grid = aw_grid_new(xy, blocks->len);
  guint n_same = 0, n_close = 0;
  for (guint i = 0; i < whole->len; i++) {
    const AwNucleus *b = whole->pdata[i];
    AwGridHit hit;
    if (aw_grid_nearest(grid, b->centroid_px.x_px, b->centroid_px.y_px, 1, &hit) == 0)
      continue;
    const AwNucleus *a = blocks->pdata[hit.index];
    n_same += is_same(a, b);
    n_close += is_close(a, b);
  }
  printf("%u %u %u %u %d %d\n", blocks->len, whole->len, n_same, n_close, (int)(whole->len - n_close),
         (int)blocks->len - (int)n_close);
}

int main(int argc, char **argv)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(AwImageReader) reader = argc == 2 ? aw_image_reader_open(argv[1], 0, -1, &error) : NULL;
  if (reader) {
    const AwImageInfo *info = aw_image_reader_info(reader);
    AwScanFrame frame = { argv[1], 0, -1, info->width_px, info->height_px, { 0, 0 } };
    AwPixelPoint c = aw_frame_centre(frame.width_px, frame.height_px);
    frame.stage = (AwScanPoint){ c.x_px, c.y_px };
    AwScanSettings settings = { .map = { { -1, 0, 0, -1 }, AW_ORIGIN_ENTERED, 0 } };
    g_autoptr(AwScanResult) blocks = aw_scan_segment(&frame, 1, &settings, NULL, &error);
    g_autoptr(GPtrArray) whole = blocks ? whole_image(argv[1], &settings.segment, &blocks->scale, &error) : NULL;
    if (whole) {
      compare(blocks->nuclei, whole);
      return 0;
    }
  }
  fprintf(stderr, "compare_seams: %s\n", error ? error->message : "usage: compare_seams IMAGE.tif");
  return 1;
}

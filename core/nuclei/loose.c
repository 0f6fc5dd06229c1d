/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/loose.h"

#include "nuclei/scan.h"

/* A loose image is a scan of one frame whose map makes q = scale x p. */
static AwScanSettings loose_settings(const AwLooseImage *image, const AwSegmentSettings *segment)
{
  double scale = image->pixel_um > 0 ? image->pixel_um : 1;
  return (AwScanSettings){
    .segment = *segment, .n_threads = 1, .pixel_um = scale, .map = { { -scale, 0, 0, -scale }, AW_ORIGIN_ENTERED, 0 }
  };
}

GPtrArray *aw_segment_file(const AwLooseImage *image, const AwSegmentSettings *segment, AwImageInfo *info,
                           GError **error)
{
  g_autoptr(AwImageReader) reader = aw_image_reader_open(image->path, image->page, image->channel, error);
  if (!reader)
    return NULL;
  *info = *aw_image_reader_info(reader);
  AwScanSettings settings = loose_settings(image, segment);
  AwPixelPoint centre = aw_frame_centre(info->width_px, info->height_px);
  AwScanFrame frame = { .path = image->path,
                        .page = image->page,
                        .channel = image->channel,
                        .width_px = info->width_px,
                        .height_px = info->height_px,
                        .stage = { settings.pixel_um * centre.x_px, settings.pixel_um * centre.y_px } };
  g_clear_pointer(&reader, aw_image_reader_free);
  g_autoptr(AwScanResult) scan = aw_scan_segment(&frame, 1, &settings, NULL, error);
  if (!scan)
    return NULL;
  for (guint i = 0; i < scan->nuclei->len; i++)
    ((AwNucleus *)scan->nuclei->pdata[i])->id = i + 1;
  return g_steal_pointer(&scan->nuclei);
}

static void paint_run(AwLabels *labels, AwRun run, guint32 label)
{
  guint32 *row = labels->label + (gsize)run.y * (gsize)labels->width_px;
  for (gint32 x = run.x0; x < run.x1; x++)
    row[x] = label;
}

AwLabels *aw_nuclei_paint(GPtrArray *nuclei, int width_px, int height_px, GError **error)
{
  AwLabels *labels = aw_labels_new(width_px, height_px, error);
  if (!labels)
    return NULL;
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *nucleus = nuclei->pdata[i];
    for (gsize k = 0; k < nucleus->n_runs; k++)
      paint_run(labels, nucleus->runs[k], (guint32)nucleus->id);
    labels->n_labels = MAX(labels->n_labels, (guint32)nucleus->id);
  }
  return labels;
}

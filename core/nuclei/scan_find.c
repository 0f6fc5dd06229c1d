/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/limits.h"
#include "base/pool.h"
#include "image/reader.h"
#include "nuclei/scan_parts.h"

/* Blocks of large frames: side without margins. A block's buffers are what memory holds per thread. */
#define BLOCK_SIDE_PX 2048
/* Blocks overlap by this many nucleus radii on each side: background and neighbours that far shape an outline. */
#define MARGIN_RADII 8
#define MIN_MARGIN_PX 96
#define MAX_MARGIN_PX 640
#define MAX_MEASURED 64
/* Outlines nearer to an edge than this are not trusted when another view is to be had. */
#define NEAR_EDGE_PX 3

static void add_blocks(GArray *items, gsize frame, int width, int height, int margin)
{
  int n_x = (width + BLOCK_SIDE_PX - 1) / BLOCK_SIDE_PX, n_y = (height + BLOCK_SIDE_PX - 1) / BLOCK_SIDE_PX;
  for (int y = 0; y < n_y; y++)
    for (int x = 0; x < n_x; x++) {
      int x0 = (int)((gint64)width * x / n_x), x1 = (int)((gint64)width * (x + 1) / n_x);
      int y0 = (int)((gint64)height * y / n_y), y1 = (int)((gint64)height * (y + 1) / n_y);
      AwScanItem item = {
        frame, { MAX(x0 - margin, 0), MAX(y0 - margin, 0), MIN(x1 + margin, width), MIN(y1 + margin, height) }
      };
      g_array_append_val(items, item);
    }
}

GArray *aw_scan_items(const AwScanFrame *frames, gsize n_frames, int margin_px)
{
  GArray *items = g_array_new(FALSE, FALSE, sizeof(AwScanItem));
  for (gsize f = 0; f < n_frames; f++) {
    int w = frames[f].width_px, h = frames[f].height_px;
    AwScanItem whole = { f, { 0, 0, w, h } };
    if (w > AW_MAX_BLOCK_SIDE_PX || h > AW_MAX_BLOCK_SIDE_PX)
      add_blocks(items, f, w, h, margin_px);
    else
      g_array_append_val(items, whole);
  }
  return items;
}

/* What the pool's threads share; each writes only the slot of its item. */
typedef struct {
  const AwScanFrame *frames;
  const AwScanSettings *settings;
  const AwScanItem *items;
  AwSegmentScale *scales;      /* first pass */
  const AwSegmentScale *scale; /* second pass */
  GArray **views;              /* second pass, of AwScanView by item */
} Work;

static AwImage *read_item(const Work *work, const AwScanItem *item, GError **error)
{
  const AwScanFrame *frame = &work->frames[item->frame];
  g_autoptr(AwImageReader) reader = aw_image_reader_open(frame->path, frame->page, frame->channel, error);
  if (!reader)
    return NULL;
  const AwImageInfo *info = aw_image_reader_info(reader);
  if (info->width_px != frame->width_px || info->height_px != frame->height_px) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: the image has %d x %d px, but the scan knows it with %d x %d px",
                frame->path, info->width_px, info->height_px, frame->width_px, frame->height_px);
    return NULL;
  }
  return aw_image_reader_read(reader, item->rect, error);
}

static gboolean measure_item(gsize i, guint worker, gpointer data, GError **error)
{
  (void)worker;
  Work *work = data;
  g_autoptr(AwImage) image = read_item(work, &work->items[i], error);
  return image && aw_segment_measure(image, &work->settings->segment, &work->scales[i], error);
}

gboolean aw_scan_measure_scale(const AwScanFrame *frames, gsize n_frames, const AwScanSettings *settings,
                               AwProgress *progress, AwSegmentScale *scale, GError **error)
{
  g_autoptr(GArray) items = aw_scan_items(frames, n_frames, MIN_MARGIN_PX);
  gsize n = MIN(items->len, MAX_MEASURED);
  g_autofree AwScanItem *chosen = g_new(AwScanItem, n + 1);
  g_autofree AwSegmentScale *scales = g_new0(AwSegmentScale, n + 1);
  for (gsize i = 0; i < n; i++)
    chosen[i] = g_array_index(items, AwScanItem, i * items->len / n);
  Work work = { .frames = frames, .settings = settings, .items = chosen, .scales = scales };
  if (!aw_pool_run(settings->n_threads, n, measure_item, &work, "measuring the images", progress, error))
    return FALSE;
  *scale = aw_segment_pool_scales(scales, n);
  return TRUE;
}

/* Distance in px of the nucleus's box from the nearest edge of the item; edges of the frame only when `outer`. */
static int edge_distance(const AwNucleus *nucleus, const AwScanItem *item, const AwScanFrame *frame, gboolean outer)
{
  AwRect r = item->rect;
  int best = G_MAXINT;
  for (gsize i = 0; i < nucleus->n_runs; i++) {
    AwRun run = nucleus->runs[i];
    if (outer || r.x0 > 0)
      best = MIN(best, run.x0 - r.x0);
    if (outer || r.y0 > 0)
      best = MIN(best, run.y - r.y0);
    if (outer || r.x1 < frame->width_px)
      best = MIN(best, r.x1 - run.x1);
    if (outer || r.y1 < frame->height_px)
      best = MIN(best, r.y1 - 1 - run.y);
  }
  return best;
}

/* A block shows the same pixels as its neighbour, so what counts is how far from the block's own edges a nucleus is. */
static AwScanView view_in_block(AwNucleus *nucleus, gsize index, const AwScanItem *item, const AwScanFrame *frame)
{
  int inner = edge_distance(nucleus, item, frame, FALSE);
  AwViewEdge edge = inner <= 1 ? AW_VIEW_CUT : inner <= NEAR_EDGE_PX ? AW_VIEW_NEAR : AW_VIEW_FREE;
  return (AwScanView){ nucleus, index, edge, inner };
}

static gboolean find_in_item(gsize i, guint worker, gpointer data, GError **error)
{
  (void)worker;
  Work *work = data;
  const AwScanItem *item = &work->items[i];
  const AwScanFrame *frame = &work->frames[item->frame];
  g_autoptr(AwImage) image = read_item(work, item, error);
  if (!image)
    return FALSE;
  g_autoptr(AwSegmentation) found = aw_segment_image(image, &work->settings->segment, work->scale, NULL, error);
  if (!found)
    return FALSE;
  g_autoptr(GPtrArray) nuclei = aw_measure_masks(image, found->labels, found->info, aw_saturation_level(image), error);
  if (!nuclei)
    return FALSE;
  AwPlacement place = aw_placement_loose(frame->width_px, frame->height_px);
  place.x_offset_px = item->rect.x0;
  place.y_offset_px = item->rect.y0;
  GArray *views = g_array_sized_new(FALSE, FALSE, sizeof(AwScanView), nuclei->len);
  for (guint k = 0; k < nuclei->len; k++) {
    AwNucleus *nucleus = nuclei->pdata[k];
    aw_nucleus_place(nucleus, &place);
    nucleus->frame = (int)item->frame;
    AwScanView view = view_in_block(nucleus, i, item, frame);
    g_array_append_val(views, view);
  }
  g_ptr_array_set_free_func(nuclei, NULL);
  work->views[i] = views;
  return TRUE;
}

/* What the second merging, between frames, needs to know of a view. */
static void see_as_frame(AwScanView *view, const AwScanFrame *frames)
{
  AwNucleus *nucleus = view->nucleus;
  const AwScanFrame *frame = &frames[nucleus->frame];
  AwScanItem whole = { (gsize)nucleus->frame, { 0, 0, frame->width_px, frame->height_px } };
  gboolean near = edge_distance(nucleus, &whole, frame, TRUE) <= NEAR_EDGE_PX;
  gboolean cut = nucleus->flags & AW_FLAG_BORDER || view->edge == AW_VIEW_CUT;
  view->source = (gsize)nucleus->frame;
  view->edge = cut ? AW_VIEW_CUT : near ? AW_VIEW_NEAR : AW_VIEW_FREE;
  view->quality = nucleus->confidence;
}

/* Views of one frame's items, merged when there are several. */
static void add_frame(GArray *all, GArray **views, gsize n_items, const AwScanFrame *frames)
{
  g_autoptr(GArray) frame = g_array_new(FALSE, FALSE, sizeof(AwScanView));
  for (gsize i = 0; i < n_items; i++) {
    g_array_append_vals(frame, views[i]->data, views[i]->len);
    g_clear_pointer(&views[i], g_array_unref);
  }
  if (n_items > 1) {
    AwMergeTally tally = { 0 };
    GArray *merged = aw_scan_merge(frame, &tally);
    g_array_unref(frame);
    frame = merged;
  }
  for (guint k = 0; k < frame->len; k++) {
    AwScanView *view = &g_array_index(frame, AwScanView, k);
    view->nucleus->n_views = 1;
    view->nucleus->spread_um = 0;
    see_as_frame(view, frames);
  }
  g_array_append_vals(all, frame->data, frame->len);
}

static GArray *gather(GArray **views, const AwScanItem *items, gsize n_items, const AwScanFrame *frames)
{
  GArray *all = g_array_new(FALSE, FALSE, sizeof(AwScanView));
  for (gsize i = 0, end = 0; i < n_items; i = end) {
    for (end = i; end < n_items && items[end].frame == items[i].frame;)
      end++;
    add_frame(all, views + i, end - i, frames);
  }
  return all;
}

GArray *aw_scan_find(const AwScanFrame *frames, gsize n_frames, const AwScanSettings *settings,
                     const AwSegmentScale *scale, AwProgress *progress, GError **error)
{
  double radius = isfinite(scale->radius_px) ? scale->radius_px : 0;
  int margin = (int)CLAMP(ceil(MARGIN_RADII * radius), MIN_MARGIN_PX, MAX_MARGIN_PX);
  g_autoptr(GArray) items = aw_scan_items(frames, n_frames, margin);
  g_autofree GArray **views = g_new0(GArray *, items->len + 1);
  const AwScanItem *item = (const AwScanItem *)(const void *)items->data;
  Work work = { .frames = frames, .settings = settings, .items = item, .scale = scale, .views = views };
  if (aw_pool_run(settings->n_threads, items->len, find_in_item, &work, "finding nuclei", progress, error))
    return gather(views, item, items->len, frames);
  for (guint i = 0; i < items->len; i++)
    g_clear_pointer(&views[i], aw_scan_views_free);
  return NULL;
}

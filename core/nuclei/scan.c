/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/scan.h"

#include <gsl/gsl_statistics_double.h>

#include "geometry/overlap.h"
#include "nuclei/scan_parts.h"

void aw_scan_result_free(AwScanResult *result)
{
  if (!result)
    return;
  g_clear_pointer(&result->nuclei, g_ptr_array_unref);
  g_free(result->map_note);
  g_free(result);
}

/* Whole nuclei of each frame as marks; `views` come by frame. */
static GArray *collect_marks(const GArray *views, const AwScanFrame *frames, gsize n_frames, AwOverlapFrame *out)
{
  GArray *marks = g_array_new(FALSE, FALSE, sizeof(AwOverlapMark));
  for (gsize f = 0; f < n_frames; f++)
    out[f] = (AwOverlapFrame){ frames[f].stage, frames[f].width_px, frames[f].height_px, NULL, 0 };
  for (guint i = 0; i < views->len; i++) {
    const AwScanView *view = &g_array_index(views, AwScanView, i);
    AwOverlapMark mark = { view->nucleus->centroid_px, view->nucleus->area };
    if (view->edge != AW_VIEW_FREE)
      continue;
    g_array_append_val(marks, mark);
    out[view->source].n_marks++;
  }
  const AwOverlapMark *at = (const AwOverlapMark *)(const void *)marks->data;
  for (gsize f = 0; f < n_frames; f++) {
    out[f].marks = at;
    at += out[f].n_marks;
  }
  return marks;
}

static gboolean find_map(const GArray *views, const AwScanFrame *frames, gsize n_frames, const AwScanSettings *settings,
                         AwScanResult *result, GError **error)
{
  g_autofree AwOverlapFrame *overlap = g_new0(AwOverlapFrame, n_frames + 1);
  g_autoptr(GArray) marks = collect_marks(views, frames, n_frames, overlap);
  g_auto(AwOverlapFit) fit = { 0 };
  AwOverlapMode mode = settings->fit_map ? AW_OVERLAP_FIT : AW_OVERLAP_CHECK;
  if (!aw_overlap_fit(overlap, n_frames, &settings->map, mode, &fit, error))
    return FALSE;
  result->map = fit.map;
  result->map_note = g_steal_pointer(&fit.note);
  return TRUE;
}

static void place_views(GArray *views, const AwScanFrame *frames, const AwPixelMap *map)
{
  for (guint i = 0; i < views->len; i++) {
    AwNucleus *nucleus = g_array_index(views, AwScanView, i).nucleus;
    const AwScanFrame *frame = &frames[nucleus->frame];
    AwPlacement place = { .map = *map,
                          .stage = frame->stage,
                          .centre = aw_frame_centre(frame->width_px, frame->height_px),
                          .frame_width_px = frame->width_px,
                          .frame_height_px = frame->height_px };
    aw_nucleus_place(nucleus, &place);
  }
}

/* A view is as good as it is sure and, up to the typical edge, sharp. */
static void rate_views(GArray *views)
{
  g_autofree double *sharpness = g_new(double, views->len + 1);
  for (guint i = 0; i < views->len; i++)
    sharpness[i] = g_array_index(views, AwScanView, i).nucleus->sharpness;
  double typical = views->len ? gsl_stats_median(sharpness, 1, views->len) : 0;
  for (guint i = 0; i < views->len; i++) {
    AwScanView *view = &g_array_index(views, AwScanView, i);
    double sharp = typical > 0 ? MIN(view->nucleus->sharpness / typical, 1.0) : 1;
    view->quality = view->nucleus->confidence * sharp;
  }
}

static int compare_place(gconstpointer a, gconstpointer b)
{
  const AwNucleus *p = *(const AwNucleus *const *)a, *q = *(const AwNucleus *const *)b;
  if (p->frame != q->frame)
    return p->frame < q->frame ? -1 : 1;
  if (p->centroid_px.y_px < q->centroid_px.y_px || p->centroid_px.y_px > q->centroid_px.y_px)
    return p->centroid_px.y_px < q->centroid_px.y_px ? -1 : 1;
  return p->centroid_px.x_px < q->centroid_px.x_px ? -1 : p->centroid_px.x_px > q->centroid_px.x_px;
}

static void merge_frames(GArray *views, AwScanResult *result)
{
  AwMergeTally tally = { 0 };
  rate_views(views);
  g_autoptr(GArray) kept = aw_scan_merge(views, &tally);
  for (guint i = 0; i < kept->len; i++)
    g_ptr_array_add(result->nuclei, g_array_index(kept, AwScanView, i).nucleus);
  g_ptr_array_sort(result->nuclei, compare_place);
  aw_measure_relations(result->nuclei);
  result->n_cut_dropped = tally.n_cut_dropped;
  result->n_overlap_pairs = tally.n_pairs;
  result->overlap_rms_um = tally.n_pairs ? sqrt(tally.sum_square / (2.0 * (double)tally.n_pairs)) : NAN;
}

static gboolean finish(GArray *views, const AwScanFrame *frames, gsize n_frames, const AwScanSettings *settings,
                       AwProgress *progress, AwScanResult *result, GError **error)
{
  aw_progress_report(progress, "joining the frames", 0);
  if (!find_map(views, frames, n_frames, settings, result, error) || aw_progress_stopped(progress, error))
    return FALSE;
  place_views(views, frames, &result->map);
  aw_progress_report(progress, "joining the frames", 0.3);
  merge_frames(views, result);
  aw_progress_report(progress, "joining the frames", 1);
  return !aw_progress_stopped(progress, error);
}

AwScanResult *aw_scan_segment(const AwScanFrame *frames, gsize n_frames, const AwScanSettings *settings,
                              AwProgress *progress, GError **error)
{
  g_return_val_if_fail(settings && fabs(aw_matrix_det(settings->map.um_per_px)) > 0, NULL);
  if (!aw_segment_settings_check(&settings->segment, error))
    return NULL;
  g_autoptr(AwScanResult) result = g_new0(AwScanResult, 1);
  result->nuclei = aw_nuclei_new();
  if (!aw_scan_measure_scale(frames, n_frames, settings, progress, &result->scale, error))
    return NULL;
  GArray *views = aw_scan_find(frames, n_frames, settings, &result->scale, progress, error);
  if (!views)
    return NULL;
  gboolean done = finish(views, frames, n_frames, settings, progress, result, error);
  aw_scan_views_free(views);
  return done ? g_steal_pointer(&result) : NULL;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/segment.h"

#include <math.h>

#include "base/error.h"
#include "base/limits.h"
#include "base/text.h"
#include "image/rank.h"
#include "image/smooth.h"
#include "nuclei/segment_margin.h"
#include "nuclei/segment_spread.h"

const AwSegmentRules aw_segment_rules = {
  .blur_px = 0.7,
  .coarse_radius = 4.5,
  .ground_radii = 3,
  .height_blur = 0.4,
  .detect_height = 0.26,
  .detect_noise = 1.4,
  .blob_scale = 0.4,
  .blob_floor = 0.15,
  .zone_saddle = 0.02,
  .zone_level = 0.42,
  .piece_saddle = 0.01,
  .piece_blur = 0.06,
  .blob_weight = 1,
  .plain_area = 3,
  .plain_ellipse = 0.97,
  .line_band = 0.35,
  .line_distance = 3,
  .merge_bias = 0.3,
  .outline_shift = 0,
  .grow_radii = 0.35,
  .ring_from = 0.2,
  .ring_to = 0.6,
  .ring_quantile = 0.5,
  .smallest_area = 0.06,
  .debris_confidence = 0.5,
  .debris_area = 0.8,
};

void aw_segmentation_free(AwSegmentation *s)
{
  if (!s)
    return;
  aw_labels_free(s->labels);
  g_free(s->info);
  g_free(s);
}

static gboolean check_handle(const char *name, double value, double low, double high, GError **error)
{
  if (value >= low && value <= high)
    return TRUE;
  char text[3][G_ASCII_DTOSTR_BUF_SIZE];
  g_ascii_formatd(text[0], sizeof text[0], "%.6g", value);
  g_ascii_formatd(text[1], sizeof text[1], "%.6g", low);
  g_ascii_formatd(text[2], sizeof text[2], "%.6g", high);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s is %s; it must lie between %s and %s", name, text[0], text[1],
              text[2]);
  return FALSE;
}

gboolean aw_segment_settings_check(const AwSegmentSettings *settings, GError **error)
{
  if (settings->nucleus_width_px != 0 &&
      !check_handle("the nucleus width in pixels", settings->nucleus_width_px, 4, 400, error))
    return FALSE;
  return check_handle("the sensitivity", settings->sensitivity, -1, 1, error) &&
         check_handle("the splitting strength", settings->splitting, -1, 1, error);
}

static void clear_work(AwSegmentWork *w)
{
  aw_plane_free(w->smooth);
  aw_plane_free(w->coarse);
  aw_plane_free(w->ground);
  aw_plane_free(w->blob);
  aw_plane_free(w->cut);
  g_free(w->mask);
  aw_labels_free(w->labels);
  if (w->objects)
    g_array_free(w->objects, TRUE);
  if (w->edge)
    g_array_free(w->edge, TRUE);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwSegmentWork, clear_work)

static gboolean begin(AwSegmentWork *w, const AwImage *image, const AwSegmentSettings *settings,
                      const AwSegmentScale *scale, GError **error)
{
  static const AwSegmentSettings plain = { 0 };
  w->settings = settings ? settings : &plain;
  w->width_px = image->width_px;
  w->height_px = image->height_px;
  if (!aw_segment_settings_check(w->settings, error))
    return FALSE;
  w->smooth = aw_smooth_image(image, w->rules->blur_px, error);
  if (!w->smooth)
    return FALSE;
  if (!scale)
    return aw_segment_measure_scale(w, image, error);
  w->scale = *scale;
  return TRUE;
}

gboolean aw_segment_measure(const AwImage *image, const AwSegmentSettings *settings, AwSegmentScale *scale,
                            GError **error)
{
  g_auto(AwSegmentWork) w = { .rules = &aw_segment_rules };
  if (!begin(&w, image, settings, NULL, error))
    return FALSE;
  *scale = w.scale;
  return TRUE;
}

static double pool(const AwSegmentScale *scales, gsize n, gsize offset, double *value, double *weight)
{
  gsize m = 0;
  for (gsize i = 0; i < n; i++) {
    double v = *(const double *)(const void *)((const char *)&scales[i] + offset);
    if (!isfinite(v) || !(scales[i].weight > 0))
      continue;
    value[m] = v;
    weight[m++] = scales[i].weight;
  }
  return aw_weighted_median(value, weight, m);
}

AwSegmentScale aw_segment_pool_scales(const AwSegmentScale *scales, gsize n)
{
  g_autofree double *value = g_new(double, n + 1);
  g_autofree double *weight = g_new(double, n + 1);
  AwSegmentScale all = { .weight = 0 };
  all.radius_px = pool(scales, n, G_STRUCT_OFFSET(AwSegmentScale, radius_px), value, weight);
  all.height = pool(scales, n, G_STRUCT_OFFSET(AwSegmentScale, height), value, weight);
  for (gsize i = 0; i < n; i++) {
    value[i] = scales[i].noise;
    weight[i] = 1;
    all.weight += scales[i].weight;
  }
  all.noise = n ? aw_weighted_median(value, weight, n) : 0;
  return all;
}

static gboolean stages(AwSegmentWork *w, const AwImage *image, AwProgress *progress, GError **error)
{
  if (!isfinite(w->scale.radius_px) || !(w->scale.height > 0))
    return TRUE;
  return aw_segment_prepare(w, image, error) && !aw_progress_stopped(progress, error) && aw_segment_zones(w, error) &&
         !aw_progress_stopped(progress, error) && aw_segment_pieces(w, error) &&
         !aw_progress_stopped(progress, error) && aw_segment_outlines(w, error);
}

AwSegmentation *aw_segment_run(const AwImage *image, const AwSegmentSettings *settings, const AwSegmentScale *scale,
                               const AwSegmentRules *rules, const AwSegmentProbe *probe, AwProgress *progress,
                               GError **error)
{
  g_auto(AwSegmentWork) w = { .rules = rules, .probe = probe };
  if (!begin(&w, image, settings, scale, error))
    return NULL;
  w.labels = aw_labels_new(image->width_px, image->height_px, error);
  if (!w.labels)
    return NULL;
  w.edge = g_array_sized_new(FALSE, FALSE, sizeof(AwSpot), 1 << 14);
  w.objects = g_array_new(FALSE, TRUE, sizeof(AwObject));
  g_array_set_size(w.objects, 1);
  if (!stages(&w, image, progress, error))
    return NULL;
  AwSegmentInfo *info = aw_segment_infos(&w, error);
  if (!info)
    return NULL;
  AwSegmentation *s = g_new0(AwSegmentation, 1);
  *s = (AwSegmentation){ g_steal_pointer(&w.labels), info, w.scale };
  return s;
}

AwSegmentation *aw_segment_image(const AwImage *image, const AwSegmentSettings *settings, const AwSegmentScale *scale,
                                 AwProgress *progress, GError **error)
{
  AwSegmentScale own;
  if (!scale && !aw_segment_measure(image, settings, &own, error))
    return NULL;
  g_autoptr(AwImage) mirrored = aw_segment_mirror(image, error);
  if (!mirrored)
    return NULL;
  g_autoptr(AwSegmentation) wide =
      aw_segment_run(mirrored, settings, scale ? scale : &own, &aw_segment_rules, NULL, progress, error);
  return wide ? aw_segment_cut_back(wide, error) : NULL;
}

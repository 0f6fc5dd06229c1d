/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "base/limits.h"
#include "image/distance.h"
#include "image/noise.h"
#include "image/opening.h"
#include "image/otsu.h"
#include "image/rank.h"
#include "image/smooth.h"
#include "nuclei/segment_work.h"

#define MIN_RADIUS_PX 3.0
#define MAX_RADIUS_PX 60.0
#define SAMPLE_SIDE_PX 256
#define RADIUS_SHARE 0.92 /* R is meant as the half width of a nucleus' inner part */
#define PEAK_LOSS_PX 0.75 /* what smoothing by 1 px takes from the peak of a cone, less half a pixel of the grid */

/* Values of the peaks of a plane, with their weights; used again and again. */
typedef struct {
  GArray *value, *weight; /* double */
} Peaks;

static gsize n_px(const AwPlane *p)
{
  return (gsize)p->width_px * (gsize)p->height_px;
}

/* The largest of 2^a 3^b (at most 24) that leaves `radius_px` at least `wanted_px` on the reduced grid. */
static int factor_for(double radius_px, double wanted_px)
{
  static const int factor[] = { 24, 12, 8, 6, 4, 3, 2, 1 };
  for (guint i = 0; i < G_N_ELEMENTS(factor); i++)
    if (radius_px / factor[i] >= wanted_px)
      return factor[i];
  return 1;
}

AwPlane *aw_segment_ground(const AwPlane *plane, double radius_px, const AwSegmentRules *rules, GError **error)
{
  int factor = factor_for(radius_px, 3);
  double r = radius_px / factor;
  g_autoptr(AwPlane) small = aw_plane_reduce(plane, factor, error);
  g_autoptr(AwPlane) open = small ? aw_opening_disc(small, rules->ground_radii * r, error) : NULL;
  g_autoptr(AwPlane) soft = open ? aw_smooth_plane(open, r, error) : NULL;
  AwPlane *ground = soft ? aw_plane_new(plane->width_px, plane->height_px, error) : NULL;
  for (int y = 0; ground && y < plane->height_px; y++) {
    float *row = aw_plane_row(ground, y), *top = aw_plane_row(plane, y);
    aw_plane_expand_row(soft, factor, y, 0, plane->width_px, row);
    for (int x = 0; x < plane->width_px; x++)
      row[x] = MIN(row[x], top[x]);
  }
  return ground;
}

static gboolean is_peak(const AwPlane *p, int x, int y)
{
  float v = aw_plane_row(p, y)[x];
  for (int dy = -1; dy <= 1; dy++)
    for (int dx = -1; dx <= 1; dx++) {
      int i = x + dx, j = y + dy;
      if ((dx || dy) && i >= 0 && j >= 0 && i < p->width_px && j < p->height_px) {
        float u = aw_plane_row(p, j)[i];
        if (u > v || (u == v && (dy < 0 || (dy == 0 && dx < 0))))
          return FALSE;
      }
    }
  return TRUE;
}

/* Peaks of the plane above `least`; weight 1 or the square of the value. */
static void find_peaks(const AwPlane *p, double least, gboolean square, Peaks *peaks)
{
  g_array_set_size(peaks->value, 0);
  g_array_set_size(peaks->weight, 0);
  for (int y = 0; y < p->height_px; y++)
    for (int x = 0; x < p->width_px; x++) {
      double v = (double)aw_plane_row(p, y)[x];
      if (v > least && is_peak(p, x, y)) {
        double w = square ? v : 1;
        g_array_append_val(peaks->value, v);
        g_array_append_val(peaks->weight, w);
      }
    }
}

static double median_of(const Peaks *peaks)
{
  return aw_weighted_median((const double *)(const void *)peaks->value->data,
                            (const double *)(const void *)peaks->weight->data, peaks->value->len);
}

/* Radius from what stands above `level`, in pixels of the plane; NaN when nothing does. */
static double radius_above(const AwPlane *plane, double level, Peaks *peaks, GError **error)
{
  gsize n = n_px(plane);
  g_autoptr(AwPlane) d = aw_plane_new(plane->width_px, plane->height_px, error);
  g_autofree guint8 *mask = d ? aw_try_alloc(2 * n, 1, "a mask", error) : NULL;
  if (!mask)
    return NAN;
  for (gsize i = 0; i < n; i++)
    mask[i] = (double)plane->value[i] > level;
  aw_mask_open(mask, plane->width_px, plane->height_px, mask + n);
  aw_mask_fill_holes(mask, plane->width_px, plane->height_px, 100);
  aw_distance_inside(mask, plane->width_px, plane->height_px, (float)(2 * MAX_RADIUS_PX), d->value);
  g_autoptr(AwPlane) soft = aw_smooth_plane(d, 1, error);
  if (!soft)
    return NAN;
  find_peaks(soft, 1.5, TRUE, peaks);
  return median_of(peaks) + PEAK_LOSS_PX;
}

static AwPlane *above_ground(const AwPlane *plane, double radius_px, const AwSegmentRules *rules, GError **error)
{
  AwPlane *clear = aw_segment_ground(plane, radius_px, rules, error);
  for (gsize i = 0; clear && i < n_px(plane); i++)
    clear->value[i] = plane->value[i] - clear->value[i];
  return clear;
}

/*
 * Otsu's threshold of the square roots of what stands above `low`: a single glare spot or mitotic nucleus, however
 * bright, does not draw the threshold up to itself.
 */
static double root_otsu(const AwPlane *plane, double low, GError **error)
{
  gsize n = n_px(plane);
  g_autofree float *root = aw_try_alloc(n, sizeof *root, "an image plane", error);
  if (!root)
    return NAN;
  for (gsize i = 0; i < n; i++)
    root[i] = sqrtf(MAX(plane->value[i] - (float)low, 0));
  double t = aw_otsu(root, n);
  return low + t * t;
}

/* Typical height: median of the smoothed peaks that Otsu's threshold or the noise does not rule out. */
static double typical_height(const AwPlane *clear, double radius_px, double noise, const AwSegmentRules *rules,
                             double *n_peaks, Peaks *peaks, GError **error)
{
  g_autoptr(AwPlane) soft = aw_smooth_plane(clear, MAX(rules->height_blur * radius_px, 0.5), error);
  if (!soft)
    return NAN;
  double least = MAX(0.5 * root_otsu(soft, 0, error), 3 * noise);
  find_peaks(soft, least, FALSE, peaks);
  *n_peaks = peaks->value->len;
  double middle = median_of(peaks);
  for (guint i = 0; i < peaks->value->len; i++)
    g_array_index(peaks->weight, double, i) = MIN(g_array_index(peaks->value, double, i), middle);
  return median_of(peaks);
}

static double low_value(const AwPlane *plane)
{
  float low = plane->value[0];
  for (gsize i = 1; i < n_px(plane); i++)
    low = MIN(low, plane->value[i]);
  return (double)low;
}

/* The middle of a plane, at most `side` px wide and high. */
static AwPlane *middle_of(const AwPlane *plane, int side, GError **error)
{
  int w = MIN(plane->width_px, side), h = MIN(plane->height_px, side);
  AwPlane *out = aw_plane_new(w, h, error);
  for (int y = 0; out && y < h; y++)
    memcpy(aw_plane_row(out, y), aw_plane_row(plane, y + (plane->height_px - h) / 2) + (plane->width_px - w) / 2,
           (gsize)w * sizeof(float));
  return out;
}

/* Glare misleads one threshold, a confluent frame the other; either then gives far too large a radius. */
static double rough_radius(const AwPlane *plane, Peaks *peaks, GError **error)
{
  double plain = radius_above(plane, aw_otsu(plane->value, n_px(plane)), peaks, error);
  if (*error)
    return NAN;
  double root = radius_above(plane, root_otsu(plane, low_value(plane), error), peaks, error);
  return plain < root || !isfinite(root) ? plain : root;
}

/* A first guess on the coarsest grid that still shows the nuclei; the middle of a large image will do.
 */
static double first_radius(const AwPlane *smooth, Peaks *peaks, GError **error)
{
  double r = NAN;
  for (int factor = 4; factor >= 1; factor /= 2) {
    g_autoptr(AwPlane) small = aw_plane_reduce(smooth, factor, error);
    g_autoptr(AwPlane) part = small ? middle_of(small, SAMPLE_SIDE_PX, error) : NULL;
    if (!part)
      return NAN;
    r = rough_radius(part, peaks, error);
    if (peaks->value->len < 8 && n_px(part) < n_px(small))
      r = rough_radius(small, peaks, error);
    if (r >= 5)
      return MIN(factor * r, MAX_RADIUS_PX);
  }
  return CLAMP(r, MIN_RADIUS_PX, MAX_RADIUS_PX);
}

static gboolean refine(AwSegmentWork *w, double radius_px, Peaks *peaks, GError **error)
{
  AwSegmentScale *s = &w->scale;
  double handle = w->settings->nucleus_width_px / 2;
  s->radius_px = handle > 0 ? handle : radius_px;
  for (int pass = 0; pass < 2; pass++) {
    int factor = factor_for(s->radius_px, 4);
    g_autoptr(AwPlane) coarse = aw_plane_reduce(w->smooth, factor, error);
    g_autoptr(AwPlane) clear = coarse ? above_ground(coarse, s->radius_px / factor, w->rules, error) : NULL;
    if (!clear)
      return FALSE;
    s->height = typical_height(clear, s->radius_px / factor, s->noise / factor, w->rules, &s->weight, peaks, error);
    if (!(s->height > 0))
      break;
    double r = RADIUS_SHARE * factor * radius_above(clear, 0.42 * s->height, peaks, error);
    double before = s->radius_px;
    if (!(handle > 0) && isfinite(r))
      s->radius_px = CLAMP(r, MIN_RADIUS_PX, MAX_RADIUS_PX);
    if (fabs(s->radius_px - before) < 0.2 * before)
      break;
  }
  return TRUE;
}

gboolean aw_segment_measure_scale(AwSegmentWork *w, const AwImage *image, GError **error)
{
  w->scale = (AwSegmentScale){ NAN, NAN, aw_image_noise(image), 0 };
  g_autoptr(GArray) value = g_array_new(FALSE, FALSE, sizeof(double));
  g_autoptr(GArray) weight = g_array_new(FALSE, FALSE, sizeof(double));
  GError *bad = NULL;
  Peaks peaks = { value, weight };
  double r = first_radius(w->smooth, &peaks, &bad);
  if (isfinite(r) && !bad)
    refine(w, r, &peaks, &bad);
  if (bad) {
    g_propagate_error(error, bad);
    return FALSE;
  }
  if (!(w->scale.height > 0))
    w->scale = (AwSegmentScale){ NAN, NAN, w->scale.noise, 0 };
  return TRUE;
}

gboolean aw_segment_prepare(AwSegmentWork *w, const AwImage *image, GError **error)
{
  (void)image;
  w->factor = factor_for(w->scale.radius_px, w->rules->coarse_radius);
  w->coarse = aw_plane_reduce(w->smooth, w->factor, error);
  w->ground = w->coarse ? aw_segment_ground(w->coarse, w->scale.radius_px / w->factor, w->rules, error) : NULL;
  return w->ground != NULL;
}

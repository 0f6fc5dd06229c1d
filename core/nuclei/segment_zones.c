/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <math.h>
#include <string.h>

#include "base/limits.h"
#include "image/smooth.h"
#include "image/watershed.h"
#include "nuclei/segment_work.h"

static gsize n_coarse(const AwSegmentWork *w)
{
  return (gsize)w->coarse->width_px * (gsize)w->coarse->height_px;
}

AW_HOT static void laplace_row(const float *restrict up, const float *restrict mid, const float *restrict down,
                               float scale, float *restrict out, int width)
{
  for (int x = 1; x < width - 1; x++)
    out[x] = scale * ((up[x] + down[x]) + (mid[x - 1] + mid[x + 1]) - 4 * mid[x]);
}

/*
 * Blob filter: minus the Laplacian of a Gaussian times its variance (Lindeberg, Int. J. Comput. Vis. 30:79, 1998), on
 * the logarithm of the brightness, so that a dim nucleus beside a bright one is a blob of its own.
 */
static AwPlane *blob_filter(const AwPlane *log_image, double sigma, GError **error)
{
  g_autoptr(AwPlane) soft = aw_smooth_plane(log_image, sigma, error);
  int w = log_image->width_px, h = log_image->height_px;
  AwPlane *out = soft ? aw_plane_new(w, h, error) : NULL;
  float scale = (float)(-sigma * sigma);
  for (int y = 0; out && y < h; y++) {
    const float *mid = aw_plane_row(soft, y), *up = aw_plane_row(soft, MAX(y - 1, 0)),
                *down = aw_plane_row(soft, MIN(y + 1, h - 1));
    float *row = aw_plane_row(out, y);
    laplace_row(up, mid, down, scale, row, w);
    for (int x = 0; x < w; x += MAX(w - 1, 1))
      row[x] = scale * ((up[x] + down[x]) + (mid[MAX(x - 1, 0)] + mid[MIN(x + 1, w - 1)]) - 4 * mid[x]);
  }
  return out;
}

/* Natural logarithm of x >= 1 to 2e-6: exponent by its bits, mantissa by the series of artanh. */
static inline float fast_log(float x)
{
  guint32 bits;
  memcpy(&bits, &x, sizeof bits);
  guint32 mantissa = (bits & 0x007fffffu) | 0x3f800000u;
  float m, e = (float)(gint32)(bits >> 23) - 127.f;
  memcpy(&m, &mantissa, sizeof m);
  float t = (m - 1.4142135f) / (m + 1.4142135f), q = t * t;
  return (e + 0.5f) * 0.69314718f + 2 * t * (1 + q * (1.f / 3 + q * (1.f / 5 + q * (1.f / 7))));
}

AW_HOT static void log_row(const float *restrict value, const float *restrict ground, float inverse_floor,
                           float *restrict out, int width)
{
  for (int x = 0; x < width; x++)
    out[x] = fast_log(1 + (value[x] - ground[x]) * inverse_floor);
}

static gboolean find_blobs(AwSegmentWork *w, GError **error)
{
  g_autoptr(AwPlane) log_image = aw_plane_new(w->coarse->width_px, w->coarse->height_px, error);
  if (!log_image)
    return FALSE;
  float floor_value = (float)MAX(w->rules->blob_floor * w->scale.height, w->scale.noise);
  for (int y = 0; y < w->coarse->height_px; y++)
    log_row(aw_plane_row(w->coarse, y), aw_plane_row(w->ground, y), 1 / floor_value, aw_plane_row(log_image, y),
            w->coarse->width_px);
  double sigma = MAX(w->rules->blob_scale * w->scale.radius_px, 1.5) / w->factor;
  w->blob = blob_filter(log_image, sigma, error);
  return w->blob != NULL;
}

typedef struct {
  AwShades *shades;
  float *top;
  double *cut;
  guint32 n;
} Zones;

static void fill_shades(const AwSegmentWork *w, const guint32 *zone, Zones *z)
{
  for (gsize i = 0; i < n_coarse(w); i++)
    if (zone[i])
      z->top[zone[i]] = MAX(z->top[zone[i]], w->coarse->value[i] - w->ground->value[i]);
  for (gsize i = 0; i < n_coarse(w); i++)
    if (zone[i]) {
      float v = (w->coarse->value[i] - w->ground->value[i]) / z->top[zone[i]];
      z->shades[zone[i]].count[MIN((int)(v * AW_SHADES), AW_SHADES - 1)]++;
    }
}

/* The first threshold of every zone: a fixed part of its own plateau, over its own background. */
static gboolean level_zones(AwSegmentWork *w, const guint32 *zone, guint32 n, GError **error)
{
  g_autofree AwShades *shades = g_new0(AwShades, n + 1);
  g_autofree float *top = g_new0(float, n + 1);
  Zones z = { shades, top, NULL, n };
  fill_shades(w, zone, &z);
  w->cut = aw_plane_new(w->coarse->width_px, w->coarse->height_px, error);
  if (!w->cut)
    return FALSE;
  for (guint32 i = 1; i <= n; i++)
    top[i] = (float)(w->rules->zone_level * aw_shades_plateau(&shades[i], (double)top[i]));
  for (gsize i = 0; i < n_coarse(w); i++)
    w->cut->value[i] = zone[i] ? w->ground->value[i] + top[zone[i]] : FLT_MAX;
  return TRUE;
}

AW_HOT static void compare_row(const float *restrict a, const float *restrict b, guint8 *restrict out, int width)
{
  for (int x = 0; x < width; x++)
    out[x] = a[x] > b[x];
}

/* Every pixel against the threshold of its coarse pixel; the threshold row is spread once per coarse row. */
static void cut_rows(AwSegmentWork *w)
{
  int f = w->factor;
  g_autofree float *row = g_new(float, (gsize)w->width_px);
  for (int y = 0; y < w->height_px; y++) {
    const float *cut = aw_plane_row(w->cut, y / f);
    if (f == 1)
      memcpy(row, cut, (gsize)w->width_px * sizeof *row);
    for (int x = 0; f > 1 && y % f == 0 && x < w->width_px; x += f, cut++)
      for (int k = 0; k < f && x + k < w->width_px; k++)
        row[x + k] = *cut;
    compare_row(aw_plane_row(w->smooth, y), row, w->mask + (gsize)y * (gsize)w->width_px, w->width_px);
  }
}

gboolean aw_segment_zones(AwSegmentWork *w, GError **error)
{
  gsize n_full = (gsize)w->width_px * (gsize)w->height_px;
  w->mask = aw_try_alloc(2 * n_full, 1, "a mask", error);
  g_autofree guint8 *inside = w->mask ? aw_try_alloc(n_coarse(w), 1, "a mask", error) : NULL;
  g_autofree guint32 *zone = inside ? aw_try_alloc(n_coarse(w), sizeof *zone, "a label image", error) : NULL;
  if (!zone || !find_blobs(w, error))
    return FALSE;
  double handle = pow(4, -w->settings->sensitivity);
  float level = (float)(handle * MAX(w->rules->detect_height * w->scale.height,
                                     w->rules->detect_noise * w->scale.noise / w->factor));
  for (gsize i = 0; i < n_coarse(w); i++)
    inside[i] = w->coarse->value[i] - w->ground->value[i] > level;
  guint32 n =
      aw_watershed(w->blob->value, inside, w->coarse->width_px, w->coarse->height_px, w->rules->zone_saddle, zone);
  if (!level_zones(w, zone, n, error))
    return FALSE;
  cut_rows(w);
  aw_mask_open(w->mask, w->width_px, w->height_px, w->mask + n_full);
  aw_mask_fill_holes(w->mask, w->width_px, w->height_px,
                     (gint64)(0.5 * G_PI * w->scale.radius_px * w->scale.radius_px));
  return TRUE;
}

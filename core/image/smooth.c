/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/smooth.h"

#include <math.h>
#include <string.h>

#include "base/error.h"

/*
 * Separable Gaussian with a sampled, normalised kernel cut at 3.3 sigma. Rows pass once through a ring of as many rows
 * as the kernel has taps: convolved along x on entry, along y on leaving, so the data is touched once.
 */

#define MAX_RADIUS 170

typedef struct {
  int radius;
  float tap[MAX_RADIUS + 1]; /* tap[0] is the centre */
} Kernel;

typedef void (*RowSource)(gconstpointer from, int y, float *row);

static Kernel gaussian(double sigma_px)
{
  Kernel k = { .radius = CLAMP((int)ceil(3.3 * sigma_px), 1, MAX_RADIUS) };
  if (sigma_px < 0.75)
    k.radius = 2;
  double sum = 0;
  for (int i = -k.radius; i <= k.radius; i++)
    sum += exp(-0.5 * i * i / (sigma_px * sigma_px));
  for (int i = 0; i <= k.radius; i++)
    k.tap[i] = (float)(exp(-0.5 * i * i / (sigma_px * sigma_px)) / sum);
  return k;
}

static int mirror(int i, int n)
{
  int period = 2 * n;
  i = ((i % period) + period) % period;
  return i < n ? i : period - 1 - i;
}

/* padded: the row with radius mirrored pixels on both sides; out[x] from padded[x ... x + 2 radius]. */
AW_HOT static void convolve_row(const float *restrict padded, float *restrict out, int width, const Kernel *k)
{
  int r = k->radius;
  for (int x = 0; x < width; x++)
    out[x] = k->tap[0] * padded[x + r];
  for (int i = 1; i <= r; i++) {
    float t = k->tap[i];
    for (int x = 0; x < width; x++)
      out[x] += t * (padded[x + r - i] + padded[x + r + i]);
  }
}

AW_HOT static void scale_row(const float *restrict in, float *restrict out, int width, float t)
{
  for (int x = 0; x < width; x++)
    out[x] = t * in[x];
}

AW_HOT static void add_pair(const float *restrict a, const float *restrict b, float *restrict out, int width, float t)
{
  for (int x = 0; x < width; x++)
    out[x] += t * (a[x] + b[x]);
}

static void pad_row(float *padded, int width, int radius)
{
  for (int i = 1; i <= radius; i++) {
    padded[radius - i] = padded[radius + mirror(-i, width)];
    padded[radius + width - 1 + i] = padded[radius + mirror(width - 1 + i, width)];
  }
}

/* Row y of the ring, x-smoothed; the ring holds rows y modulo its size. */
static void enter_row(RowSource source, gconstpointer from, int y, const Kernel *k, int width, float *padded,
                      float *ring)
{
  int n = 2 * k->radius + 1;
  source(from, y, padded + k->radius);
  pad_row(padded, width, k->radius);
  convolve_row(padded, ring + (gsize)(y % n) * (gsize)width, width, k);
}

static AwPlane *smooth(RowSource source, gconstpointer from, int width, int height, double sigma_px, GError **error)
{
  AwPlane *out = aw_plane_new(width, height, error);
  if (!out)
    return NULL;
  Kernel k = gaussian(sigma_px);
  int r = k.radius, n = 2 * r + 1, entered = 0;
  g_autofree float *padded = g_new(float, (gsize)(width + 2 * r));
  g_autofree float *ring = g_new(float, (gsize)n *(gsize)width);
#define RING_ROW(y) (ring + (gsize)(mirror((y), height) % n) * (gsize)width)
  for (int y = 0; y < height; y++) {
    for (; entered < height && entered <= y + r; entered++)
      enter_row(source, from, entered, &k, width, padded, ring);
    float *row = aw_plane_row(out, y);
    scale_row(RING_ROW(y), row, width, k.tap[0]);
    for (int i = 1; i <= r; i++)
      add_pair(RING_ROW(y - i), RING_ROW(y + i), row, width, k.tap[i]);
  }
#undef RING_ROW
  return out;
}

static void plane_source(gconstpointer from, int y, float *row)
{
  const AwPlane *plane = from;
  memcpy(row, aw_plane_row(plane, y), (gsize)plane->width_px * sizeof *row);
}

AwPlane *aw_smooth_plane(const AwPlane *plane, double sigma_px, GError **error)
{
  return smooth(plane_source, plane, plane->width_px, plane->height_px, sigma_px, error);
}

AW_HOT static void row_from_u8(const guint8 *restrict in, float *restrict out, int width)
{
  for (int x = 0; x < width; x++)
    out[x] = (float)in[x];
}

AW_HOT static void row_from_u16(const guint16 *restrict in, float *restrict out, int width)
{
  for (int x = 0; x < width; x++)
    out[x] = (float)in[x];
}

static void convert_row(const AwImage *image, int y, float *row)
{
  gsize at = (gsize)y * (gsize)image->width_px;
  if (image->sample == AW_SAMPLE_U8)
    row_from_u8((const guint8 *)image->pixels + at, row, image->width_px);
  else if (image->sample == AW_SAMPLE_U16)
    row_from_u16((const guint16 *)image->pixels + at, row, image->width_px);
  else
    memcpy(row, (const float *)image->pixels + at, (gsize)image->width_px * sizeof *row);
}

/* Three converted rows, so that each is converted once. */
typedef struct {
  const AwImage *image;
  float *row[3]; /* row y lies in row[(y + 3) % 3], with one mirrored pixel on both sides */
} HotSource;

static inline float max2(float a, float b)
{
  return a > b ? a : b;
}

AW_HOT static void level_row(const float *restrict up, const float *restrict mid, const float *restrict down,
                             float *restrict out, int width)
{
  for (int x = 0; x < width; x++) {
    float m = max2(max2(up[x], up[x + 1]), max2(up[x + 2], down[x]));
    m = max2(m, max2(max2(down[x + 1], down[x + 2]), max2(mid[x], mid[x + 2])));
    out[x] = mid[x + 1] < m ? mid[x + 1] : m;
  }
}

static void load_row(const HotSource *s, int y)
{
  if (y >= s->image->height_px)
    return;
  float *row = s->row[y % 3];
  convert_row(s->image, y, row + 1);
  row[0] = row[2 <= s->image->width_px ? 2 : 1];
  row[s->image->width_px + 1] = row[s->image->width_px >= 2 ? s->image->width_px - 1 : 1];
}

/* Called for y = 0, 1, 2 ... in turn. */
static void hot_source(gconstpointer from, int y, float *row)
{
  const HotSource *s = from;
  int h = s->image->height_px;
  if (y == 0)
    load_row(s, 0);
  load_row(s, y + 1);
  if (h == 1 || s->image->width_px == 1) {
    memcpy(row, s->row[y % 3] + 1, (gsize)s->image->width_px * sizeof *row);
    return;
  }
  const float *up = s->row[(y > 0 ? y - 1 : 1) % 3], *down = s->row[(y + 1 < h ? y + 1 : h - 2) % 3];
  level_row(up, s->row[y % 3], down, row, s->image->width_px);
}

static gboolean check_finite(const AwImage *image, GError **error)
{
  if (image->sample != AW_SAMPLE_F32)
    return TRUE;
  const float *p = image->pixels;
  gsize n = (gsize)image->width_px * (gsize)image->height_px, w = (gsize)image->width_px;
  for (gsize i = 0; i < n; i++)
    if (!isfinite(p[i])) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                  "the pixel in column %" G_GSIZE_FORMAT ", row %" G_GSIZE_FORMAT " is not a finite number", i % w,
                  i / w);
      return FALSE;
    }
  return TRUE;
}

AwPlane *aw_smooth_image(const AwImage *image, double sigma_px, GError **error)
{
  if (!check_finite(image, error))
    return NULL;
  gsize stride = (gsize)image->width_px + 2;
  g_autofree float *rows = g_new(float, 3 * stride);
  HotSource source = { image, { rows, rows + stride, rows + 2 * stride } };
  return smooth(hot_source, &source, image->width_px, image->height_px, sigma_px, error);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/opening.h"

#include <float.h>
#include <math.h>
#include <string.h>

/*
 * The disc is a stack of horizontal lines. The minimum over a line of any length is the minimum of two overlapping
 * windows whose width is a power of two, and those windows come from one another by doubling; so each row of the disc
 * costs two reads per pixel. The maximum runs as the minimum of the negative.
 */

AW_HOT static void min_into(const float *restrict a, float *restrict out, int width)
{
  for (int x = 0; x < width; x++)
    out[x] = a[x] < out[x] ? a[x] : out[x];
}

AW_HOT static void min_of(const float *restrict a, const float *restrict b, float *restrict out, int width)
{
  for (int x = 0; x < width; x++)
    out[x] = a[x] < b[x] ? a[x] : b[x];
}

AW_HOT static void negate(float *value, gsize n)
{
  for (gsize i = 0; i < n; i++)
    value[i] = -value[i];
}

typedef struct {
  int radius, width, height, stride, n_levels;
  float *level; /* n_levels rows: level l holds minima over 2^l padded pixels */
} Lines;

static void fill_levels(Lines *l, const float *row)
{
  for (int i = 0; i < l->stride; i++)
    l->level[i] = FLT_MAX;
  memcpy(l->level + l->radius, row, (gsize)l->width * sizeof *row);
  for (int k = 1; k < l->n_levels; k++) {
    const float *a = l->level + (gsize)(k - 1) * (gsize)l->stride;
    float *b = l->level + (gsize)k * (gsize)l->stride;
    int half = 1 << (k - 1);
    min_of(a, a + half, b, l->stride - half);
    for (int i = l->stride - half; i < l->stride; i++)
      b[i] = a[i];
  }
}

/* Takes the source row y into every output row whose disc covers it. */
static void spread_row(Lines *l, const AwPlane *in, int y, double radius_px, AwPlane *out)
{
  fill_levels(l, aw_plane_row(in, y));
  for (int dy = -l->radius; dy <= l->radius; dy++) {
    int to = y + dy, reach = (int)sqrt(MAX(radius_px * radius_px - (double)dy * dy, 0));
    if (to < 0 || to >= l->height)
      continue;
    int length = 2 * reach + 1, k = 0;
    while ((2 << k) <= length)
      k++;
    const float *first = l->level + (gsize)k * (gsize)l->stride + (l->radius - reach);
    min_into(first, aw_plane_row(out, to), l->width);
    min_into(first + length - (1 << k), aw_plane_row(out, to), l->width);
  }
}

static AwPlane *erode(const AwPlane *in, double radius_px, GError **error)
{
  AwPlane *out = aw_plane_new(in->width_px, in->height_px, error);
  if (!out)
    return NULL;
  gsize n = (gsize)in->width_px * (gsize)in->height_px;
  for (gsize i = 0; i < n; i++)
    out->value[i] = FLT_MAX;
  Lines l = { .radius = (int)radius_px, .width = in->width_px, .height = in->height_px };
  l.stride = l.width + 2 * l.radius;
  while ((1 << l.n_levels) <= 2 * l.radius + 1)
    l.n_levels++;
  g_autofree float *level = g_new(float, (gsize)l.stride *(gsize)l.n_levels);
  l.level = level;
  for (int y = 0; y < l.height; y++)
    spread_row(&l, in, y, radius_px, out);
  return out;
}

AwPlane *aw_opening_disc(const AwPlane *plane, double radius_px, GError **error)
{
  g_return_val_if_fail(radius_px >= 0.5, NULL);
  gsize n = (gsize)plane->width_px * (gsize)plane->height_px;
  g_autoptr(AwPlane) low = erode(plane, radius_px, error);
  if (!low)
    return NULL;
  negate(low->value, n);
  AwPlane *out = erode(low, radius_px, error);
  if (out)
    negate(out->value, n);
  return out;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/plane.h"

#include <string.h>

#include "base/limits.h"

AwPlane *aw_plane_new(int width_px, int height_px, GError **error)
{
  g_return_val_if_fail(width_px > 0 && height_px > 0, NULL);
  float *value = aw_try_alloc((gsize)width_px * (gsize)height_px, sizeof *value, "an image plane", error);
  if (!value)
    return NULL;
  AwPlane *plane = g_new(AwPlane, 1);
  *plane = (AwPlane){ width_px, height_px, value };
  return plane;
}

void aw_plane_free(AwPlane *plane)
{
  if (!plane)
    return;
  g_free(plane->value);
  g_free(plane);
}

AW_HOT static void add_rows(const float *restrict row, float *restrict sum, int width)
{
  for (int x = 0; x < width; x++)
    sum[x] += row[x];
}

static void average_columns(const float *sum, int width, int factor, int n_rows, float *out)
{
  for (int x = 0, i = 0; x < width; x += factor, i++) {
    int n = MIN(factor, width - x);
    float s = 0;
    for (int j = 0; j < n; j++)
      s += sum[x + j];
    out[i] = s / (float)(n * n_rows);
  }
}

AwPlane *aw_plane_reduce(const AwPlane *plane, int factor, GError **error)
{
  g_return_val_if_fail(factor >= 1, NULL);
  int w = plane->width_px, h = plane->height_px;
  AwPlane *out = aw_plane_new((w + factor - 1) / factor, (h + factor - 1) / factor, error);
  if (!out)
    return NULL;
  g_autofree float *sum = g_new(float, (gsize)w);
  for (int i = 0; i < out->height_px; i++) {
    int y0 = i * factor, n = MIN(factor, h - y0);
    memset(sum, 0, (gsize)w * sizeof *sum);
    for (int j = 0; j < n; j++)
      add_rows(aw_plane_row(plane, y0 + j), sum, w);
    average_columns(sum, w, factor, n, aw_plane_row(out, i));
  }
  return out;
}

/* The two neighbours of full-grid position p among n reduced ones, and the weight of the second. */
static float locate(int p, int factor, int n, int *first, int *second)
{
  float u = ((float)p + 0.5f) / (float)factor - 0.5f;
  u = CLAMP(u, 0.f, (float)(n - 1));
  *first = (int)u;
  *second = MIN(*first + 1, n - 1);
  return u - (float)*first;
}

AW_HOT static void blend_rows(const float *restrict a, const float *restrict b, float v, float *restrict out, int n)
{
  for (int i = 0; i < n; i++)
    out[i] = a[i] + v * (b[i] - a[i]);
}

void aw_plane_expand_row(const AwPlane *reduced, int factor, int y, int x0, int width, float *row)
{
  int j0, j1, n = reduced->width_px;
  float v = locate(y, factor, reduced->height_px, &j0, &j1);
  if (factor == 1) {
    memcpy(row, aw_plane_row(reduced, j0) + x0, (gsize)width * sizeof *row);
    return;
  }
  int first = MAX(x0 / factor - 1, 0), last = MIN((x0 + width) / factor + 2, n);
  float local[256] = { 0 }, *blend = last - first <= 256 ? local : g_new0(float, (gsize)(last - first));
  blend_rows(aw_plane_row(reduced, j0) + first, aw_plane_row(reduced, j1) + first, v, blend, last - first);
  float shift = 0.5f / (float)factor - 0.5f, top = (float)(n - 1);
  for (int x = 0, block = x0 / factor, rest = x0 % factor; x < width; x++) {
    float u = CLAMP((float)block + (float)rest / (float)factor + shift, 0.f, top);
    int i = MIN((int)u, MAX(n - 2, 0)), next = MIN(i + 1, n - 1);
    row[x] = blend[i - first] + (u - (float)i) * (blend[next - first] - blend[i - first]);
    if (++rest == factor) {
      rest = 0;
      block++;
    }
  }
  if (blend != local)
    g_free(blend);
}

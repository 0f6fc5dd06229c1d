/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/watershed.h"

#include <string.h>

typedef struct {
  guint32 at;
  guint16 key;
} Pixel;

typedef struct {
  guint32 *parent;
  float *peak;
  guint32 n, capacity;
} Regions;

static gsize collect(const float *value, const guint8 *mask, gsize n, float *lo, float *hi)
{
  gsize count = 0;
  for (gsize i = 0; i < n; i++)
    if (mask[i]) {
      float v = value[i];
      if (count == 0 || v < *lo)
        *lo = v;
      if (count == 0 || v > *hi)
        *hi = v;
      count++;
    }
  return count;
}

/* One stable pass of a radix sort, falling keys. */
static void radix_pass(const Pixel *in, Pixel *out, gsize n, int shift)
{
  gsize start[257] = { 0 };
  for (gsize i = 0; i < n; i++)
    start[256 - ((in[i].key >> shift) & 255)]++;
  for (int b = 1; b <= 256; b++)
    start[b] += start[b - 1];
  for (gsize i = 0; i < n; i++)
    out[start[255 - ((in[i].key >> shift) & 255)]++] = in[i];
}

static void sort_falling(const float *value, const guint8 *mask, gsize n_all, Pixel *pixel, Pixel *spare, gsize n,
                         float lo, float hi)
{
  float scale = hi > lo ? 65535.f / (hi - lo) : 0.f;
  for (gsize i = 0, k = 0; i < n_all; i++)
    if (mask[i])
      pixel[k++] = (Pixel){ (guint32)i, (guint16)((value[i] - lo) * scale) };
  radix_pass(pixel, spare, n, 0);
  radix_pass(spare, pixel, n, 8);
}

static guint32 root_of(guint32 *parent, guint32 i)
{
  while (parent[i] != i) {
    parent[i] = parent[parent[i]];
    i = parent[i];
  }
  return i;
}

static guint32 new_region(Regions *r, float peak)
{
  if (r->n + 1 >= r->capacity) {
    r->capacity *= 2;
    r->parent = g_renew(guint32, r->parent, r->capacity);
    r->peak = g_renew(float, r->peak, r->capacity);
  }
  guint32 id = ++r->n;
  r->parent[id] = id;
  r->peak[id] = peak;
  return id;
}

/* Two regions meet at `value`: the lower one is swallowed when it rises less than `height` above that. */
static void meet(Regions *r, guint32 a, guint32 b, float value, float height)
{
  a = root_of(r->parent, a);
  b = root_of(r->parent, b);
  if (a == b)
    return;
  guint32 low = r->peak[a] < r->peak[b] || (r->peak[a] == r->peak[b] && a > b) ? a : b;
  if (r->peak[low] - value < height)
    r->parent[low] = a == low ? b : a;
}

static guint32 highest_neighbour(const float *value, int width, int height, guint32 i, const guint32 *label)
{
  int x = (int)(i % (guint32)width), y = (int)(i / (guint32)width);
  guint32 best = 0;
  float top = 0;
  for (int dy = y > 0 ? -1 : 0; dy <= (y + 1 < height ? 1 : 0); dy++)
    for (int dx = x > 0 ? -1 : 0; dx <= (x + 1 < width ? 1 : 0); dx++) {
      gsize j = (gsize)((gssize)i + (gssize)dy * width + dx);
      if (label[j] && (!best || value[j] > top)) {
        best = label[j];
        top = value[j];
      }
    }
  return best;
}

static void place(const float *value, int width, int height, guint32 i, float h, Regions *r, guint32 *label)
{
  int x = (int)(i % (guint32)width), y = (int)(i / (guint32)width), n = 0;
  guint32 near[8], best = 0;
  float top = 0;
  for (int dy = y > 0 ? -1 : 0; dy <= (y + 1 < height ? 1 : 0); dy++)
    for (int dx = x > 0 ? -1 : 0; dx <= (x + 1 < width ? 1 : 0); dx++) {
      gsize j = (gsize)((gssize)i + (gssize)dy * width + dx);
      if (!label[j])
        continue;
      near[n++] = label[j];
      if (!best || value[j] > top) {
        best = label[j];
        top = value[j];
      }
    }
  if (!best) {
    label[i] = new_region(r, value[i]);
    return;
  }
  label[i] = best;
  for (int k = 0; k < n; k++)
    if (near[k] != best)
      meet(r, best, near[k], value[i], h);
}

guint32 aw_watershed(const float *value, const guint8 *mask, int width, int height, double saddle_height,
                     guint32 *label)
{
  gsize n_all = (gsize)width * (gsize)height;
  float lo = 0, hi = 0;
  gsize n = collect(value, mask, n_all, &lo, &hi);
  memset(label, 0, n_all * sizeof *label);
  if (n == 0)
    return 0;
  g_autofree Pixel *pixel = g_new(Pixel, n);
  g_autofree Pixel *spare = g_new(Pixel, n);
  sort_falling(value, mask, n_all, pixel, spare, n, lo, hi);
  Regions r = { g_new(guint32, 64), g_new(float, 64), 0, 64 };
  for (gsize k = 0; k < n; k++)
    place(value, width, height, pixel[k].at, (float)saddle_height, &r, label);
  g_autofree guint32 *number = g_new0(guint32, r.n + 1);
  guint32 n_out = 0;
  for (guint32 i = 1; i <= r.n; i++)
    if (root_of(r.parent, i) == i)
      number[i] = ++n_out;
  for (gsize k = 0; k < n; k++)
    label[pixel[k].at] = number[root_of(r.parent, label[pixel[k].at])];
  g_free(r.parent);
  g_free(r.peak);
  return n_out;
}

guint32 aw_flood_gaps(const float *value, const guint8 *mask, int width, int height, guint32 *label)
{
  gsize n_all = (gsize)width * (gsize)height;
  g_autofree guint8 *gap = g_new(guint8, n_all);
  for (gsize i = 0; i < n_all; i++)
    gap[i] = mask[i] && !label[i];
  float lo = 0, hi = 0;
  gsize n = collect(value, gap, n_all, &lo, &hi), left = n;
  g_autofree Pixel *pixel = g_new(Pixel, n + 1);
  g_autofree Pixel *spare = g_new(Pixel, n + 1);
  sort_falling(value, gap, n_all, pixel, spare, n, lo, hi);
  for (gsize before = left + 1; left > 0 && left < before;) {
    before = left;
    gsize kept = 0;
    for (gsize k = 0; k < left; k++) {
      label[pixel[k].at] = highest_neighbour(value, width, height, pixel[k].at, label);
      if (!label[pixel[k].at])
        pixel[kept++] = pixel[k];
    }
    left = kept;
  }
  return (guint32)left;
}

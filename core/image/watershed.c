/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/watershed.h"

#include <string.h>

typedef struct {
  guint32 at;
  guint16 key;
  guint16 inner; /* has all eight neighbours */
} Pixel;

typedef struct {
  guint32 *parent;
  float *peak;
  guint32 n, capacity;
} Regions;

typedef struct {
  const float *value;
  guint32 *label;
  int width, height;
  gssize step[8]; /* to the eight neighbours */
} Grid;

static Grid grid_of(const float *value, guint32 *label, int width, int height)
{
  gssize w = width;
  return (Grid){ value, label, width, height, { -w - 1, -w, -w + 1, -1, 1, w - 1, w, w + 1 } };
}

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

static void sort_falling(const Grid *g, const guint8 *mask, Pixel *pixel, Pixel *spare, gsize n, float lo, float hi)
{
  float scale = hi > lo ? 65535.f / (hi - lo) : 0.f;
  gsize w = (gsize)g->width, h = (gsize)g->height, k = 0;
  for (gsize y = 0; y < h; y++)
    for (gsize x = 0, i = y * w; x < w; x++, i++)
      if (mask[i]) {
        gboolean inner = x > 0 && y > 0 && x + 1 < w && y + 1 < h;
        pixel[k++] = (Pixel){ (guint32)i, (guint16)((g->value[i] - lo) * scale), (guint16)inner };
      }
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

static gboolean beyond_edge(const Grid *g, guint32 i, int k)
{
  int x = (int)(i % (guint32)g->width), y = (int)(i / (guint32)g->width);
  int column = k < 3 ? k : k == 3 ? 0 : k == 4 ? 2 : k - 5, row = k < 3 ? 0 : k < 5 ? 1 : 2;
  return x + column < 1 || x + column > g->width || y + row < 1 || y + row > g->height;
}

/* The labels around a pixel; the first is that of the highest neighbour. Returns how many there are. */
static inline int labels_around(const Grid *g, Pixel p, guint32 near[8])
{
  const guint32 *label = g->label + p.at;
  const float *value = g->value + p.at;
  float top = 0;
  int n = 0;
  for (int k = 0; k < 8; k++) {
    if (!p.inner && beyond_edge(g, p.at, k))
      continue;
    gssize step = g->step[k];
    if (!label[step])
      continue;
    near[n] = label[step];
    if (n == 0 || value[step] > top) {
      near[n] = near[0];
      near[0] = label[step];
      top = value[step];
    }
    n++;
  }
  return n;
}

static void place(const Grid *g, Pixel p, float height, Regions *r)
{
  guint32 near[8], i = p.at;
  int n = labels_around(g, p, near);
  if (n == 0) {
    g->label[i] = new_region(r, g->value[i]);
    return;
  }
  g->label[i] = near[0];
  for (int k = 1; k < n; k++)
    if (near[k] != near[0])
      meet(r, near[0], near[k], g->value[i], height);
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
  Grid grid = grid_of(value, label, width, height);
  sort_falling(&grid, mask, pixel, spare, n, lo, hi);
  Regions r = { g_new(guint32, 64), g_new(float, 64), 0, 64 };
  for (gsize k = 0; k < n; k++)
    place(&grid, pixel[k], (float)saddle_height, &r);
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
  g_autofree guint8 *gap = g_new0(guint8, n_all);
  for (gsize i = 0; i < n_all; i++)
    gap[i] = mask[i] && !label[i];
  float lo = 0, hi = 0;
  gsize n = collect(value, gap, n_all, &lo, &hi), left = n;
  g_autofree Pixel *pixel = g_new(Pixel, n + 1);
  g_autofree Pixel *spare = g_new(Pixel, n + 1);
  Grid grid = grid_of(value, label, width, height);
  sort_falling(&grid, gap, pixel, spare, n, lo, hi);
  for (gsize before = left + 1; left > 0 && left < before;) {
    before = left;
    gsize kept = 0;
    for (gsize k = 0; k < left; k++) {
      guint32 near[8];
      if (labels_around(&grid, pixel[k], near) > 0)
        label[pixel[k].at] = near[0];
      else
        pixel[kept++] = pixel[k];
    }
    left = kept;
  }
  return (guint32)left;
}

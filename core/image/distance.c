/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/distance.h"

#include <math.h>
#include <string.h>

#include "image/plane.h"

/* Column pass: distance to the nearest background above, then the smaller of that and the one below. */
AW_HOT static void step_down(const guint8 *restrict mask, const float *restrict above, float *restrict out, int width)
{
  for (int x = 0; x < width; x++)
    out[x] = mask[x] ? above[x] + 1 : 0;
}

AW_HOT static void step_up(const float *restrict below, float *restrict out, int width)
{
  for (int x = 0; x < width; x++) {
    float d = below[x] + 1;
    out[x] = d < out[x] ? d : out[x];
  }
}

static void column_pass(const guint8 *mask, int width, int height, float far, float *d)
{
  for (int x = 0; x < width; x++)
    d[x] = mask[x] ? far : 0;
  for (int y = 1; y < height; y++)
    step_down(mask + (gsize)y * (gsize)width, d + (gsize)(y - 1) * (gsize)width, d + (gsize)y * (gsize)width, width);
  for (int y = height - 2; y >= 0; y--)
    step_up(d + (gsize)(y + 1) * (gsize)width, d + (gsize)y * (gsize)width, width);
}

typedef struct {
  int *at; /* column of each parabola of the lower envelope */
  float *height, *start;
} Envelope;

/* Columns a ... b - 1 of one row, whose column distances are g; ends beyond the row are unknown. */
static void row_pass(const float *g, int a, int b, Envelope *e, float *out)
{
  int n = 0;
  for (int x = a; x < b; x++) {
    float f = g[x] * g[x], s = -INFINITY;
    while (n > 0) {
      int p = e->at[n - 1];
      s = (f - e->height[n - 1] + (float)(x * x - p * p)) / (float)(2 * (x - p));
      if (s > e->start[n - 1])
        break;
      n--;
      s = -INFINITY;
    }
    e->at[n] = x;
    e->height[n] = f;
    e->start[n++] = s;
  }
  for (int x = a, i = 0; x < b; x++) {
    while (i + 1 < n && e->start[i + 1] < (float)x)
      i++;
    int dx = x - e->at[i];
    out[x] = e->height[i] + (float)(dx * dx);
  }
}

AW_HOT static void finish_row(float *d, int width, float largest)
{
  for (int x = 0; x < width; x++) {
    float v = sqrtf(d[x]);
    d[x] = v < largest ? v : largest;
  }
}

void aw_distance_inside(const guint8 *mask, int width, int height, float largest, float *distance)
{
  float far = (float)(width + height) + largest;
  column_pass(mask, width, height, far, distance);
  gsize w = (gsize)width;
  g_autofree int *at = g_new(int, w);
  g_autofree float *real = g_new(float, 3 * w);
  Envelope e = { at, real, real + w };
  float *row = real + 2 * w;
  for (int y = 0; y < height; y++) {
    float *d = distance + (gsize)y * w;
    const guint8 *m = mask + (gsize)y * w;
    for (int x = 0; x < width;) {
      if (!m[x]) {
        x++;
        continue;
      }
      int a = x;
      while (x < width && m[x])
        x++;
      int from = MAX(a - 1, 0), to = MIN(x + 1, width);
      row_pass(d, from, to, &e, row);
      memcpy(d + a, row + a, (gsize)(x - a) * sizeof *d);
    }
    finish_row(d, width, largest);
  }
}

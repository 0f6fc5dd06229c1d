/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/patch.h"

#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/limits.h"

#define BLUR_REACH_SIGMA 4.0
#define FAR_PX 1e9

void aw_patch_init(AwPatch *patch)
{
  *patch = (AwPatch){ { 0, 0, 0, 0 }, NULL, NULL, 0 };
}

void aw_patch_clear(AwPatch *patch)
{
  g_free(patch->value);
  g_free(patch->scratch);
  aw_patch_init(patch);
}

/* The pixel whose square holds x; far beyond any frame it stays there, so that widths fit an int. */
static int pixel_of(double x)
{
  return (int)CLAMP(floor(x + 0.5), -FAR_PX, FAR_PX);
}

AwRect aw_points_rect(const AwPixelPoint *points, gsize n, double margin_px)
{
  double x0 = points[0].x_px, x1 = x0, y0 = points[0].y_px, y1 = y0;
  for (gsize i = 1; i < n; i++) {
    x0 = MIN(x0, points[i].x_px);
    x1 = MAX(x1, points[i].x_px);
    y0 = MIN(y0, points[i].y_px);
    y1 = MAX(y1, points[i].y_px);
  }
  return (AwRect){ pixel_of(x0 - margin_px), pixel_of(y0 - margin_px), pixel_of(x1 + margin_px) + 1,
                   pixel_of(y1 + margin_px) + 1 };
}

/* Empties the patch and makes room for `rect`. */
static gboolean lay_out(AwPatch *patch, AwRect rect, GError **error)
{
  gsize n = (gsize)(rect.x1 - rect.x0) * (gsize)(rect.y1 - rect.y0);
  if (n > patch->n_room) {
    aw_patch_clear(patch);
    patch->value = aw_try_alloc(n, sizeof *patch->value, "a drawing patch", error);
    patch->scratch = patch->value ? aw_try_alloc(n, sizeof *patch->scratch, "a drawing patch", error) : NULL;
    if (!patch->scratch)
      return FALSE;
    patch->n_room = n;
  }
  patch->rect = rect;
  memset(patch->value, 0, n * sizeof *patch->value);
  return TRUE;
}

/*
 * Exact coverage by signed areas. The area of a polygon inside one pixel is the sum over its edges of the area to the
 * right of the edge; an edge that sinks by h adds h to every pixel on its right and a trapezoid to those it crosses.
 * Only differences along the row are stored, and a running sum restores the coverage. (Areas under edges: Green's
 * theorem; the same bookkeeping serves in outline-font rasterisers.)
 */

/* One piece of an edge within row `row` (its differences) and within one column. */
static void add_piece(double *row, double xa, double xb, double h)
{
  double mean = (xa + xb) / 2.0, column = floor(mean);
  double right = h * (column + 1.0 - mean);
  row[(gsize)column] += right;
  row[(gsize)column + 1] += h - right;
}

/* The part of an edge within one row, from (xa) to (xb), sinking by h: cut at the column borders. */
static void add_in_row(double *row, double xa, double xb, double h)
{
  if (xb < xa) {
    double swap = xa;
    xa = xb;
    xb = swap;
  }
  double slope = xb > xa ? h / (xb - xa) : 0.0;
  double x = xa, done = 0.0;
  for (int border = (int)floor(xa) + 1; border < xb; border++) {
    double piece = (border - x) * slope;
    add_piece(row, x, border, piece);
    done += piece;
    x = border;
  }
  add_piece(row, x, xb, h - done);
}

/* Coordinates counted from the patch's corner, so that pixel k spans k ... k+1. */
static void add_edge(AwPatch *patch, double x0, double y0, double x1, double y1)
{
  double sign = 1.0;
  if (y1 < y0) {
    double swap_x = x0, swap_y = y0;
    x0 = x1, y0 = y1, x1 = swap_x, y1 = swap_y;
    sign = -1.0;
  }
  gsize width = (gsize)aw_patch_width(patch);
  if (y1 <= y0)
    return;
  double xa = x0;
  for (int top = (int)floor(y0); top < y1; top++) {
    double ya = MAX(y0, top), yb = MIN(y1, top + 1.0);
    double xb = x0 + (x1 - x0) * ((yb - y0) / (y1 - y0));
    add_in_row(patch->value + (gsize)top * width, xa, xb, sign * (yb - ya));
    xa = xb;
  }
}

gboolean aw_patch_cover(AwPatch *patch, const AwPixelPoint *polygon, gsize n, AwRect rect, GError **error)
{
  g_return_val_if_fail(n >= 3, FALSE);
  AwRect need = aw_points_rect(polygon, n, 1.0);
  g_return_val_if_fail(need.x0 >= rect.x0 && need.y0 >= rect.y0 && need.x1 <= rect.x1 && need.y1 <= rect.y1, FALSE);
  if (!lay_out(patch, rect, error))
    return FALSE;
  double left = rect.x0 - 0.5, top = rect.y0 - 0.5;
  for (gsize i = 0; i < n; i++) {
    const AwPixelPoint *a = polygon + i, *b = polygon + (i + 1) % n;
    add_edge(patch, a->x_px - left, a->y_px - top, b->x_px - left, b->y_px - top);
  }
  gsize width = (gsize)aw_patch_width(patch);
  for (gsize y = 0; y < (gsize)aw_patch_height(patch); y++) {
    double sum = 0.0, *row = patch->value + y * width;
    for (gsize x = 0; x < width; x++) {
      sum += row[x];
      row[x] = MIN(fabs(sum), 1.0);
    }
  }
  return TRUE;
}

/* Convolves n values at stride 1 of `in` with the half kernel k[0 ... reach] into `out`, at stride `stride`. */
static void blur_line(const double *in, gsize n, const double *k, gsize reach, double *out, gsize stride)
{
  for (gsize i = 0; i < n; i++) {
    double sum = k[0] * in[i];
    for (gsize j = 1; j <= reach; j++)
      sum += k[j] * ((i >= j ? in[i - j] : 0.0) + (i + j < n ? in[i + j] : 0.0));
    out[i * stride] = sum;
  }
}

void aw_patch_blur(AwPatch *patch, double sigma_px)
{
  g_return_if_fail(sigma_px >= 0.0 && sigma_px < 1000.0);
  if (sigma_px <= 0.0)
    return;
  gsize reach = (gsize)ceil(BLUR_REACH_SIGMA * sigma_px);
  g_autofree double *k = g_new(double, reach + 1);
  double sum = 0.0;
  for (gsize j = 0; j <= reach; j++) {
    k[j] = exp(-(double)(j * j) / (2.0 * sigma_px * sigma_px));
    sum += j ? 2.0 * k[j] : k[j];
  }
  for (gsize j = 0; j <= reach; j++)
    k[j] /= sum;
  gsize width = (gsize)aw_patch_width(patch), height = (gsize)aw_patch_height(patch);
  /* Each pass writes its lines as columns, so that both passes read along memory. */
  for (gsize y = 0; y < height; y++)
    blur_line(patch->value + y * width, width, k, reach, patch->scratch + y, height);
  for (gsize x = 0; x < width; x++)
    blur_line(patch->scratch + x * height, height, k, reach, patch->value + x, width);
}

double aw_patch_sum(const AwPatch *patch)
{
  double sum = 0.0;
  gsize n = (gsize)aw_patch_width(patch) * (gsize)aw_patch_height(patch);
  for (gsize i = 0; i < n; i++)
    sum += patch->value[i];
  return sum;
}

void aw_patch_add(const AwPatch *patch, double scale, double *picture, int width_px, int y0, int y1)
{
  AwRect r = patch->rect;
  int xa = MAX(r.x0, 0), xb = MIN(r.x1, width_px);
  for (int y = MAX(r.y0, y0); y < MIN(r.y1, y1); y++) {
    const double *from = patch->value + (gsize)(y - r.y0) * (gsize)aw_patch_width(patch);
    double *to = picture + (gsize)(y - y0) * (gsize)width_px;
    for (int x = xa; x < xb; x++)
      to[x] += scale * from[x - r.x0];
  }
}

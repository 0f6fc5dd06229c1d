/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/contour.h"

#include <string.h>

#include "geometry/outline.h"
#include "image/plane.h"

/* The smoothed mask has whole values from 0 to FULL; the level lies between two of them, so that no pixel is on it. */
#define FULL 256
#define LEVEL (0.5 * FULL - 0.5)
#define TOLERANCE_PX 0.1
/* Smoothing along the line: points this far apart, standard deviation per square root of the radius in px. */
#define SPACING_PX 2.5
#define SMOOTHING 0.9
#define MIN_SMOOTHED_POINTS 12
#define MAX_KERNEL 64

static const int neighbour_x[8] = { 1, -1, 0, 0, 1, 1, -1, -1 };
static const int neighbour_y[8] = { 0, 0, 1, -1, 1, -1, 1, -1 };

/* Turns the part of value `from` around `start` into `to`; returns its pixel count. The rim of the raster bounds it. */
static gsize fill_part(AwRaster *r, gsize start, guint8 from, guint8 to, int n_neighbours, gsize *stack)
{
  gsize n_stack = 1, count = 0;
  stack[0] = start;
  r->mask[start] = to;
  while (n_stack) {
    gsize at = stack[--n_stack];
    int x = (int)(at % (gsize)r->width_px), y = (int)(at / (gsize)r->width_px);
    count++;
    for (int k = 0; k < n_neighbours; k++) {
      int nx = x + neighbour_x[k], ny = y + neighbour_y[k];
      if (nx < 0 || ny < 0 || nx >= r->width_px || ny >= r->height_px)
        continue;
      gsize next = (gsize)ny * (gsize)r->width_px + (gsize)nx;
      if (r->mask[next] == from) {
        r->mask[next] = to;
        stack[n_stack++] = next;
      }
    }
  }
  return count;
}

static void replace_value(AwRaster *r, guint8 from, guint8 to)
{
  gsize n = (gsize)r->width_px * (gsize)r->height_px;
  for (gsize i = 0; i < n; i++)
    if (r->mask[i] == from)
      r->mask[i] = to;
}

void aw_raster_clean(AwRaster *raster)
{
  enum { OUTSIDE, INSIDE, SEEN, AROUND };
  gsize n = (gsize)raster->width_px * (gsize)raster->height_px, best = 0, best_count = 0;
  g_autofree gsize *stack = g_new(gsize, n + 1);
  for (gsize i = 0; i < n; i++)
    if (raster->mask[i] == INSIDE) {
      gsize count = fill_part(raster, i, INSIDE, SEEN, 8, stack);
      if (count > best_count) {
        best = i;
        best_count = count;
      }
    }
  if (best_count == 0)
    return;
  fill_part(raster, best, SEEN, INSIDE, 8, stack);
  replace_value(raster, SEEN, OUTSIDE);
  fill_part(raster, 0, OUTSIDE, AROUND, 4, stack);
  replace_value(raster, OUTSIDE, INSIDE);
  replace_value(raster, AROUND, OUTSIDE);
}

/* Binomial filter [1 4 6 4 1] / 16 in both directions (standard deviation 1 px), times FULL. */
AW_HOT static void smooth_mask(const AwRaster *r, guint8 *restrict rows, guint16 *restrict field)
{
  gsize w = (gsize)r->width_px, n = w * (gsize)r->height_px;
  memset(rows, 0, n);
  memset(field, 0, n * sizeof *field);
  const guint8 *m = r->mask;
  for (gsize i = 2; i + 2 < n; i++)
    rows[i] = (guint8)(m[i - 2] + 4 * m[i - 1] + 6 * m[i] + 4 * m[i + 1] + m[i + 2]);
  for (gsize i = 2 * w; i + 2 * w < n; i++)
    field[i] = (guint16)(rows[i - 2 * w] + 4 * rows[i - w] + 6 * rows[i] + 4 * rows[i + w] + rows[i + 2 * w]);
}

static void sharp_mask(const AwRaster *r, guint16 *field)
{
  gsize n = (gsize)r->width_px * (gsize)r->height_px;
  for (gsize i = 0; i < n; i++)
    field[i] = (guint16)(FULL * r->mask[i]);
}

/* A grid edge that the line crosses, seen while walking with the inside pixel on the right. */
typedef struct {
  int x, y;             /* the outside pixel, on the left */
  int ahead_x, ahead_y; /* direction of the walk; the inside pixel is at (x - ahead_y, y + ahead_x) */
} Crossing;

static void add_vertex(GArray *points, Crossing c, guint16 inside, guint16 outside)
{
  double t = (inside - LEVEL) / (double)(inside - outside) - 1;
  AwScanPoint p = { c.x + t * c.ahead_y, c.y - t * c.ahead_x };
  g_array_append_val(points, p);
}

/*
 * Marching squares (the two-dimensional form of Lorensen & Cline, Computer Graphics 21:163, 1987), walked from crossing
 * to crossing around the part that holds the topmost inside pixel, the inside on the right-hand side. Diagonal inside
 * pixels count as joined. One step is taken per grid edge crossed; since every crossing lies strictly between two
 * pixel centres, the polygon cannot cross itself.
 */
static void walk_contour(const guint16 *field, gssize w, gssize h, GArray *points)
{
  gssize start = 0;
  g_array_set_size(points, 0);
  while (start < w * h && field[start] <= LEVEL)
    start++;
  if (start == w * h)
    return;
  Crossing first = { (int)(start % w), (int)(start / w) - 1, 1, 0 }, c = first;
  do {
    gssize outside = c.y * w + c.x, right = c.ahead_x * w - c.ahead_y, ahead = c.ahead_y * w + c.ahead_x;
    add_vertex(points, c, field[outside + right], field[outside]);
    if (field[outside + ahead] > LEVEL)
      c = (Crossing){ c.x, c.y, c.ahead_y, -c.ahead_x };
    else if (field[outside + ahead + right] > LEVEL)
      c = (Crossing){ c.x + c.ahead_x, c.y + c.ahead_y, c.ahead_x, c.ahead_y };
    else
      c = (Crossing){ c.x + c.ahead_x - c.ahead_y, c.y + c.ahead_y + c.ahead_x, -c.ahead_y, c.ahead_x };
  } while (c.x != first.x || c.y != first.y || c.ahead_x != 1);
}

/* Plain root: hypot's guard against overflow costs more than all else here. */
static double between(AwScanPoint a, AwScanPoint b)
{
  double dx = b.x_um - a.x_um, dy = b.y_um - a.y_um;
  return sqrt(dx * dx + dy * dy);
}

/* n points evenly spaced along the closed line. */
static void resample(const GArray *points, double length, AwScanPoint *out, gsize n)
{
  const AwScanPoint *p = (const AwScanPoint *)(const void *)points->data;
  double begin = 0, step = 0;
  gsize i = 0;
  AwScanPoint a = p[0], b = p[1];
  for (gsize k = 0; k < n; k++) {
    double at = (double)k * length / (double)n;
    while (i < points->len && at > begin + (step = between(a, b))) {
      begin += step;
      a = b;
      i++;
      b = p[(i + 1) % points->len];
    }
    double t = step > 0 ? MIN((at - begin) / step, 1.0) : 0;
    out[k] = (AwScanPoint){ a.x_um + t * (b.x_um - a.x_um), a.y_um + t * (b.y_um - a.y_um) };
  }
}

/* Half of the symmetric kernel 2 G - G * G of a Gaussian; returns its reach, at most MAX_KERNEL. */
static gsize twiced_gaussian(double sigma, double *kernel)
{
  gsize reach = MIN((gsize)ceil(4.5 * sigma), MAX_KERNEL);
  double sum = 0;
  for (gsize k = 0; k <= reach; k++) {
    double z = (double)k / sigma;
    kernel[k] = 2 * exp(-z * z / 2) - exp(-z * z / 4) / G_SQRT2;
    sum += k ? 2 * kernel[k] : kernel[k];
  }
  for (gsize k = 0; k <= reach; k++)
    kernel[k] /= sum;
  return reach;
}

/* `p` has `reach` more points at either end, which repeat those of the other end. */
static GArray *convolve_ring(const AwScanPoint *p, gsize n, const double *kernel, gsize reach)
{
  GArray *out = g_array_sized_new(FALSE, FALSE, sizeof(AwScanPoint), (guint)n);
  g_array_set_size(out, (guint)n);
  for (gsize i = 0; i < n; i++) {
    const AwScanPoint *at = p + reach + i;
    AwScanPoint q = { kernel[0] * at->x_um, kernel[0] * at->y_um };
    for (gsize k = 1; k <= reach; k++) {
      q.x_um += kernel[k] * (at[k].x_um + (at - k)->x_um);
      q.y_um += kernel[k] * (at[k].y_um + (at - k)->y_um);
    }
    g_array_index(out, AwScanPoint, i) = q;
  }
  return out;
}

static double line_length(const GArray *points)
{
  const AwScanPoint *p = (const AwScanPoint *)(const void *)points->data;
  double sum = 0;
  for (guint i = 0, j = points->len - 1; i < points->len; j = i++)
    sum += between(p[i], p[j]);
  return sum;
}

/*
 * A mask cut by pixel centres has flats of about 2 sqrt(R) px where its line runs along a row or column, and there it
 * is wrong by up to half a pixel. They are smoothed away along the line. A Gaussian alone would blunt the ends of long
 * nuclei; applied twice in Tukey's manner (Exploratory Data Analysis, 1977: smooth, and add the smoothed rest) it keeps
 * the coarse shape. NULL where there are too few points or the line would cross itself.
 */
static GArray *smooth_along(const GArray *points, double area)
{
  double length = line_length(points), kernel[MAX_KERNEL + 1];
  gsize n = MAX((gsize)(length / SPACING_PX), MIN_SMOOTHED_POINTS);
  if (length < MIN_SMOOTHED_POINTS)
    return NULL;
  double sigma = SMOOTHING * sqrt(2 * area / length) / (length / (double)n);
  gsize reach = MIN(twiced_gaussian(sigma, kernel), n / 2);
  g_autofree AwScanPoint *even = g_new(AwScanPoint, n + 2 * reach);
  resample(points, length, even + reach, n);
  memcpy(even, even + n, reach * sizeof *even);
  memcpy(even + reach + n, even + reach, reach * sizeof *even);
  g_autoptr(GArray) smooth = convolve_ring(even, n, kernel, reach);
  if (!aw_outline_is_simple((const AwScanPoint *)(const void *)smooth->data, n))
    return NULL;
  return g_steal_pointer(&smooth);
}

static double square_to_line(AwScanPoint q, AwScanPoint a, AwScanPoint b)
{
  double ux = b.x_um - a.x_um, uy = b.y_um - a.y_um, vx = q.x_um - a.x_um, vy = q.y_um - a.y_um;
  double length = ux * ux + uy * uy, c = ux * vy - uy * vx;
  return length > 0 ? c * c / length : vx * vx + vy * vy;
}

/* Marks the points between `first` and `last` that are needed (Douglas & Peucker, Cartographica 10:112, 1973). */
static void mark_needed(const AwScanPoint *p, gsize first, gsize last, guint8 *needed)
{
  double worst = TOLERANCE_PX * TOLERANCE_PX;
  gsize split = 0;
  for (gsize i = first + 1; i < last; i++) {
    double d = square_to_line(p[i], p[first], p[last]);
    if (d > worst) {
      worst = d;
      split = i;
    }
  }
  if (split == 0)
    return;
  needed[split] = 1;
  mark_needed(p, first, split, needed);
  mark_needed(p, split, last, needed);
}

/* The points to keep; the closed line is cut at its first point and the one farthest from it. */
static GArray *simplify(GArray *points)
{
  AwScanPoint first = g_array_index(points, AwScanPoint, 0);
  gsize n = points->len, far = 0;
  g_array_append_val(points, first);
  const AwScanPoint *p = &g_array_index(points, AwScanPoint, 0);
  double worst = 0;
  for (gsize i = 1; i < n; i++) {
    double d = between(p[i], p[0]);
    if (d > worst) {
      worst = d;
      far = i;
    }
  }
  g_autofree guint8 *needed = g_malloc0(n + 1);
  needed[0] = needed[far] = 1;
  mark_needed(p, 0, far, needed);
  mark_needed(p, far, n, needed);
  g_array_set_size(points, (guint)n);
  GArray *kept = g_array_new(FALSE, FALSE, sizeof(AwScanPoint));
  for (gsize i = 0; i < n; i++)
    if (needed[i])
      g_array_append_val(kept, p[i]);
  return kept;
}

AW_HOT static void mask_sums(const AwRaster *r, gint64 *sums)
{
  for (int y = 0; y < r->height_px; y++) {
    const guint8 *row = r->mask + (gsize)y * (gsize)r->width_px;
    int n = 0, x_sum = 0;
    for (int x = 0; x < r->width_px; x++) {
      n += row[x];
      x_sum += row[x] * x;
    }
    sums[0] += n;
    sums[1] += x_sum;
    sums[2] += (gint64)n * y;
  }
}

static double mask_moments(const AwRaster *r, AwScanPoint *centroid)
{
  gint64 sums[3] = { 0 };
  mask_sums(r, sums);
  *centroid = (AwScanPoint){ (double)sums[1] / (double)sums[0], (double)sums[2] / (double)sums[0] };
  return (double)sums[0];
}

static double points_area(GArray *points)
{
  return aw_outline_area(&g_array_index(points, AwScanPoint, 0), points->len);
}

void aw_contour_trace(const AwRaster *raster, GArray *points)
{
  gsize n = (gsize)raster->width_px * (gsize)raster->height_px;
  g_autofree guint8 *rows = g_malloc(n);
  g_autofree guint16 *field = g_new(guint16, n);
  AwScanPoint centroid;
  double area = mask_moments(raster, &centroid);
  g_return_if_fail(area > 0);
  smooth_mask(raster, rows, field);
  walk_contour(field, raster->width_px, raster->height_px, points);
  if (points->len < 3 || points_area(points) < 0.7 * area) {
    /* Smoothing tore a thin mask apart or drowned it: the plain mask is one part by contract. */
    sharp_mask(raster, field);
    walk_contour(field, raster->width_px, raster->height_px, points);
  }
  g_autoptr(GArray) smooth = smooth_along(points, area);
  g_autoptr(GArray) kept = simplify(smooth ? smooth : points);
  if (kept->len >= 3 && aw_outline_is_simple(&g_array_index(kept, AwScanPoint, 0), kept->len)) {
    g_array_set_size(points, 0);
    g_array_append_vals(points, kept->data, kept->len);
  }
  AwScanPoint *p = &g_array_index(points, AwScanPoint, 0);
  double scale = sqrt(area / aw_outline_area(p, points->len));
  AwMatrix grow = { scale, 0, 0, scale };
  aw_outline_map(p, points->len, grow, aw_outline_centroid(p, points->len), centroid);
}

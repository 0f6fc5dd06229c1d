/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/shape.h"

/* Sums of x and x^2 over x0 <= x < x1. */
static gint64 sum_to(gint64 n)
{
  return n * (n - 1) / 2;
}

static gint64 sum_squares_to(gint64 n)
{
  return n * (n - 1) * (2 * n - 1) / 6;
}

/* Whole sums about the first run, so that large coordinates lose no digits. */
AwMoments aw_runs_moments(const AwRun *runs, gsize n_runs)
{
  g_return_val_if_fail(n_runs > 0, (AwMoments){ 0 });
  gint64 n = 0, sx = 0, sy = 0, sxx = 0, sxy = 0, syy = 0;
  AwRun o = runs[0];
  for (gsize i = 0; i < n_runs; i++) {
    gint64 a = runs[i].x0 - o.x0, b = runs[i].x1 - o.x0, y = runs[i].y - o.y, length = b - a;
    gint64 x = sum_to(b) - sum_to(a);
    n += length;
    sx += x;
    sy += y * length;
    sxx += sum_squares_to(b) - sum_squares_to(a);
    sxy += y * x;
    syy += y * y * length;
  }
  double m = (double)n, x = (double)sx / m, y = (double)sy / m;
  return (AwMoments){ n, o.x0 + x, o.y + y, (double)sxx / m - x * x, (double)sxy / m - x * y, (double)syy / m - y * y };
}

AwRect aw_runs_box(const AwRun *runs, gsize n_runs)
{
  g_return_val_if_fail(n_runs > 0, (AwRect){ 0 });
  AwRect box = { runs[0].x0, runs[0].y, runs[0].x1, runs[n_runs - 1].y + 1 };
  for (gsize i = 1; i < n_runs; i++) {
    box.x0 = MIN(box.x0, runs[i].x0);
    box.x1 = MAX(box.x1, runs[i].x1);
  }
  return box;
}

/*
 * Convex hull in half pixels. Every pixel adds the middles of its four edges; of those only the outermost on each half
 * row can matter: (2 x0 - 1) on the pixel's own row, 2 x0 half a row above and below. Both sides are chains of points
 * with rising y, so the hull is Andrew's monotone chain (Inf. Proc. Letters 9:216, 1979) without a sort.
 */
typedef struct {
  gint64 x, y;
} HalfPoint;

static void widen(gint64 *left, gint64 *right, gint64 x0, gint64 x1)
{
  *left = MIN(*left, x0);
  *right = MAX(*right, x1);
}

static gint64 turn(HalfPoint a, HalfPoint b, HalfPoint c)
{
  return (b.x - a.x) * (c.y - a.y) - (b.y - a.y) * (c.x - a.x);
}

/* The chain of the points (side[y], y) that bounds them on the left (sign 1) or on the right (sign -1). */
static gsize make_chain(const gint64 *side, gsize n, gint64 sign, HalfPoint *chain)
{
  gsize m = 0;
  for (gsize y = 0; y < n; y++) {
    if (side[y] == G_MAXINT64 || side[y] == G_MININT64)
      continue;
    HalfPoint p = { side[y], (gint64)y };
    while (m >= 2 && sign * turn(chain[m - 2], chain[m - 1], p) >= 0)
      m--;
    chain[m++] = p;
  }
  return m;
}

static gint64 divide_down(gint64 a, gint64 b)
{
  return a >= 0 ? a / b : -((-a + b - 1) / b);
}

/* Pixel columns whose centre is at or left of the chain on half row y; `at` walks along the chain with y. */
static gint64 columns_to(const HalfPoint *chain, gint64 y, gsize *at, gboolean round_up)
{
  while (chain[*at + 1].y < y)
    ++*at;
  HalfPoint a = chain[*at], b = chain[*at + 1];
  gint64 below = 2 * (b.y - a.y), above = a.x * (b.y - a.y) + (b.x - a.x) * (y - a.y);
  return round_up ? -divide_down(-above, below) : divide_down(above, below);
}

static gint64 count_inside(const HalfPoint *left, const HalfPoint *right, gsize n_half)
{
  gint64 count = 0;
  gsize l = 0, r = 0;
  for (gint64 y = 1; y < (gint64)n_half; y += 2)
    count += columns_to(right, y, &r, FALSE) - columns_to(left, y, &l, TRUE) + 1;
  return count;
}

gint64 aw_runs_hull_px(const AwRun *runs, gsize n_runs)
{
  g_return_val_if_fail(n_runs > 0, 0);
  AwRect box = aw_runs_box(runs, n_runs);
  gsize n_half = 2 * (gsize)(box.y1 - box.y0) + 1;
  g_autofree gint64 *left = g_new0(gint64, n_half);
  g_autofree gint64 *right = g_new0(gint64, n_half);
  for (gsize i = 0; i < n_half; i++) {
    left[i] = G_MAXINT64;
    right[i] = G_MININT64;
  }
  for (gsize i = 0; i < n_runs; i++) {
    gsize y = 2 * (gsize)(runs[i].y - box.y0) + 1;
    gint64 x0 = 2 * (gint64)runs[i].x0, x1 = 2 * ((gint64)runs[i].x1 - 1);
    widen(&left[y - 1], &right[y - 1], x0, x1);
    widen(&left[y], &right[y], x0 - 1, x1 + 1);
    widen(&left[y + 1], &right[y + 1], x0, x1);
  }
  g_autofree HalfPoint *chain_l = g_new0(HalfPoint, n_half);
  g_autofree HalfPoint *chain_r = g_new0(HalfPoint, n_half);
  make_chain(left, n_half, 1, chain_l);
  make_chain(right, n_half, -1, chain_r);
  return count_inside(chain_l, chain_r, n_half);
}

void aw_ellipse_from_covariance(double xx, double xy, double yy, double *major, double *minor, double *angle_rad)
{
  double half = (xx + yy) / 2, root = hypot((xx - yy) / 2, xy);
  *major = 4 * sqrt(MAX(half + root, 0.0));
  *minor = 4 * sqrt(MAX(half - root, 0.0));
  *angle_rad = 0.5 * atan2(2 * xy, xx - yy);
}

void aw_ellipse_map(AwMatrix m, double *major, double *minor, double *angle_rad)
{
  double c = cos(*angle_rad), s = sin(*angle_rad), a = *major * *major / 16, b = *minor * *minor / 16;
  AwMatrix v = { a * c * c + b * s * s, (a - b) * c * s, (a - b) * c * s, a * s * s + b * c * c };
  AwMatrix transposed = { m.xx, m.yx, m.xy, m.yy };
  AwMatrix w = aw_matrix_multiply(aw_matrix_multiply(m, v), transposed);
  aw_ellipse_from_covariance(w.xx, w.xy, w.yy, major, minor, angle_rad);
}

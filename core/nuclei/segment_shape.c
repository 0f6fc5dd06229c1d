/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdlib.h>

#include "nuclei/segment_work.h"

AwMoments aw_moments_sum(const AwMoments *a, const AwMoments *b)
{
  return (AwMoments){ a->n + b->n, a->sx + b->sx, a->sy + b->sy, a->sxx + b->sxx, a->sxy + b->sxy, a->syy + b->syy };
}

/* Central second moments per pixel, those of the pixel square itself included. */
static void spread(const AwMoments *m, double *xx, double *xy, double *yy)
{
  double cx = m->sx / m->n, cy = m->sy / m->n;
  *xx = m->sxx / m->n - cx * cx + 1.0 / 12;
  *yy = m->syy / m->n - cy * cy + 1.0 / 12;
  *xy = m->sxy / m->n - cx * cy;
}

double aw_moments_ellipse(const AwMoments *m)
{
  double xx, xy, yy;
  spread(m, &xx, &xy, &yy);
  return m->n / (4 * G_PI * sqrt(MAX(xx * yy - xy * xy, 1e-6)));
}

double aw_moments_elongation(const AwMoments *m)
{
  double xx, xy, yy;
  spread(m, &xx, &xy, &yy);
  double mean = (xx + yy) / 2, half = sqrt((xx - yy) * (xx - yy) / 4 + xy * xy);
  return sqrt((mean + half) / MAX(mean - half, 1e-6));
}

static int by_place(const void *a, const void *b)
{
  const AwCorner *p = a, *q = b;
  return p->x != q->x ? (p->x > q->x) - (p->x < q->x) : (p->y > q->y) - (p->y < q->y);
}

static gint64 turn(AwCorner a, AwCorner b, AwCorner c)
{
  return (gint64)(b.x - a.x) * (c.y - a.y) - (gint64)(b.y - a.y) * (c.x - a.x);
}

/* Andrew, Inf. Process. Lett. 9:216, 1979. */
gsize aw_hull(AwCorner *point, gsize n)
{
  if (n < 3)
    return n;
  qsort(point, n, sizeof *point, by_place);
  g_autofree AwCorner *hull = g_new(AwCorner, 2 * n + 2);
  gsize k = 0;
  for (gsize i = 0; i < n; i++) {
    while (k >= 2 && turn(hull[k - 2], hull[k - 1], point[i]) <= 0)
      k--;
    hull[k++] = point[i];
  }
  for (gsize i = n - 1, lower = k + 1; i-- > 0;) {
    while (k >= lower && turn(hull[k - 2], hull[k - 1], point[i]) <= 0)
      k--;
    hull[k++] = point[i];
  }
  k--;
  for (gsize i = 0; i < k && i < n; i++)
    point[i] = hull[i];
  return MIN(k, n);
}

static gint64 divisor(gint64 a, gint64 b)
{
  while (b) {
    gint64 t = a % b;
    a = b;
    b = t;
  }
  return a;
}

double aw_hull_convexity(const AwCorner *hull, gsize n, double n_px)
{
  gint64 twice_area = 0, on_edge = 0;
  for (gsize i = 0; i < n; i++) {
    AwCorner a = hull[i], b = hull[(i + 1) % n];
    twice_area += (gint64)a.x * b.y - (gint64)b.x * a.y;
    on_edge += divisor(ABS(b.x - a.x), ABS(b.y - a.y));
  }
  return n_px / ((double)ABS(twice_area) / 2 + (double)on_edge / 2 + 1);
}

/* The value below which `part` of the counts lie, linear inside a bin. */
static double quantile_bin(const guint32 *count, int from, double part)
{
  double total = 0, sum = 0;
  for (int i = from; i < AW_SHADES; i++)
    total += count[i];
  for (int i = from; i < AW_SHADES; i++) {
    if (count[i] && sum + count[i] >= part * total)
      return i + (part * total - sum) / count[i];
    sum += count[i];
  }
  return AW_SHADES;
}

double aw_shades_plateau(const AwShades *s, double top)
{
  int half = (int)(0.5 * quantile_bin(s->count, 0, 0.95));
  return top * quantile_bin(s->count, half, 0.6) / AW_SHADES;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/outline.h"

/* Lines across the common box of two outlines; their spacing bounds the error of the shared area. */
#define N_COMMON_LINES 48
#define MAX_CROSSINGS 64

static double cross(AwScanPoint o, AwScanPoint a, AwScanPoint b)
{
  return (a.x_um - o.x_um) * (b.y_um - o.y_um) - (a.y_um - o.y_um) * (b.x_um - o.x_um);
}

static double signed_area(const AwScanPoint *p, gsize n)
{
  double sum = 0;
  for (gsize i = 1; i + 1 < n; i++)
    sum += cross(p[0], p[i], p[i + 1]);
  return sum / 2;
}

double aw_outline_area(const AwScanPoint *p, gsize n)
{
  return fabs(signed_area(p, n));
}

AwScanPoint aw_outline_centroid(const AwScanPoint *p, gsize n)
{
  g_return_val_if_fail(n > 0, ((AwScanPoint){ 0, 0 }));
  double x = 0, y = 0, area = 0;
  for (gsize i = 1; i + 1 < n; i++) {
    double c = cross(p[0], p[i], p[i + 1]);
    area += c;
    x += c * (p[i].x_um + p[i + 1].x_um - 2 * p[0].x_um) / 3;
    y += c * (p[i].y_um + p[i + 1].y_um - 2 * p[0].y_um) / 3;
  }
  if (fabs(area) > 0)
    return (AwScanPoint){ p[0].x_um + x / area, p[0].y_um + y / area };
  for (gsize i = 0; i < n; i++) {
    x += p[i].x_um / (double)n;
    y += p[i].y_um / (double)n;
  }
  return (AwScanPoint){ x, y };
}

gboolean aw_outline_contains(const AwScanPoint *p, gsize n, AwScanPoint q)
{
  gboolean inside = FALSE;
  for (gsize i = 0, j = n - 1; i < n; j = i++)
    if ((p[i].y_um > q.y_um) != (p[j].y_um > q.y_um)) {
      double t = (q.y_um - p[i].y_um) / (p[j].y_um - p[i].y_um);
      if (q.x_um < p[i].x_um + t * (p[j].x_um - p[i].x_um))
        inside = !inside;
    }
  return inside;
}

double aw_outline_reach(const AwScanPoint *p, gsize n, AwScanPoint q)
{
  double best = 0;
  for (gsize i = 0; i < n; i++) {
    double dx = p[i].x_um - q.x_um, dy = p[i].y_um - q.y_um;
    best = MAX(best, dx * dx + dy * dy);
  }
  return sqrt(best);
}

static double square_to_segment(AwScanPoint q, AwScanPoint a, AwScanPoint b)
{
  double ux = b.x_um - a.x_um, uy = b.y_um - a.y_um, vx = q.x_um - a.x_um, vy = q.y_um - a.y_um;
  double length = ux * ux + uy * uy;
  double t = length > 0 ? CLAMP((ux * vx + uy * vy) / length, 0.0, 1.0) : 0.0;
  double dx = vx - t * ux, dy = vy - t * uy;
  return dx * dx + dy * dy;
}

static gboolean segments_cross(AwScanPoint a, AwScanPoint b, AwScanPoint c, AwScanPoint d)
{
  return (cross(a, b, c) > 0) != (cross(a, b, d) > 0) && (cross(c, d, a) > 0) != (cross(c, d, b) > 0);
}

/* Square of the distance from q to its nearest vertex of p, and that vertex. */
static double nearest_vertex(const AwScanPoint *p, gsize n, AwScanPoint q, AwScanPoint *vertex)
{
  double best = INFINITY;
  for (gsize i = 0; i < n; i++) {
    double dx = p[i].x_um - q.x_um, dy = p[i].y_um - q.y_um, d = dx * dx + dy * dy;
    if (d < best) {
      best = d;
      *vertex = p[i];
    }
  }
  return best;
}

/* A circle around one outline: what lies farther from it than the best distance so far need not be looked at. */
typedef struct {
  AwScanPoint centre;
  double radius;
} Circle;

static Circle circle_around(const AwScanPoint *p, gsize n)
{
  AwScanPoint c = { 0, 0 };
  for (gsize i = 0; i < n; i++) {
    c.x_um += p[i].x_um / (double)n;
    c.y_um += p[i].y_um / (double)n;
  }
  return (Circle){ c, aw_outline_reach(p, n, c) };
}

/* Shortest distance of the edge a-b to the edges of p, or 0 where they cross; never more than `best`. */
static double edge_distance(AwScanPoint a, AwScanPoint b, const AwScanPoint *p, gsize n, double best)
{
  double square = best * best;
  double x0 = MIN(a.x_um, b.x_um) - best, x1 = MAX(a.x_um, b.x_um) + best;
  double y0 = MIN(a.y_um, b.y_um) - best, y1 = MAX(a.y_um, b.y_um) + best;
  for (gsize i = 0, j = n - 1; i < n; j = i++) {
    AwScanPoint c = p[j], d = p[i];
    if (MAX(c.x_um, d.x_um) < x0 || MIN(c.x_um, d.x_um) > x1 || MAX(c.y_um, d.y_um) < y0 || MIN(c.y_um, d.y_um) > y1)
      continue;
    if (segments_cross(a, b, c, d))
      return 0;
    double s = MIN(square_to_segment(a, c, d), square_to_segment(b, c, d));
    double t = MIN(square_to_segment(c, a, b), square_to_segment(d, a, b));
    square = MIN(square, MIN(s, t));
  }
  return sqrt(square);
}

static double longest_edge(const AwScanPoint *p, gsize n)
{
  double square = 0;
  for (gsize i = 0, j = n - 1; i < n; j = i++) {
    double dx = p[i].x_um - p[j].x_um, dy = p[i].y_um - p[j].y_um;
    square = MAX(square, dx * dx + dy * dy);
  }
  return sqrt(square);
}

double aw_outline_distance(const AwScanPoint *a, gsize n_a, const AwScanPoint *b, gsize n_b)
{
  g_return_val_if_fail(n_a > 0 && n_b > 0, INFINITY);
  if (aw_outline_contains(a, n_a, b[0]) || aw_outline_contains(b, n_b, a[0]))
    return 0;
  Circle circle = circle_around(b, n_b);
  AwScanPoint near_a = a[0], near_b = b[0];
  nearest_vertex(a, n_a, circle.centre, &near_a);
  nearest_vertex(b, n_b, near_a, &near_b);
  double best = sqrt(nearest_vertex(a, n_a, near_b, &near_a));
  double half_edge = longest_edge(a, n_a) / 2;
  for (gsize i = 0, j = n_a - 1; i < n_a && best > 0; j = i++) {
    /* No point of an edge is farther from one of its ends than half of the longest edge. */
    double limit = circle.radius + best + half_edge;
    double x0 = a[j].x_um - circle.centre.x_um, y0 = a[j].y_um - circle.centre.y_um;
    double x1 = a[i].x_um - circle.centre.x_um, y1 = a[i].y_um - circle.centre.y_um;
    if (MIN(x0 * x0 + y0 * y0, x1 * x1 + y1 * y1) <= limit * limit)
      best = edge_distance(a[j], a[i], b, n_b, best);
  }
  return best;
}

typedef struct {
  double x0, y0, x1, y1;
} Box;

static Box box_around(const AwScanPoint *p, gsize n)
{
  Box box = { INFINITY, INFINITY, -INFINITY, -INFINITY };
  for (gsize i = 0; i < n; i++) {
    box.x0 = MIN(box.x0, p[i].x_um);
    box.y0 = MIN(box.y0, p[i].y_um);
    box.x1 = MAX(box.x1, p[i].x_um);
    box.y1 = MAX(box.y1, p[i].y_um);
  }
  return box;
}

/* Where the line y = constant crosses the outline, rising; they pair up into the stretches inside. */
static gsize crossings(const AwScanPoint *p, gsize n, double y, double *x)
{
  gsize count = 0;
  for (gsize i = 0, j = n - 1; i < n && count < MAX_CROSSINGS; j = i++)
    if ((p[i].y_um > y) != (p[j].y_um > y)) {
      double at = p[i].x_um + (y - p[i].y_um) / (p[j].y_um - p[i].y_um) * (p[j].x_um - p[i].x_um);
      gsize k = count++;
      for (; k > 0 && x[k - 1] > at; k--)
        x[k] = x[k - 1];
      x[k] = at;
    }
  return count & ~(gsize)1;
}

static double common_length(const double *a, gsize n_a, const double *b, gsize n_b)
{
  double sum = 0;
  for (gsize i = 0; i < n_a; i += 2)
    for (gsize j = 0; j < n_b; j += 2)
      sum += MAX(0.0, MIN(a[i + 1], b[j + 1]) - MAX(a[i], b[j]));
  return sum;
}

double aw_outline_common_area(const AwScanPoint *a, gsize n_a, const AwScanPoint *b, gsize n_b)
{
  Box p = box_around(a, n_a), q = box_around(b, n_b);
  double y0 = MAX(p.y0, q.y0), y1 = MIN(p.y1, q.y1);
  if (!(y1 > y0) || !(MIN(p.x1, q.x1) > MAX(p.x0, q.x0)))
    return 0;
  double sum = 0, step = (y1 - y0) / N_COMMON_LINES;
  for (int k = 0; k < N_COMMON_LINES; k++) {
    double x_a[MAX_CROSSINGS], x_b[MAX_CROSSINGS], y = y0 + (k + 0.5) * step;
    gsize m_a = crossings(a, n_a, y, x_a), m_b = crossings(b, n_b, y, x_b);
    sum += common_length(x_a, m_a, x_b, m_b);
  }
  return sum * step;
}

/* TRUE when every edge turns the same way about the centroid and all together turn once: then none can cross. */
static gboolean is_star_shaped(const AwScanPoint *p, gsize n)
{
  AwScanPoint c = aw_outline_centroid(p, n);
  gsize n_left = 0, n_turns = 0;
  for (gsize i = 0, j = n - 1; i < n; j = i++) {
    n_left += cross(c, p[j], p[i]) > 0;
    n_turns += p[j].y_um <= c.y_um && p[i].y_um > c.y_um;
  }
  return n_left == n && n_turns == 1;
}

/* Edges that share a point are neighbours and cannot cross; every other pair is tried. */
gboolean aw_outline_is_simple(const AwScanPoint *p, gsize n)
{
  if (is_star_shaped(p, n))
    return TRUE;
  for (gsize i = 0; i + 2 < n; i++) {
    double y0 = MIN(p[i].y_um, p[i + 1].y_um), y1 = MAX(p[i].y_um, p[i + 1].y_um);
    for (gsize j = i + 2; j < n - (i == 0); j++) {
      AwScanPoint c = p[j], d = p[j + 1 == n ? 0 : j + 1];
      if (MAX(c.y_um, d.y_um) >= y0 && MIN(c.y_um, d.y_um) <= y1 && segments_cross(p[i], p[i + 1], c, d))
        return FALSE;
    }
  }
  return TRUE;
}

void aw_outline_map(AwScanPoint *p, gsize n, AwMatrix m, AwScanPoint from, AwScanPoint to)
{
  for (gsize i = 0; i < n; i++) {
    double dx = p[i].x_um - from.x_um, dy = p[i].y_um - from.y_um;
    p[i] = (AwScanPoint){ to.x_um + (m.xx * dx + m.xy * dy), to.y_um + (m.yx * dx + m.yy * dy) };
  }
  for (gsize i = 0; aw_matrix_det(m) < 0 && i < n / 2; i++) {
    AwScanPoint swap = p[i];
    p[i] = p[n - 1 - i];
    p[n - 1 - i] = swap;
  }
}

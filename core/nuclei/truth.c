/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/truth.h"

const char *aw_truth_kind_name(AwTruthKind kind)
{
  static const char *const names[] = { "interphase", "mitotic", "debris", "fibre" };
  return names[kind];
}

/* Area and moments of a polygon by Green's theorem, relative to its first point to keep digits. */
static void measure(AwTruth *t)
{
  AwScanPoint o = t->outline[0];
  double area = 0.0, mx = 0.0, my = 0.0, xx = 0.0, yy = 0.0, xy = 0.0;
  for (gsize i = 0; i < t->n_outline; i++) {
    const AwScanPoint *a = t->outline + i, *b = t->outline + (i + 1) % t->n_outline;
    double ax = a->x_um - o.x_um, ay = a->y_um - o.y_um, bx = b->x_um - o.x_um, by = b->y_um - o.y_um;
    double cross = ax * by - bx * ay;
    area += cross / 2.0;
    mx += cross * (ax + bx) / 6.0;
    my += cross * (ay + by) / 6.0;
    xx += cross * (ax * ax + ax * bx + bx * bx) / 12.0;
    yy += cross * (ay * ay + ay * by + by * by) / 12.0;
    xy += cross * (2.0 * ax * ay + ax * by + bx * ay + 2.0 * bx * by) / 24.0;
  }
  mx /= area, my /= area;
  xx = xx / area - mx * mx, yy = yy / area - my * my, xy = xy / area - mx * my;
  double mean = (xx + yy) / 2.0, half = hypot((xx - yy) / 2.0, xy);
  t->area_um2 = fabs(area);
  t->centroid = (AwScanPoint){ o.x_um + mx, o.y_um + my };
  t->major_um = 4.0 * sqrt(mean + half);
  t->minor_um = 4.0 * sqrt(MAX(mean - half, 0.0));
  t->angle_rad = 0.5 * atan2(2.0 * xy, xx - yy);
}

AwTruth *aw_truth_new(AwTruthKind kind, const AwScanPoint *outline, gsize n)
{
  g_return_val_if_fail(n >= 3, NULL);
  AwTruth *t = g_new0(AwTruth, 1);
  t->kind = kind;
  t->outline = g_memdup2(outline, n * sizeof *outline);
  t->n_outline = n;
  t->gap_um = INFINITY;
  measure(t);
  for (gsize i = 0; i < n; i++)
    t->reach_um = MAX(t->reach_um, hypot(outline[i].x_um - t->centroid.x_um, outline[i].y_um - t->centroid.y_um));
  return t;
}

void aw_truth_free(AwTruth *truth)
{
  if (!truth)
    return;
  g_free(truth->outline);
  g_free(truth);
}

static void free_element(gpointer truth)
{
  aw_truth_free(truth);
}

GPtrArray *aw_truths_new(void)
{
  return g_ptr_array_new_with_free_func(free_element);
}

/* Counts the outline's crossings of the ray to the right. */
gboolean aw_truth_contains(const AwTruth *truth, AwScanPoint point)
{
  gboolean in = FALSE;
  for (gsize i = 0, j = truth->n_outline - 1; i < truth->n_outline; j = i++) {
    const AwScanPoint *a = truth->outline + i, *b = truth->outline + j;
    if ((a->y_um > point.y_um) != (b->y_um > point.y_um) &&
        point.x_um < a->x_um + (b->x_um - a->x_um) * (point.y_um - a->y_um) / (b->y_um - a->y_um))
      in = !in;
  }
  return in;
}

static double segment_distance2(AwScanPoint p, AwScanPoint a, AwScanPoint b)
{
  double dx = b.x_um - a.x_um, dy = b.y_um - a.y_um, px = p.x_um - a.x_um, py = p.y_um - a.y_um;
  double length2 = dx * dx + dy * dy;
  double along = length2 > 0.0 ? CLAMP((px * dx + py * dy) / length2, 0.0, 1.0) : 0.0;
  px -= along * dx, py -= along * dy;
  return px * px + py * py;
}

/* The least squared distance of a's points from b's edges; 0 as soon as a point lies inside. */
static double one_sided_gap2(const AwTruth *a, const AwTruth *b, double best2)
{
  for (gsize i = 0; i < a->n_outline; i++) {
    AwScanPoint p = a->outline[i];
    double centre = hypot(p.x_um - b->centroid.x_um, p.y_um - b->centroid.y_um) - b->reach_um;
    if (centre > 0.0 && centre * centre >= best2)
      continue;
    if (aw_truth_contains(b, p))
      return 0.0;
    for (gsize j = 0; j < b->n_outline; j++)
      best2 = MIN(best2, segment_distance2(p, b->outline[j], b->outline[(j + 1) % b->n_outline]));
  }
  return best2;
}

/* Outlines have many short edges, so two that overlap have a point of one inside the other. */
double aw_truth_gap(const AwTruth *a, const AwTruth *b, double far_um)
{
  double apart = hypot(a->centroid.x_um - b->centroid.x_um, a->centroid.y_um - b->centroid.y_um);
  if (apart - a->reach_um - b->reach_um > far_um)
    return INFINITY;
  double gap2 = one_sided_gap2(b, a, one_sided_gap2(a, b, far_um * far_um));
  return gap2 < far_um * far_um ? sqrt(gap2) : INFINITY;
}

static int by_x(gconstpointer a, gconstpointer b)
{
  const AwTruth *ta = *(const AwTruth *const *)a, *tb = *(const AwTruth *const *)b;
  double xa = ta->centroid.x_um - ta->reach_um, xb = tb->centroid.x_um - tb->reach_um;
  return xa < xb ? -1 : xa > xb;
}

/* A sweep in x over the objects' extents: only those whose extents come near are measured. */
void aw_truths_measure_gaps(GPtrArray *truths, double far_um)
{
  g_autoptr(GPtrArray) sorted = g_ptr_array_sized_new(truths->len);
  for (guint i = 0; i < truths->len; i++) {
    AwTruth *t = truths->pdata[i];
    t->gap_um = INFINITY;
    g_ptr_array_add(sorted, t);
  }
  g_ptr_array_sort(sorted, by_x);
  for (guint i = 0; i < sorted->len; i++) {
    AwTruth *a = sorted->pdata[i];
    for (guint j = i + 1; j < sorted->len; j++) {
      AwTruth *b = sorted->pdata[j];
      if (b->centroid.x_um - b->reach_um > a->centroid.x_um + a->reach_um + far_um)
        break;
      double gap = aw_truth_gap(a, b, far_um);
      a->gap_um = MIN(a->gap_um, gap);
      b->gap_um = MIN(b->gap_um, gap);
    }
  }
}

void aw_shape_outline(const AwShape *shape, AwScanPoint *outline)
{
  double a = shape->major_um / 2.0, b = shape->minor_um / 2.0;
  double turn_x = cos(shape->angle_rad), turn_y = sin(shape->angle_rad);
  for (int i = 0; i < AW_SHAPE_N_POINTS; i++) {
    double t = 2.0 * G_PI * i / AW_SHAPE_N_POINTS, f = 1.0;
    for (int k = 0; k < AW_SHAPE_N_WAVES; k++)
      f += shape->wave_cos[k] * cos((k + 2) * t) + shape->wave_sin[k] * sin((k + 2) * t);
    double u = a * f * cos(t), v = b * f * sin(t);
    if (shape->bend_rad > 0.0) {
      double radius = a / shape->bend_rad, along = u / radius, across = radius - v;
      u = across * sin(along);
      v = radius - across * cos(along);
    }
    outline[i].x_um = shape->position.x_um + u * turn_x - v * turn_y;
    outline[i].y_um = shape->position.y_um + u * turn_y + v * turn_x;
  }
}

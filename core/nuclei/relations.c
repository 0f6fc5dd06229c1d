/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <gsl/gsl_statistics_double.h>

#include "base/grid.h"
#include "geometry/outline.h"
#include "nuclei/measure.h"

/* An edge less steep than this part of the median one counts as out of focus. */
#define SOFT_EDGE_RATIO 0.6
/* Nuclei that reach farther than this many median reaches are compared with all others, so that searches stay short. */
#define LARGE_REACH_RATIO 3

static double median_of(const double *values, gsize n)
{
  g_autofree double *copy = g_memdup2(values, n * sizeof *copy);
  return n ? gsl_stats_median(copy, 1, n) : 0;
}

typedef struct {
  GPtrArray *nuclei;
  double *xy, *reach, *best; /* centroid, largest distance of the outline from it, isolation so far */
  double *searched;          /* radius within which nucleus i was compared with all */
  double cap;                /* reach of the largest nucleus that the grid search must expect */
  AwGrid *grid;
} Isolation;

/* Lowers both isolations if the outlines of i and j are nearer than what is known; circles spare most comparisons. */
static void compare_pair(Isolation *s, gsize i, gsize j)
{
  double gap = hypot(s->xy[2 * i] - s->xy[2 * j], s->xy[2 * i + 1] - s->xy[2 * j + 1]) - s->reach[i] - s->reach[j];
  if (gap >= s->best[i] && gap >= s->best[j])
    return;
  const AwNucleus *a = s->nuclei->pdata[i], *b = s->nuclei->pdata[j];
  double distance = aw_outline_distance(a->outline, a->n_outline, b->outline, b->n_outline);
  s->best[i] = MIN(s->best[i], distance);
  s->best[j] = MIN(s->best[j], distance);
}

/* Widens the search around nucleus i until nothing outside it can be nearer than what was found. */
static void search_around(Isolation *s, gsize i, double step, double extent, GArray *hits)
{
  for (double radius = s->reach[i] + s->cap + step; s->best[i] > 0; radius *= 2) {
    aw_grid_within(s->grid, s->xy[2 * i], s->xy[2 * i + 1], radius, hits);
    for (guint k = 0; k < hits->len; k++) {
      AwGridHit hit = g_array_index(hits, AwGridHit, k);
      gboolean known = hit.distance <= s->searched[i] || hit.distance <= s->searched[hit.index];
      if (hit.index != i && !known && s->reach[hit.index] <= s->cap)
        compare_pair(s, i, hit.index);
    }
    s->searched[i] = radius;
    if (s->best[i] <= radius - s->reach[i] - s->cap || radius > extent)
      return;
  }
}

static void find_isolation(Isolation *s)
{
  gsize n = s->nuclei->len;
  double x0 = INFINITY, y0 = INFINITY, x1 = -INFINITY, y1 = -INFINITY;
  for (gsize i = 0; i < n; i++) {
    x0 = MIN(x0, s->xy[2 * i]);
    x1 = MAX(x1, s->xy[2 * i]);
    y0 = MIN(y0, s->xy[2 * i + 1]);
    y1 = MAX(y1, s->xy[2 * i + 1]);
  }
  double extent = hypot(x1 - x0, y1 - y0), step = sqrt((x1 - x0) * (y1 - y0) / (double)n) / 2;
  for (gsize i = 0; i < n; i++)
    for (gsize j = 0; s->reach[i] > s->cap && j < n; j++)
      if (j != i)
        compare_pair(s, i, j);
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  for (gsize i = 0; i < n; i++)
    search_around(s, i, step, extent, hits);
}

static void set_isolation(GPtrArray *nuclei)
{
  gsize n = nuclei->len;
  g_autofree double *xy = g_new(double, 2 * n);
  g_autofree double *reach = g_new(double, n);
  g_autofree double *best = g_new(double, n);
  g_autofree double *searched = g_new(double, n);
  for (gsize i = 0; i < n; i++) {
    const AwNucleus *a = nuclei->pdata[i];
    xy[2 * i] = a->centroid.x_um;
    xy[2 * i + 1] = a->centroid.y_um;
    reach[i] = aw_outline_reach(a->outline, a->n_outline, a->centroid);
    searched[i] = -1;
    best[i] = a->flags & AW_FLAG_TOUCHING ? 0 : INFINITY;
  }
  g_autoptr(AwGrid) grid = aw_grid_new(xy, n);
  Isolation search = { nuclei, xy, reach, best, searched, LARGE_REACH_RATIO * median_of(reach, n), grid };
  find_isolation(&search);
  for (gsize i = 0; i < n; i++) {
    AwNucleus *a = nuclei->pdata[i];
    a->isolation = best[i];
    if (!(best[i] > 0))
      a->flags |= AW_FLAG_TOUCHING;
  }
}

void aw_measure_relations(GPtrArray *nuclei)
{
  g_return_if_fail(nuclei);
  gsize n = nuclei->len;
  if (n == 0)
    return;
  g_autofree double *area = g_new(double, n);
  g_autofree double *sharpness = g_new(double, n);
  for (gsize i = 0; i < n; i++) {
    const AwNucleus *a = nuclei->pdata[i];
    area[i] = a->area;
    sharpness[i] = a->sharpness;
  }
  double median_area = median_of(area, n), median_sharpness = median_of(sharpness, n);
  for (gsize i = 0; i < n; i++) {
    AwNucleus *a = nuclei->pdata[i];
    a->area_ratio = median_area > 0 ? a->area / median_area : 1;
    a->flags &= ~(guint)AW_FLAG_DEFOCUSED;
    if (a->sharpness < SOFT_EDGE_RATIO * median_sharpness)
      a->flags |= AW_FLAG_DEFOCUSED;
  }
  set_isolation(nuclei);
}

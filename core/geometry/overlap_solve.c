/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <gsl/gsl_statistics_double.h>
#include <string.h>

#include "base/grid.h"
#include "geometry/overlap_parts.h"

#define AREA_FACTOR 1.3
#define MIN_PAIRS 8
/* Smallest over largest spread of the shifts: below it they lie on one line and A is not determined. */
#define MIN_SPREAD 0.02
/* Pairs farther off than this many robust standard deviations are left out. */
#define TRIM 3.5
#define N_ROUNDS 6

/* A frame's marks as an index. */
typedef struct {
  double *xy;
  AwGrid *grid;
} MarkIndex;

static MarkIndex *index_marks(const AwOverlapFrame *frames, gsize n_frames)
{
  MarkIndex *index = g_new0(MarkIndex, n_frames + 1);
  for (gsize f = 0; f < n_frames; f++) {
    index[f].xy = g_new(double, 2 * frames[f].n_marks + 1);
    for (gsize i = 0; i < frames[f].n_marks; i++) {
      index[f].xy[2 * i] = frames[f].marks[i].p.x_px;
      index[f].xy[2 * i + 1] = frames[f].marks[i].p.y_px;
    }
    index[f].grid = aw_grid_new(index[f].xy, frames[f].n_marks);
  }
  return index;
}

static void free_index(MarkIndex *index, gsize n_frames)
{
  for (gsize f = 0; f < n_frames; f++) {
    g_free(index[f].xy);
    aw_grid_free(index[f].grid);
  }
  g_free(index);
}

/* The mark of the frame nearest to p, within the tolerance. */
static gboolean nearest_mark(const MarkIndex *index, double x, double y, double tolerance_px, gsize *mark)
{
  AwGridHit hit;
  if (aw_grid_nearest(index->grid, x, y, 1, &hit) == 0 || hit.distance > tolerance_px)
    return FALSE;
  *mark = hit.index;
  return TRUE;
}

static gboolean is_inside(const AwOverlapFrame *frame, double x, double y, double margin)
{
  return x >= margin && y >= margin && x <= frame->width_px - 1 - margin && y <= frame->height_px - 1 - margin;
}

/*
 * Marks of frames a and b that are each other's nearest when b is moved by the expected shift of `base`. Returns how
 * many marks of a fall into b.
 */
static gsize match_frames(const AwOverlapFrame *frames, const MarkIndex *index, AwOverlapPair base, double tolerance_px,
                          double margin_px, GArray *pairs)
{
  const AwOverlapFrame *a = &frames[base.a], *b = &frames[base.b];
  AwPixelPoint c = aw_overlap_centre_shift(a, b);
  double dx = base.dx + c.x_px, dy = base.dy + c.y_px;
  gsize n_possible = 0;
  for (gsize i = 0; i < a->n_marks; i++) {
    gsize j = 0, back = 0;
    AwPixelPoint p = a->marks[i].p;
    n_possible += is_inside(b, p.x_px - dx, p.y_px - dy, margin_px);
    if (!is_inside(b, p.x_px - dx, p.y_px - dy, -tolerance_px) ||
        !nearest_mark(&index[base.b], p.x_px - dx, p.y_px - dy, tolerance_px, &j))
      continue;
    AwPixelPoint q = b->marks[j].p;
    double ratio = a->marks[i].area_px / b->marks[j].area_px;
    if (!nearest_mark(&index[base.a], q.x_px + dx, q.y_px + dy, tolerance_px, &back) || back != i ||
        ratio > AREA_FACTOR || ratio < 1 / AREA_FACTOR)
      continue;
    AwOverlapPair pair = base;
    pair.dx = p.x_px - q.x_px - c.x_px;
    pair.dy = p.y_px - q.y_px - c.y_px;
    g_array_append_val(pairs, pair);
  }
  return n_possible;
}

/* Largest distance in um at which two frames can overlap. */
static double widest_frame_um(const AwOverlapFrame *frames, gsize n_frames, AwMatrix a)
{
  double widest = 0;
  for (gsize f = 0; f < n_frames; f++)
    widest = MAX(widest, hypot(frames[f].width_px, frames[f].height_px));
  return widest * MAX(hypot(a.xx, a.yx), hypot(a.xy, a.yy));
}

static AwOverlapPair expected_shift(const AwOverlapFrame *frames, gsize f, gsize g, AwMatrix inverse)
{
  double sx = frames[f].stage.x_um - frames[g].stage.x_um, sy = frames[f].stage.y_um - frames[g].stage.y_um;
  return (AwOverlapPair){ f, g, sx, sy, inverse.xx * sx + inverse.xy * sy, inverse.yx * sx + inverse.yy * sy };
}

GArray *aw_overlap_match(const AwOverlapFrame *frames, gsize n_frames, AwMatrix a, double tolerance_px, double mark_px,
                         gsize *possible)
{
  memset(possible, 0, AW_OVERLAP_SECTORS * sizeof *possible);
  GArray *pairs = g_array_new(FALSE, FALSE, sizeof(AwOverlapPair));
  g_autofree double *xy = g_new(double, 2 * n_frames + 1);
  for (gsize f = 0; f < n_frames; f++) {
    xy[2 * f] = frames[f].stage.x_um;
    xy[2 * f + 1] = frames[f].stage.y_um;
  }
  g_autoptr(AwGrid) grid = aw_grid_new(xy, n_frames);
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  MarkIndex *index = index_marks(frames, n_frames);
  AwMatrix inverse = aw_matrix_inverse(a);
  double reach = widest_frame_um(frames, n_frames, a);
  for (gsize f = 0; f < n_frames; f++) {
    aw_grid_within(grid, xy[2 * f], xy[2 * f + 1], reach, hits);
    for (guint k = 0; k < hits->len; k++) {
      AwGridHit hit = g_array_index(hits, AwGridHit, k);
      AwOverlapPair base = expected_shift(frames, f, hit.index, inverse);
      if (hit.index > f && hit.distance > 0 && fabs(base.dx) < frames[f].width_px &&
          fabs(base.dy) < frames[f].height_px)
        possible[aw_overlap_sector(base.sx, base.sy)] +=
            match_frames(frames, index, base, tolerance_px, 0.6 * mark_px, pairs);
    }
  }
  free_index(index, n_frames);
  return pairs;
}

/* Least squares for A in A d = s: both rows share the normal matrix. */
static gboolean solve_once(const GArray *pairs, AwMatrix *a)
{
  double xx = 0, xy = 0, yy = 0;
  AwMatrix right = { 0, 0, 0, 0 };
  for (guint i = 0; i < pairs->len; i++) {
    AwOverlapPair p = g_array_index(pairs, AwOverlapPair, i);
    xx += p.dx * p.dx;
    xy += p.dx * p.dy;
    yy += p.dy * p.dy;
    right.xx += p.sx * p.dx;
    right.xy += p.sx * p.dy;
    right.yx += p.sy * p.dx;
    right.yy += p.sy * p.dy;
  }
  double half = (xx + yy) / 2, root = hypot((xx - yy) / 2, xy);
  if (pairs->len < MIN_PAIRS || !(half - root > MIN_SPREAD * (half + root)))
    return FALSE;
  *a = aw_matrix_multiply(right, aw_matrix_inverse((AwMatrix){ xx, xy, xy, yy }));
  return TRUE;
}

static double residual_um(AwMatrix a, AwOverlapPair p)
{
  return hypot(p.sx - a.xx * p.dx - a.xy * p.dy, p.sy - a.yx * p.dx - a.yy * p.dy);
}

/* Drops the pairs beyond TRIM robust standard deviations; the median of a radial error is 1.1774 of them. */
static gboolean trim(GArray *pairs, AwMatrix a)
{
  g_autofree double *r = g_new(double, pairs->len + 1);
  for (guint i = 0; i < pairs->len; i++)
    r[i] = residual_um(a, g_array_index(pairs, AwOverlapPair, i));
  double limit = TRIM * gsl_stats_median(r, 1, pairs->len) / 1.1774 + 1e-9;
  guint kept = 0;
  for (guint i = 0; i < pairs->len; i++) {
    AwOverlapPair p = g_array_index(pairs, AwOverlapPair, i);
    if (residual_um(a, p) <= limit)
      g_array_index(pairs, AwOverlapPair, kept++) = p;
  }
  gboolean changed = kept < pairs->len;
  g_array_set_size(pairs, kept);
  return changed;
}

gboolean aw_overlap_solve(GArray *pairs, AwMatrix *a, double *rms_um)
{
  gboolean again = TRUE;
  for (int round = 0; round < N_ROUNDS && again; round++) {
    if (!solve_once(pairs, a))
      return FALSE;
    again = trim(pairs, *a);
  }
  if (!solve_once(pairs, a))
    return FALSE;
  double sum = 0;
  for (guint i = 0; i < pairs->len; i++) {
    double r = residual_um(*a, g_array_index(pairs, AwOverlapPair, i));
    sum += r * r;
  }
  /* Two equations a pair, four unknowns. */
  *rms_um = sqrt(sum / (2.0 * pairs->len - 4));
  return TRUE;
}

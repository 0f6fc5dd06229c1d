/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <gsl/gsl_statistics_double.h>

#include "base/grid.h"
#include "geometry/overlap_parts.h"

/*
 * Two frames of one camera show their shared marks at one and the same shift p_a - p_b, whatever the pixel map is. All
 * differences of marks of like area are the candidates (a two-dimensional Hough transform); the true shift is where
 * they crowd. Its evidence is the Poisson log-likelihood ratio of the crowd over the density of chance differences,
 * less the logarithm of the number of places where chance could have made one.
 */
#define N_NEIGHBOURS 24
#define N_PER_SECTOR 12
#define MAX_MARKS 300
#define AREA_FACTOR 1.3
#define MIN_VOTES 4
/* A vote ends when it has this many differences: enough for any crowd to stand out. */
#define MAX_DIFFERENCES 60000
#define MIN_PEAK_PX 2.0
#define STRONG_EVIDENCE 5
/* Pairs whose stage moves differ by less than this part of their length vote together. */
#define SAME_MOVE 0.05

double aw_overlap_mark_px(const AwOverlapFrame *frames, gsize n_frames)
{
  g_autoptr(GArray) all = g_array_new(FALSE, FALSE, sizeof(double));
  for (gsize f = 0; f < n_frames; f++)
    for (gsize i = 0; i < frames[f].n_marks; i++) {
      double diameter = 2 * sqrt(frames[f].marks[i].area_px / G_PI);
      g_array_append_val(all, diameter);
    }
  return all->len ? gsl_stats_median((double *)(void *)all->data, 1, all->len) : 0;
}

AwPixelPoint aw_overlap_centre_shift(const AwOverlapFrame *a, const AwOverlapFrame *b)
{
  AwPixelPoint p = aw_frame_centre(a->width_px, a->height_px), q = aw_frame_centre(b->width_px, b->height_px);
  return (AwPixelPoint){ p.x_px - q.x_px, p.y_px - q.y_px };
}

static int compare_area(gconstpointer a, gconstpointer b)
{
  const AwOverlapMark *p = a, *q = b;
  if (p->area_px < q->area_px || p->area_px > q->area_px)
    return p->area_px > q->area_px ? -1 : 1;
  if (p->p.y_px < q->p.y_px || p->p.y_px > q->p.y_px)
    return p->p.y_px < q->p.y_px ? -1 : 1;
  return p->p.x_px < q->p.x_px ? -1 : p->p.x_px > q->p.x_px;
}

/* The largest marks, since those are the same ones in both frames. */
static AwOverlapMark *largest_marks(const AwOverlapFrame *frame, gsize *n)
{
  AwOverlapMark *marks = g_memdup2(frame->marks, frame->n_marks * sizeof *marks);
  if (frame->n_marks > 1)
    qsort(marks, frame->n_marks, sizeof *marks, compare_area);
  *n = MIN(frame->n_marks, MAX_MARKS);
  return marks;
}

static gboolean are_alike(const AwOverlapMark *p, const AwOverlapMark *q)
{
  return p->area_px < AREA_FACTOR * q->area_px && q->area_px < AREA_FACTOR * p->area_px;
}

/* Dust on the camera moves with no stage: marks of p that stand at the same pixel in q are left out of p. */
static gsize drop_standing(AwOverlapMark *p, gsize n_p, const AwOverlapMark *q, gsize n_q, double peak_px)
{
  gsize kept = 0;
  for (gsize i = 0; i < n_p; i++) {
    gboolean stands = FALSE;
    for (gsize j = 0; j < n_q && !stands; j++)
      stands = hypot(p[i].p.x_px - q[j].p.x_px, p[i].p.y_px - q[j].p.y_px) <= peak_px && are_alike(&p[i], &q[j]);
    if (!stands)
      p[kept++] = p[i];
  }
  return kept;
}

/* Appends the differences (p_a - c_a) - (p_b - c_b) as pairs of doubles, moved by `move`. */
static void add_differences(const AwOverlapFrame *a, const AwOverlapFrame *b, double peak_px, const double *move,
                            GArray *all)
{
  gsize n_a = 0, n_b = 0;
  g_autofree AwOverlapMark *p = largest_marks(a, &n_a);
  g_autofree AwOverlapMark *q = largest_marks(b, &n_b);
  g_autofree AwOverlapMark *all_p = g_memdup2(p, n_a * sizeof *p);
  gsize n_all_p = n_a;
  n_a = drop_standing(p, n_a, q, n_b, peak_px);
  n_b = drop_standing(q, n_b, all_p, n_all_p, peak_px);
  AwPixelPoint c = aw_overlap_centre_shift(a, b);
  for (gsize i = 0; i < n_a; i++)
    for (gsize j = 0; j < n_b; j++) {
      double d[2] = { p[i].p.x_px - q[j].p.x_px - c.x_px + move[0], p[i].p.y_px - q[j].p.y_px - c.y_px + move[1] };
      if (are_alike(&p[i], &q[j]))
        g_array_append_vals(all, d, 1);
    }
}

/* Moves the shift to the mean of the differences around it. */
static void centre_on_crowd(const AwGrid *grid, const double *xy, double peak_px, AwOverlapShift *shift)
{
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  for (int round = 0; round < 3; round++) {
    double x = 0, y = 0;
    aw_grid_within(grid, shift->dx, shift->dy, peak_px, hits);
    if (hits->len == 0)
      return;
    for (guint k = 0; k < hits->len; k++) {
      gsize i = g_array_index(hits, AwGridHit, k).index;
      x += xy[2 * i] / hits->len;
      y += xy[2 * i + 1] / hits->len;
    }
    shift->n = hits->len;
    shift->dx = x;
    shift->dy = y;
  }
}

/* Finds the crowd among all differences; `places` is the number of places where chance could have made one. */
static void find_crowd(const GArray *all, double peak_px, double places, AwOverlapShift *shift)
{
  const double *xy = (const double *)(const void *)all->data;
  g_autoptr(AwGrid) grid = aw_grid_new(xy, all->len);
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  shift->n = 0;
  shift->evidence = -INFINITY;
  for (gsize i = 0; i < all->len; i++) {
    aw_grid_within(grid, xy[2 * i], xy[2 * i + 1], peak_px, hits);
    if (hits->len > shift->n) {
      shift->n = hits->len;
      shift->dx = xy[2 * i];
      shift->dy = xy[2 * i + 1];
    }
  }
  if (shift->n < MIN_VOTES)
    return;
  centre_on_crowd(grid, xy, peak_px, shift);
  /* Differences of two even fields crowd towards zero shift by up to four times their mean density. */
  double chance = 4 * (double)all->len / places, n = (double)shift->n;
  if (n > chance)
    shift->evidence = n * log(n / chance) - (n - chance) - log(places);
}

static int compare_length(gconstpointer a, gconstpointer b)
{
  const AwOverlapShift *p = a, *q = b;
  double d = hypot(p->sx, p->sy) - hypot(q->sx, q->sy);
  if (fabs(d) > 1e-9)
    return d < 0 ? -1 : 1;
  return p->a != q->a ? (p->a < q->a ? -1 : 1) : p->b < q->b ? -1 : p->b > q->b;
}

/* Taken along its longer axis, so that scans to and fro give the same moves. */
static AwOverlapShift between_frames(const AwOverlapFrame *frames, gsize f, gsize g)
{
  double x = frames[f].stage.x_um - frames[g].stage.x_um, y = frames[f].stage.y_um - frames[g].stage.y_um;
  if ((fabs(x) >= fabs(y) ? x : y) < 0)
    return (AwOverlapShift){ .a = g, .b = f, .sx = -x, .sy = -y };
  return (AwOverlapShift){ .a = f, .b = g, .sx = x, .sy = y };
}

/* Every pair of frames that stand among each other's nearest ones, shortest first. */
static GArray *neighbouring_pairs(const AwOverlapFrame *frames, gsize n_frames)
{
  GArray *pairs = g_array_new(FALSE, TRUE, sizeof(AwOverlapShift));
  g_autofree double *xy = g_new(double, 2 * n_frames + 1);
  for (gsize f = 0; f < n_frames; f++) {
    xy[2 * f] = frames[f].stage.x_um;
    xy[2 * f + 1] = frames[f].stage.y_um;
  }
  g_autoptr(AwGrid) grid = aw_grid_new(xy, n_frames);
  for (gsize f = 0; f < n_frames; f++) {
    AwGridHit hits[N_NEIGHBOURS + 1];
    gsize n = aw_grid_nearest(grid, xy[2 * f], xy[2 * f + 1], N_NEIGHBOURS + 1, hits);
    for (gsize k = 0; k < n; k++) {
      gsize g = hits[k].index;
      AwOverlapShift pair = between_frames(frames, f, g);
      if (g > f && hits[k].distance > 0)
        g_array_append_val(pairs, pair);
    }
  }
  g_array_sort(pairs, compare_length);
  return pairs;
}

int aw_overlap_sector(double sx, double sy)
{
  double turn = atan2(sy, sx) / G_PI + 2; /* half turns, the same for a move and its reverse */
  return (int)floor(fmod(turn, 1.0) * AW_OVERLAP_SECTORS + 0.5) % AW_OVERLAP_SECTORS;
}

static gboolean is_same_move(const AwOverlapShift *a, const AwOverlapShift *b)
{
  return hypot(a->sx - b->sx, a->sy - b->sy) <= SAME_MOVE * hypot(a->sx, a->sy);
}

static double places_of(const AwOverlapFrame *a, const AwOverlapFrame *b, double peak_px)
{
  double area = (double)(a->width_px + b->width_px) * (double)(a->height_px + b->height_px);
  return area / (G_PI * peak_px * peak_px);
}

static AwOverlapShift vote_alone(const AwOverlapFrame *frames, AwOverlapShift pair, double peak_px)
{
  static const double stay[2] = { 0, 0 };
  g_autoptr(GArray) all = g_array_new(FALSE, FALSE, 2 * sizeof(double));
  add_differences(&frames[pair.a], &frames[pair.b], peak_px, stay, all);
  find_crowd(all, peak_px, places_of(&frames[pair.a], &frames[pair.b], peak_px), &pair);
  return pair;
}

/* The joint shift of all pairs that move as pairs[first] does, as far as they are no longer than the limit together. */
static AwOverlapShift vote_jointly(const AwOverlapFrame *frames, const AwOverlapShift *pairs, gsize n, gsize first,
                                   AwMatrix inverse, double peak_px)
{
  AwOverlapShift shift = pairs[first];
  g_autoptr(GArray) all = g_array_new(FALSE, FALSE, 2 * sizeof(double));
  for (gsize k = first; k < n && all->len <= MAX_DIFFERENCES; k++) {
    if (!is_same_move(&shift, &pairs[k]))
      continue;
    double x = shift.sx - pairs[k].sx, y = shift.sy - pairs[k].sy;
    double move[2] = { inverse.xx * x + inverse.xy * y, inverse.yx * x + inverse.yy * y };
    add_differences(&frames[pairs[k].a], &frames[pairs[k].b], peak_px, move, all);
  }
  find_crowd(all, peak_px, places_of(&frames[shift.a], &frames[shift.b], peak_px), &shift);
  return shift;
}

/* All pairs that move as pairs[first] does: each alone, and where none of them is sure, together. */
static void vote(const AwOverlapFrame *frames, AwOverlapShift *pairs, gsize n, gsize first, AwMatrix inverse,
                 double peak_px, GArray *found)
{
  double best = 0;
  AwOverlapShift move = pairs[first];
  for (gsize k = first; k < n; k++) {
    if (pairs[k].n || !is_same_move(&move, &pairs[k]))
      continue;
    AwOverlapShift shift = vote_alone(frames, pairs[k], peak_px);
    pairs[k].n = 1;
    best = MAX(best, shift.evidence);
    if (shift.evidence > 0)
      g_array_append_val(found, shift);
  }
  if (best < STRONG_EVIDENCE) {
    AwOverlapShift shift = vote_jointly(frames, pairs, n, first, inverse, peak_px);
    if (shift.evidence > 0)
      g_array_append_val(found, shift);
  }
}

GArray *aw_overlap_shifts(const AwOverlapFrame *frames, gsize n_frames, AwMatrix start, double mark_px)
{
  GArray *found = g_array_new(FALSE, FALSE, sizeof(AwOverlapShift));
  g_autoptr(GArray) near = neighbouring_pairs(frames, n_frames);
  g_autoptr(GArray) pairs = g_array_new(FALSE, FALSE, sizeof(AwOverlapShift));
  AwMatrix inverse = aw_matrix_inverse(start);
  int used[AW_OVERLAP_SECTORS] = { 0 };
  for (guint k = 0; k < near->len; k++) {
    AwOverlapShift pair = g_array_index(near, AwOverlapShift, k);
    if (used[aw_overlap_sector(pair.sx, pair.sy)]++ < N_PER_SECTOR)
      g_array_append_val(pairs, pair);
  }
  AwOverlapShift *p = (AwOverlapShift *)(void *)pairs->data;
  for (guint k = 0; k < pairs->len; k++)
    if (!p[k].n)
      vote(frames, p, pairs->len, k, inverse, MAX(MIN_PEAK_PX, 0.12 * mark_px), found);
  return found;
}

/* The map that takes the picture shifts of two pairs of frames to their stage moves. */
static gboolean map_from_two(const AwOverlapShift *a, const AwOverlapShift *b, AwMatrix *map)
{
  AwMatrix d = { a->dx, b->dx, a->dy, b->dy }, s = { a->sx, b->sx, a->sy, b->sy };
  if (fabs(aw_matrix_det(d)) < 0.3 * hypot(a->dx, a->dy) * hypot(b->dx, b->dy))
    return FALSE;
  *map = aw_matrix_multiply(s, aw_matrix_inverse(d));
  /* Pixels are square and their rows and columns at right angles, so A must be near a turned or mirrored scale. */
  double x = hypot(map->xx, map->yx), y = hypot(map->xy, map->yy), det = fabs(aw_matrix_det(*map));
  return x > 0 && y > 0 && x < 1.2 * y && y < 1.2 * x && det > 0.95 * x * y;
}

gboolean aw_overlap_consensus(const AwOverlapShift *shifts, gsize n, double tolerance_px, AwMatrix *a)
{
  double best = 2 * STRONG_EVIDENCE;
  gboolean found = FALSE;
  for (gsize i = 0; i < n; i++)
    for (gsize j = i + 1; j < n; j++) {
      AwMatrix m;
      if (!map_from_two(&shifts[i], &shifts[j], &m))
        continue;
      double total = 0, limit = tolerance_px * sqrt(fabs(aw_matrix_det(m)));
      for (gsize k = 0; k < n; k++) {
        double x = m.xx * shifts[k].dx + m.xy * shifts[k].dy - shifts[k].sx;
        double y = m.yx * shifts[k].dx + m.yy * shifts[k].dy - shifts[k].sy;
        /* A third pair that agrees could do so by chance in few places only: that is evidence of its own. */
        if (hypot(x, y) <= limit)
          total += shifts[k].evidence + (k != i && k != j ? STRONG_EVIDENCE : 0);
      }
      if (total > best) {
        best = total;
        *a = m;
        found = TRUE;
      }
    }
  return found;
}

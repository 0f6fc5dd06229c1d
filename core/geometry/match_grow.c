/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include "geometry/match_parts.h"

/*
 * A map that passed at its seed is grown over the probe. Each round takes twice as many points about the seed; turn and
 * scale are searched in steps that move the farthest point by one tolerance, within what the points so far leave open
 * (this is what carries a map over the gap between two distant fields), then fitted to the pairs by least squares
 * (iterated closest points, Besl & McKay 1992, IEEE Trans. Pattern Anal. Mach. Intell. 14:239, in two dimensions).
 *
 * Evidence: were the patterns unrelated, each of n points would lie within r of some field point with probability at
 * most p = density pi r^2, and the chance of k or more hits is at most exp (-n KL (k/n, p)) (Hoeffding 1963, J. Am.
 * Stat. Assoc. 58:13; unequal p are covered by their mean, Hoeffding 1956). The radius is chosen out of N_RADII, paid
 * for by that factor; two points are spent on the map (Moisan & Stival 2004, Int. J. Comput. Vision 57:201).
 */
#define N_RADII 10
#define RADIUS_STEP 0.7
#define LARGEST_RADIUS 1.5 /* tolerances */
#define MAX_SAMPLE 400
#define MAX_STEPS 40
#define N_FITS 3
#define N_STALE 3        /* rounds without more evidence before growing ends */
#define MIN_EVIDENCE 5.0 /* about the seed, to grow at all */
#define N_SPENT 2

/* A sample of the probe under a map: the nearest field point of each. */
typedef struct {
  gsize n;
  AwSpot p[MAX_SAMPLE], q[MAX_SAMPLE]; /* of the probe; of the field */
  double distance[MAX_SAMPLE];
  double density_sum; /* of the field where the points fall */
} Sample;

static void look_up(const AwField *field, const AwSpotMap *map, Sample *sample)
{
  sample->density_sum = 0;
  for (gsize k = 0; k < sample->n; k++) {
    AwSpot at = aw_spot_map_apply(map, sample->p[k]);
    AwGridHit hit;
    aw_grid_nearest(field->grid, at.x, at.y, 1, &hit);
    sample->q[k] = field->spots[hit.index];
    sample->distance[k] = hit.distance;
    /* Off the field nothing can be hit: such points neither help nor harm. */
    if (hit.distance * hit.distance * field->density[hit.index] < 2.25)
      sample->density_sum += field->density[hit.index];
  }
}

static double relative_entropy(double f, double p)
{
  return (f > 0 ? f * log(f / p) : 0) + (f < 1 ? (1 - f) * log((1 - f) / (1 - p)) : 0);
}

static double evidence_of(const AwField *field, const Sample *sample, double *radius_um)
{
  double best = 0, r = LARGEST_RADIUS * field->tolerance_um;
  *radius_um = r;
  for (int j = 0; j < N_RADII && sample->n > N_SPENT; j++, r *= RADIUS_STEP) {
    gsize k = 0;
    for (gsize i = 0; i < sample->n; i++)
      k += sample->distance[i] <= r;
    double n = (double)(sample->n - N_SPENT), p = sample->density_sum / (double)sample->n * G_PI * r * r;
    double f = ((double)k - N_SPENT) / n;
    if (!(p < 1 && p > 0) || f <= p)
      continue;
    double evidence = n * relative_entropy(f, p) / G_LN10 - log10(N_RADII);
    if (evidence > best) {
      best = evidence;
      *radius_um = r;
    }
  }
  return best;
}

/* Least squares for the pairs within r; *spread gets their rms distance from their centroid. FALSE: too few pairs. */
static gboolean fit(const Sample *sample, double r, AwSpotMap *map, double *spread_um)
{
  double n = 0, px = 0, py = 0, qx = 0, qy = 0, flip = map->mirrored ? -1 : 1;
  for (gsize k = 0; k < sample->n; k++)
    if (sample->distance[k] <= r) {
      n++;
      px += sample->p[k].x;
      py += flip * sample->p[k].y;
      qx += sample->q[k].x;
      qy += sample->q[k].y;
    }
  if (n < 3)
    return FALSE;
  double pp = 0, dot = 0, cross = 0;
  for (gsize k = 0; k < sample->n; k++)
    if (sample->distance[k] <= r) {
      double ux = sample->p[k].x - px / n, uy = flip * sample->p[k].y - py / n;
      double vx = sample->q[k].x - qx / n, vy = sample->q[k].y - qy / n;
      pp += ux * ux + uy * uy;
      dot += ux * vx + uy * vy;
      cross += ux * vy - uy * vx;
    }
  if (!(pp > 0))
    return FALSE;
  map->c = dot / pp;
  map->s = cross / pp;
  map->tx = (qx - map->c * px + map->s * py) / n;
  map->ty = (qy - map->s * px - map->c * py) / n;
  *spread_um = sqrt(pp / n);
  return TRUE;
}

/* `map` turned by `turn` (small) and scaled by 1 + grow about the probe's point `centre`. */
static AwSpotMap turned(const AwSpotMap *map, AwSpot centre, double turn, double grow)
{
  AwSpotMap m = *map;
  AwSpot at = aw_spot_map_apply(map, centre);
  m.c = (map->c * cos(turn) - map->s * sin(turn)) * (1 + grow);
  m.s = (map->s * cos(turn) + map->c * sin(turn)) * (1 + grow);
  AwSpot now = aw_spot_map_apply(&m, centre);
  m.tx += at.x - now.x;
  m.ty += at.y - now.y;
  return m;
}

static gsize count_hits(const AwField *field, const Sample *sample, const AwSpotMap *map)
{
  gsize k = 0;
  for (gsize i = 0; i < sample->n; i++) {
    AwSpot at = aw_spot_map_apply(map, sample->p[i]);
    k += aw_field_has(field, at.x, at.y);
  }
  return k;
}

typedef struct {
  const AwProbe *probe;
  const AwField *field;
  double radius_um; /* of hits in the last round */
  double spread_um; /* of the pairs so far */
} Growth;

/* The best turn and scale about `centre` that the pairs so far leave open; the smallest change among equals. */
static void search_turn(const Growth *growth, const Sample *sample, AwSpot centre, double reach_um, AwSpotMap *map)
{
  double step = growth->field->tolerance_um / reach_um, open = 2 * growth->radius_um / growth->spread_um;
  int n_turn = (int)MIN(ceil(open / step), MAX_STEPS);
  double scale = hypot(map->c, map->s);
  double low = MAX(growth->probe->scale_min / scale - 1, -open), high = MIN(growth->probe->scale_max / scale - 1, open);
  AwSpotMap best = *map;
  gsize best_hits = count_hits(growth->field, sample, map);
  int best_change = 0;
  for (int i = (int)ceil(low / step); i <= (int)floor(high / step); i++)
    for (int j = -n_turn; j <= n_turn; j++) {
      AwSpotMap m = turned(map, centre, j * step, i * step);
      gsize hits = count_hits(growth->field, sample, &m);
      int change = i * i + j * j;
      if (hits > best_hits || (hits == best_hits && change < best_change)) {
        best = m;
        best_hits = hits;
        best_change = change;
      }
    }
  *map = best;
}

static AwSpot centroid_of_hits(const Sample *sample, double r, AwSpot fallback)
{
  double n = 0, x = 0, y = 0;
  for (gsize k = 0; k < sample->n; k++)
    if (sample->distance[k] <= r) {
      n++;
      x += sample->p[k].x;
      y += sample->p[k].y;
    }
  return n > 0 ? (AwSpot){ x / n, y / n } : fallback;
}

static gboolean scale_is_allowed(const AwProbe *probe, const AwSpotMap *map, double slack)
{
  double scale = hypot(map->c, map->s);
  return scale >= probe->scale_min * (1 - slack) && scale <= probe->scale_max * (1 + slack);
}

/* Fits the sample and weighs it; keeps in `candidate` whatever has more evidence. FALSE: no map is left. */
static gboolean settle(Growth *growth, Sample *sample, AwSpotMap *map, AwCandidate *candidate)
{
  double r = LARGEST_RADIUS * growth->field->tolerance_um, spread;
  look_up(growth->field, map, sample);
  for (int k = 0; k < N_FITS; k++) {
    if (!fit(sample, r, map, &spread))
      return FALSE;
    look_up(growth->field, map, sample);
    r = MAX(r * RADIUS_STEP, growth->field->tolerance_um * 0.5);
  }
  growth->spread_um = spread;
  double evidence = evidence_of(growth->field, sample, &growth->radius_um);
  /* A fit to few points may leave the range by its own error. */
  if (evidence > candidate->evidence && scale_is_allowed(growth->probe, map, growth->radius_um / spread)) {
    candidate->map = *map;
    candidate->evidence = evidence;
    candidate->radius_um = growth->radius_um;
  }
  return TRUE;
}

typedef struct {
  double d2;
  guint32 index;
} Far;

static int compare_far(gconstpointer a, gconstpointer b)
{
  const Far *p = a, *q = b;
  if (p->d2 < q->d2 || p->d2 > q->d2)
    return p->d2 < q->d2 ? -1 : 1;
  return p->index < q->index ? -1 : p->index > q->index;
}

static Far *order_from(const AwProbe *probe, AwSpot centre)
{
  Far *far = g_new(Far, probe->n);
  for (gsize i = 0; i < probe->n; i++) {
    double dx = probe->spots[i].x - centre.x, dy = probe->spots[i].y - centre.y;
    far[i] = (Far){ dx * dx + dy * dy, (guint32)i };
  }
  qsort(far, probe->n, sizeof *far, compare_far);
  return far;
}

static void take_sample(const AwProbe *probe, const Far *far, gsize n, Sample *sample)
{
  sample->n = MIN(n, MAX_SAMPLE);
  for (gsize k = 0; k < sample->n; k++)
    sample->p[k] = probe->spots[far[k * n / sample->n].index];
}

gboolean aw_match_grow(const AwProbe *probe, const AwField *field, const guint32 *about, gsize n_about,
                       AwCandidate *candidate)
{
  g_autofree Sample *sample = g_new(Sample, 1);
  Growth growth = { probe, field, field->tolerance_um, 0 };
  AwSpotMap map = candidate->map;
  candidate->evidence = 0;
  sample->n = n_about;
  for (gsize k = 0; k < n_about; k++)
    sample->p[k] = probe->spots[about[k]];
  if (!settle(&growth, sample, &map, candidate) || candidate->evidence < MIN_EVIDENCE)
    return FALSE;
  g_autofree Far *far = order_from(probe, candidate->centre);
  int n_stale = 0;
  for (gsize n = MIN(2 * n_about, probe->n); n_stale < N_STALE; n = MIN(2 * n, probe->n)) {
    double before = candidate->evidence;
    AwSpot centre = centroid_of_hits(sample, growth.radius_um, candidate->centre);
    take_sample(probe, far, n, sample);
    search_turn(&growth, sample, centre, sqrt(far[n - 1].d2), &map);
    if (!settle(&growth, sample, &map, candidate))
      break;
    n_stale = candidate->evidence > before ? 0 : n_stale + 1;
    if (n == probe->n)
      break;
  }
  return TRUE;
}

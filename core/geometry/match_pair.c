/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include "geometry/match_parts.h"

/*
 * Pairing. Under a map, point i of a has its partner at j with odds
 *   psi = share of a kept * N (residual; movement) / (density of new points at j * share of a lost),
 * and a point has one partner at most. The probabilities of the pairs follow by belief propagation for data association
 * (Williams & Lau 2014, IEEE Trans. Aerosp. Electron. Syst. 50:2942, which also shows that it converges). Movement,
 * shares and map are fitted in turn from them (expectation-maximisation; Dempster, Laird & Rubin 1977, J. R. Stat. Soc.
 * B 39:1). Pairs are those in which each is the other's most probable partner.
 */
#define N_ROUNDS 25
#define N_BELIEF 40
#define BELIEF_CHANGE 1e-7
#define GATE_MOVEMENTS 4.5
#define PAIR_PROBABILITY 0.3
#define PAIR_ODDS 2.3
#define SETTLED 1e-4
#define MIN_PAIRS 4
#define N_AROUND 8
#define NEAR_SPACINGS2 2.25 /* (1.5 local spacings)^2: farther from any point was not imaged */
#define MIN_MOVEMENT_UM 1e-3
#define NONE G_MAXUINT32

/* A pair that may be. */
typedef struct {
  guint32 a, b;
  double d2, psi, mu, nu, p;
} Edge;

typedef struct {
  const AwMatchPattern *a, *b;
  AwFitKind kind;
  AwGrid *grid;      /* of b */
  double *density_b; /* per um2 */
  double spacing_um; /* of b, typical */
  guint8 *shared_a, *shared_b;
  gsize n_shared_a, n_shared_b;
  AwSpot *mapped;           /* a under the map */
  GArray *edges;            /* Edge, by a */
  double *sum_a, *sum_b;    /* of beliefs; then the probability of any partner */
  guint32 *best_a, *best_b; /* edge of the most probable partner */
  AwMatrix m;
  double tx, ty;
  gboolean mirrored;
  double movement_um, movement_se_um, kept_frac, new_frac;
} Pairing;

static void map_a(Pairing *w)
{
  for (gsize i = 0; i < w->a->n; i++) {
    double x = w->a->xy_um[2 * i], y = w->a->xy_um[2 * i + 1];
    w->mapped[i] = (AwSpot){ w->m.xx * x + w->m.xy * y + w->tx, w->m.yx * x + w->m.yy * y + w->ty };
  }
}

static int compare_angles(gconstpointer a, gconstpointer b)
{
  double p = *(const double *)a, q = *(const double *)b;
  return (p > q) - (p < q);
}

/* TRUE when the other pattern's points lie all around p and near it: p was imaged there. Its edge counts as outside. */
static gboolean is_shared(const AwGrid *other, const AwSpot *spots, const double *density, AwSpot p)
{
  AwGridHit hits[N_AROUND];
  double angle[N_AROUND];
  gsize n = aw_grid_nearest(other, p.x, p.y, N_AROUND, hits);
  if (hits[0].distance * hits[0].distance * density[hits[0].index] > NEAR_SPACINGS2)
    return FALSE;
  for (gsize k = 0; k < n; k++)
    angle[k] = atan2(spots[hits[k].index].y - p.y, spots[hits[k].index].x - p.x);
  qsort(angle, n, sizeof *angle, compare_angles);
  double gap = angle[0] + 2 * G_PI - angle[n - 1];
  for (gsize k = 1; k < n; k++)
    gap = MAX(gap, angle[k] - angle[k - 1]);
  return gap < G_PI;
}

static void find_shared(Pairing *w)
{
  const AwSpot *spots_b = (const AwSpot *)(const void *)w->b->xy_um;
  g_autoptr(AwGrid) grid_a = aw_grid_new((const double *)(const void *)w->mapped, w->a->n);
  g_autofree double *density_a = aw_spot_density(grid_a, w->mapped, w->a->n);
  w->n_shared_a = w->n_shared_b = 0;
  for (gsize i = 0; i < w->a->n; i++)
    w->n_shared_a += w->shared_a[i] = is_shared(w->grid, spots_b, w->density_b, w->mapped[i]) ? 1 : 0;
  for (gsize j = 0; j < w->b->n; j++)
    w->n_shared_b += w->shared_b[j] = is_shared(grid_a, w->mapped, density_a, spots_b[j]) ? 1 : 0;
}

static void list_edges(Pairing *w)
{
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  double sigma2 = w->movement_um * w->movement_um, odds = w->kept_frac / (1 - w->kept_frac);
  double gate = MIN(GATE_MOVEMENTS * w->movement_um, w->spacing_um);
  g_array_set_size(w->edges, 0);
  for (gsize i = 0; i < w->a->n; i++) {
    aw_grid_within(w->grid, w->mapped[i].x, w->mapped[i].y, gate, hits);
    for (guint k = 0; k < hits->len; k++) {
      const AwGridHit *hit = &g_array_index(hits, AwGridHit, k);
      double d2 = hit->distance * hit->distance, density = w->new_frac * w->density_b[hit->index];
      double psi = odds * exp(-d2 / (2 * sigma2)) / (2 * G_PI * sigma2) / density;
      Edge edge = { (guint32)i, (guint32)hit->index, d2, psi, 0, 1, 0 };
      g_array_append_val(w->edges, edge);
    }
  }
}

static void sum_by_a(Pairing *w)
{
  for (gsize i = 0; i < w->a->n; i++)
    w->sum_a[i] = 0;
  for (guint k = 0; k < w->edges->len; k++) {
    const Edge *e = &g_array_index(w->edges, Edge, k);
    w->sum_a[e->a] += e->psi * e->nu;
  }
}

/* One exchange of beliefs; returns the largest change of one of them. */
static double exchange(Pairing *w)
{
  double change = 0;
  sum_by_a(w);
  for (gsize j = 0; j < w->b->n; j++)
    w->sum_b[j] = 0;
  for (guint k = 0; k < w->edges->len; k++) {
    Edge *e = &g_array_index(w->edges, Edge, k);
    e->mu = e->psi / (1 + MAX(w->sum_a[e->a] - e->psi * e->nu, 0));
    w->sum_b[e->b] += e->mu;
  }
  for (guint k = 0; k < w->edges->len; k++) {
    Edge *e = &g_array_index(w->edges, Edge, k);
    double nu = 1 / (1 + MAX(w->sum_b[e->b] - e->mu, 0));
    change = MAX(change, fabs(nu - e->nu));
    e->nu = nu;
  }
  return change;
}

/* The probabilities of all edges, and for each point the sum of its own and its most probable edge. */
static void weigh_edges(Pairing *w)
{
  for (int k = 0; k < N_BELIEF && exchange(w) > BELIEF_CHANGE; k++)
    ;
  sum_by_a(w);
  for (guint k = 0; k < w->edges->len; k++) {
    Edge *e = &g_array_index(w->edges, Edge, k);
    e->p = e->psi * e->nu / (1 + w->sum_a[e->a]);
  }
  for (gsize i = 0; i < w->a->n; i++) {
    w->sum_a[i] = 0;
    w->best_a[i] = NONE;
  }
  for (gsize j = 0; j < w->b->n; j++) {
    w->sum_b[j] = 0;
    w->best_b[j] = NONE;
  }
  for (guint k = 0; k < w->edges->len; k++) {
    const Edge *e = &g_array_index(w->edges, Edge, k);
    w->sum_a[e->a] += e->p;
    w->sum_b[e->b] += e->p;
    if (w->best_a[e->a] == NONE || e->p > g_array_index(w->edges, Edge, w->best_a[e->a]).p)
      w->best_a[e->a] = k;
    if (w->best_b[e->b] == NONE || e->p > g_array_index(w->edges, Edge, w->best_b[e->b]).p)
      w->best_b[e->b] = k;
  }
}

/* Between two daughters of one mother a pair is uncertain, yet surer than none: odds against none decide. */
static gboolean is_pair(const Pairing *w, guint k)
{
  const Edge *e = &g_array_index(w->edges, Edge, k);
  double none = MAX(1 - MIN(w->sum_a[e->a], w->sum_b[e->b]), 0);
  return e->p >= PAIR_PROBABILITY && e->p >= PAIR_ODDS * none && w->best_a[e->a] == k && w->best_b[e->b] == k;
}

static void fit_movement(Pairing *w)
{
  double n = 0, ss = 0, unknown = 0;
  for (guint k = 0; k < w->edges->len; k++) {
    const Edge *e = &g_array_index(w->edges, Edge, k);
    n += e->p;
    ss += e->p * e->d2;
  }
  double free = 2 * n - aw_fit_kind_n_parameters(w->kind);
  if (n < MIN_PAIRS || free < 1)
    return;
  double variance = MAX(ss / free, MIN_MOVEMENT_UM * MIN_MOVEMENT_UM);
  /* Not knowing which pairs are true takes information away (Louis 1982, J. R. Stat. Soc. B 44:226). */
  for (guint k = 0; k < w->edges->len; k++) {
    const Edge *e = &g_array_index(w->edges, Edge, k);
    double score = e->d2 / variance - 2;
    unknown += e->p * MAX(1 - e->p, 0) * score * score;
  }
  w->movement_um = sqrt(variance);
  w->movement_se_um = w->movement_um / sqrt(MAX(2 * free - unknown, 1));
}

/* What part of a's nuclei are kept and of b's are new, where both were imaged. */
static void fit_shares(Pairing *w)
{
  double kept = 0, old = 0;
  for (gsize i = 0; i < w->a->n; i++)
    kept += w->shared_a[i] ? w->sum_a[i] : 0;
  for (gsize j = 0; j < w->b->n; j++)
    old += w->shared_b[j] ? w->sum_b[j] : 0;
  w->kept_frac = CLAMP(kept / (double)MAX(w->n_shared_a, 1), 0.05, 0.99);
  w->new_frac = CLAMP(1 - old / (double)MAX(w->n_shared_b, 1), 0.01, 0.95);
}

static gboolean fit_map(Pairing *w)
{
  g_autoptr(GArray) pairs = g_array_new(FALSE, FALSE, sizeof(AwMarkPair));
  for (guint k = 0; k < w->edges->len; k++)
    if (is_pair(w, k)) {
      const Edge *e = &g_array_index(w->edges, Edge, k);
      const double *p = &w->a->xy_um[2 * (gsize)e->a], *q = &w->b->xy_um[2 * (gsize)e->b];
      AwMarkPair pair = { { p[0], p[1] }, { q[0], q[1] } };
      g_array_append_val(pairs, pair);
    }
  AwRegistration fitted;
  if (pairs->len < MIN_PAIRS || !aw_registration_fit((const AwMarkPair *)(const void *)pairs->data, pairs->len, w->kind,
                                                     w->mirrored, w->movement_um, &fitted, NULL))
    return FALSE;
  w->m = fitted.m;
  w->tx = fitted.tx_um;
  w->ty = fitted.ty_um;
  return TRUE;
}

static gboolean iterate(Pairing *w, AwProgress *progress, GError **error)
{
  for (int round = 0; round < N_ROUNDS; round++) {
    if (aw_progress_stopped(progress, error))
      return FALSE;
    double before = w->movement_um;
    map_a(w);
    list_edges(w);
    weigh_edges(w);
    if (!fit_map(w))
      break;
    fit_movement(w);
    fit_shares(w);
    if (fabs(w->movement_um - before) < SETTLED * before)
      break;
  }
  map_a(w);
  find_shared(w);
  list_edges(w);
  weigh_edges(w);
  return TRUE;
}

static void report(const Pairing *w, AwMatch *match)
{
  for (gsize i = 0; i < w->a->n; i++)
    match->of_a[i] = (AwMatchPoint){ -1, CLAMP(1 - w->sum_a[i], 0, 1) };
  for (gsize j = 0; j < w->b->n; j++)
    match->of_b[j] = (AwMatchPoint){ -1, CLAMP(1 - w->sum_b[j], 0, 1) };
  match->n_matched = 0;
  for (guint k = 0; k < w->edges->len; k++)
    if (is_pair(w, k)) {
      const Edge *e = &g_array_index(w->edges, Edge, k);
      match->of_a[e->a] = (AwMatchPoint){ (gssize)e->b, MIN(e->p, 1) };
      match->of_b[e->b] = (AwMatchPoint){ (gssize)e->a, MIN(e->p, 1) };
      match->n_matched++;
    }
  match->m = w->m;
  match->shift_x_um = w->tx;
  match->shift_y_um = w->ty;
  match->n_shared_a = w->n_shared_a;
  match->n_shared_b = w->n_shared_b;
  match->movement_um = match->n_matched >= MIN_PAIRS ? w->movement_um : NAN;
  match->movement_se_um = match->n_matched >= MIN_PAIRS ? w->movement_se_um : NAN;
}

static void pairing_init(Pairing *w)
{
  gsize n_a = w->a->n, n_b = w->b->n;
  w->grid = aw_grid_new(w->b->xy_um, n_b);
  w->density_b = aw_spot_density(w->grid, (const AwSpot *)(const void *)w->b->xy_um, n_b);
  w->shared_a = g_new0(guint8, n_a);
  w->shared_b = g_new0(guint8, n_b);
  w->mapped = g_new0(AwSpot, n_a);
  w->edges = g_array_new(FALSE, FALSE, sizeof(Edge));
  w->sum_a = g_new0(double, n_a);
  w->sum_b = g_new0(double, n_b);
  w->best_a = g_new0(guint32, n_a);
  w->best_b = g_new0(guint32, n_b);
  w->kept_frac = 0.6;
  w->new_frac = 0.4;
}

static void pairing_clear(Pairing *w)
{
  aw_grid_free(w->grid);
  g_free(w->density_b);
  g_free(w->shared_a);
  g_free(w->shared_b);
  g_free(w->mapped);
  g_array_unref(w->edges);
  g_free(w->sum_a);
  g_free(w->sum_b);
  g_free(w->best_a);
  g_free(w->best_b);
}

gboolean aw_match_pair(const AwMatchPattern *a, const AwMatchPattern *b, const AwMatchSettings *settings,
                       AwMatchStart start, AwMatch *match, GError **error)
{
  Pairing w = { .a = a,
                .b = b,
                .kind = settings->kind,
                .spacing_um = start.spacing_um,
                .movement_um = MAX(start.movement_um, MIN_MOVEMENT_UM),
                .m = match->m,
                .tx = match->shift_x_um,
                .ty = match->shift_y_um,
                .mirrored = match->mirrored };
  pairing_init(&w);
  map_a(&w);
  find_shared(&w);
  gboolean ok = iterate(&w, settings->progress, error);
  if (ok)
    report(&w, match);
  pairing_clear(&w);
  return ok;
}

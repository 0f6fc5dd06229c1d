/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/text.h"
#include "geometry/match_parts.h"

/*
 * Seeds are tried one after the other (match_seed.c) and what passes is grown (match_grow.c), until a map is found that
 * the seeds' number of trials cannot explain by chance and that no other map comes near; then points are paired
 * (match_pair.c). The pattern with fewer points is the probe that is looked for in the other, the field.
 *
 * The number of tests is that of all pairs of the field for all pairs of the probe up to the longest base, with and
 * without mirror, times the rounds of growing: the expected number of maps as good among unrelated patterns is that
 * number times the chance of one (Desolneux, Moisan & Morel 2000, Int. J. Comput. Vision 40:7).
 */
#define SURE_LOG10 (-4.0)
#define RIVAL_SHARE 0.5    /* of the best map's evidence: as much makes it a rival */
#define OTHER_TOLERANCES 3 /* maps that part by more are different ones */
#define MAX_SEEDS 160
#define MIN_SEEDS 40
#define TRIAL_BUDGET 2e7 /* maps to try before giving up */
#define LOG10_ROUNDS 1.0

void aw_match_settings_init(AwMatchSettings *settings)
{
  *settings =
      (AwMatchSettings){ .scale_min = 0.97, .scale_max = 1.03, .allow_mirror = TRUE, .kind = AW_FIT_SIMILARITY };
}

void aw_match_clear(AwMatch *match)
{
  g_free(match->note);
  g_free(match->of_a);
  g_free(match->of_b);
  *match = (AwMatch){ 0 };
}

/* --- what is refused --- */

static gboolean refuse(GError **error, const AwMatchPattern *pattern, const char *why)
{
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "The points of %s cannot be matched: %s.", pattern->name, why);
  return FALSE;
}

/* The smaller axis of the points' scatter over the larger; 0 when all lie on one spot or line. */
static double flatness(const AwMatchPattern *pattern, AwSpot centre)
{
  double xx = 0, xy = 0, yy = 0;
  for (gsize i = 0; i < pattern->n; i++) {
    double x = pattern->xy_um[2 * i] - centre.x, y = pattern->xy_um[2 * i + 1] - centre.y;
    xx += x * x;
    xy += x * y;
    yy += y * y;
  }
  double mean = (xx + yy) / 2, root = hypot((xx - yy) / 2, xy);
  return mean > 0 ? MAX(mean - root, 0) / (mean + root) : 0;
}

static AwSpot centroid_of(const AwMatchPattern *pattern)
{
  AwSpot sum = { 0, 0 };
  for (gsize i = 0; i < pattern->n; i++) {
    sum.x += pattern->xy_um[2 * i];
    sum.y += pattern->xy_um[2 * i + 1];
  }
  return (AwSpot){ sum.x / (double)pattern->n, sum.y / (double)pattern->n };
}

static gboolean check_pattern(const AwMatchPattern *pattern, GError **error)
{
  if (pattern->n < AW_MATCH_MIN_POINTS || pattern->n > AW_MATCH_MAX_POINTS) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "Matching the points of %s: %" G_GSIZE_FORMAT " points; at least %d and at most %d are needed.",
                pattern->name, pattern->n, AW_MATCH_MIN_POINTS, AW_MATCH_MAX_POINTS);
    return FALSE;
  }
  for (gsize i = 0; i < pattern->n; i++)
    if (!(fabs(pattern->xy_um[2 * i]) < 1e9 && fabs(pattern->xy_um[2 * i + 1]) < 1e9)) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                  "Point %" G_GSIZE_FORMAT " of %s has a coordinate that is not a number within 1 km.", i + 1,
                  pattern->name);
      return FALSE;
    }
  if (!(flatness(pattern, centroid_of(pattern)) > 1e-6))
    return refuse(error, pattern, "they lie on one spot or on one line");
  return TRUE;
}

static gboolean check_settings(const AwMatchSettings *s, GError **error)
{
  if (s->scale_min >= 0.5 && s->scale_min <= 1 && s->scale_max >= 1 && s->scale_max <= 2 && s->movement_um >= 0 &&
      s->movement_um < 1e4)
    return TRUE;
  g_autofree char *low = aw_text_from_double(s->scale_min, 3), *high = aw_text_from_double(s->scale_max, 3);
  g_autofree char *movement = aw_text_from_double(s->movement_um, 1);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "Matching with a scale from %s to %s and a movement of %s um: the scale must run from 0.5 ... 1 to "
              "1 ... 2, the movement from 0 to 10000 um.",
              low, high, movement);
  return FALSE;
}

/* --- the search --- */

typedef struct {
  AwProbe probe;
  AwField *field;
  GArray *candidates; /* AwCandidate */
  gssize best;        /* -1: none */
  double log10_tests;
} Search;

static void search_clear(Search *search)
{
  g_free(search->probe.spots);
  g_clear_pointer(&search->probe.grid, aw_grid_free);
  g_clear_pointer(&search->field, aw_field_free);
  g_array_unref(search->candidates);
}

static void take_map(const AwSpotMap *map, AwSpot centre, const guint32 *about, gsize n_about, gpointer data)
{
  Search *search = data;
  AwCandidate candidate = { *map, centre, 0, 0 };
  if (!aw_match_grow(&search->probe, search->field, about, n_about, &candidate))
    return;
  g_array_append_val(search->candidates, candidate);
  if (search->best < 0 || candidate.evidence > g_array_index(search->candidates, AwCandidate, search->best).evidence)
    search->best = (gssize)search->candidates->len - 1;
}

/* TRUE when `weak`, where its own points are, lays them elsewhere than `strong` does. */
static gboolean is_other(const AwField *field, const AwCandidate *weak, const AwCandidate *strong)
{
  double step = 4 * field->spacing_um, worst = 0;
  const AwSpot at[3] = { weak->centre,
                         { weak->centre.x + step, weak->centre.y },
                         { weak->centre.x, weak->centre.y + step } };
  for (int k = 0; k < 3; k++) {
    AwSpot p = aw_spot_map_apply(&weak->map, at[k]), q = aw_spot_map_apply(&strong->map, at[k]);
    worst = MAX(worst, hypot(p.x - q.x, p.y - q.y));
  }
  return worst > OTHER_TOLERANCES * field->tolerance_um;
}

static double rival_evidence(const Search *search)
{
  double most = 0;
  const AwCandidate *best = &g_array_index(search->candidates, AwCandidate, search->best);
  for (guint k = 0; k < search->candidates->len; k++) {
    const AwCandidate *other = &g_array_index(search->candidates, AwCandidate, k);
    if (other->evidence > most && is_other(search->field, other, best))
      most = other->evidence;
  }
  return most;
}

static gboolean beats_chance(const Search *search)
{
  return search->best >= 0 &&
         search->log10_tests - g_array_index(search->candidates, AwCandidate, search->best).evidence < SURE_LOG10;
}

static guint number_of_seeds(const Search *search)
{
  double per_seed = (double)search->field->near_first[search->field->n] / 4 + 1;
  return (guint)CLAMP(TRIAL_BUDGET / per_seed, MIN_SEEDS, MAX_SEEDS);
}

static gboolean run_seeds(Search *search, AwProgress *progress, GError **error)
{
  guint n_seeds = number_of_seeds(search);
  for (guint seed = 0; seed < n_seeds && !beats_chance(search); seed++) {
    if (aw_progress_stopped(progress, error))
      return FALSE;
    aw_progress_report(progress, "Matching", (double)seed / n_seeds);
    aw_seed_try(&search->probe, search->field, seed, take_map, search);
  }
  return TRUE;
}

static double count_probe_pairs(const Search *search)
{
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  double n = 0;
  for (gsize i = 0; i < search->probe.n; i++) {
    aw_grid_within(search->probe.grid, search->probe.spots[i].x, search->probe.spots[i].y, search->field->reach_um,
                   hits);
    n += hits->len - 1;
  }
  return MAX(n / 2, 1);
}

static gboolean search_init(Search *search, const AwMatchPattern *probe, const AwMatchPattern *field,
                            const AwMatchSettings *settings, GError **error)
{
  AwSpot centre = centroid_of(probe);
  search->best = -1;
  search->candidates = g_array_new(FALSE, FALSE, sizeof(AwCandidate));
  search->probe.n = probe->n;
  search->probe.spots = g_new(AwSpot, probe->n);
  for (gsize i = 0; i < probe->n; i++)
    search->probe.spots[i] = (AwSpot){ probe->xy_um[2 * i] - centre.x, probe->xy_um[2 * i + 1] - centre.y };
  search->probe.grid = aw_grid_new((const double *)(const void *)search->probe.spots, probe->n);
  search->field = aw_field_new(field, centroid_of(field), settings->movement_um, error);
  if (!search->field)
    return FALSE;
  double field_pairs = MAX((double)search->field->near_first[field->n], 1);
  search->log10_tests =
      log10(count_probe_pairs(search)) + log10(field_pairs) + LOG10_ROUNDS + (settings->allow_mirror ? log10(2) : 0);
  return TRUE;
}

/* --- the result --- */

/* The candidate's map, from probe to field about their centroids, as the map from a to b. */
static void set_map(AwMatch *match, const AwSpotMap *map, AwSpot probe, AwSpot field, gboolean probe_is_a)
{
  double flip = map->mirrored ? -1 : 1;
  AwMatrix m = { map->c, -map->s * flip, map->s, map->c * flip };
  double tx = map->tx + field.x - m.xx * probe.x - m.xy * probe.y;
  double ty = map->ty + field.y - m.yx * probe.x - m.yy * probe.y;
  if (!probe_is_a) {
    m = aw_matrix_inverse(m);
    double x = -(m.xx * tx + m.xy * ty), y = -(m.yx * tx + m.yy * ty);
    tx = x;
    ty = y;
  }
  match->m = m;
  match->shift_x_um = tx;
  match->shift_y_um = ty;
  match->mirrored = map->mirrored;
}

static void judge(const Search *search, AwMatch *match)
{
  double evidence = g_array_index(search->candidates, AwCandidate, search->best).evidence;
  double rival = rival_evidence(search);
  match->log10_chance = search->log10_tests - evidence;
  match->rival_log10 = rival > 0 ? search->log10_tests - rival : 0;
  g_autofree char *chance = aw_text_from_double(match->log10_chance, 0);
  if (!beats_chance(search))
    match->note = g_strdup_printf("Not sure: unrelated patterns would give a match as good (10^%s expected).", chance);
  else if (rival > RIVAL_SHARE * evidence)
    match->note = g_strdup("Not sure: another rotation or shift fits about as well, as in a regular pattern.");
  else {
    match->sure = TRUE;
    match->note = g_strdup_printf("Sure: unrelated patterns would give a match as good 10^%s times.", chance);
  }
}

static gboolean fill(const Search *search, const AwMatchPattern *a, const AwMatchPattern *b,
                     const AwMatchSettings *settings, AwMatch *match, GError **error)
{
  gboolean probe_is_a = a->n < b->n;
  const AwMatchPattern *probe = probe_is_a ? a : b, *field = probe_is_a ? b : a;
  match->n_a = a->n;
  match->n_b = b->n;
  match->of_a = g_new0(AwMatchPoint, a->n);
  match->of_b = g_new0(AwMatchPoint, b->n);
  match->m = (AwMatrix){ 1, 0, 0, 1 };
  match->movement_um = match->movement_se_um = NAN;
  for (gsize i = 0; i < a->n; i++)
    match->of_a[i].partner = -1;
  for (gsize j = 0; j < b->n; j++)
    match->of_b[j].partner = -1;
  if (search->best < 0) {
    match->log10_chance = search->log10_tests;
    match->note = g_strdup("Not sure: no rotation and shift was found that lays the patterns on one another.");
    return TRUE;
  }
  const AwCandidate *best = &g_array_index(search->candidates, AwCandidate, search->best);
  judge(search, match);
  set_map(match, &best->map, centroid_of(probe), centroid_of(field), probe_is_a);
  AwMatchStart start = { best->radius_um / 2, search->field->spacing_um };
  if (!aw_match_pair(a, b, settings, start, match, error))
    return FALSE;
  return TRUE;
}

gboolean aw_match_find(AwMatchPattern a, AwMatchPattern b, const AwMatchSettings *settings, AwMatch *match,
                       GError **error)
{
  g_return_val_if_fail(settings && match && a.name && b.name, FALSE);
  g_return_val_if_fail((a.xy_um || a.n == 0) && (b.xy_um || b.n == 0), FALSE);
  *match = (AwMatch){ 0 };
  if (!check_settings(settings, error) || !check_pattern(&a, error) || !check_pattern(&b, error))
    return FALSE;
  gboolean probe_is_a = a.n < b.n;
  Search search = { .probe = { .scale_min = probe_is_a ? settings->scale_min : 1 / settings->scale_max,
                               .scale_max = probe_is_a ? settings->scale_max : 1 / settings->scale_min,
                               .allow_mirror = settings->allow_mirror } };
  gboolean ok = search_init(&search, probe_is_a ? &a : &b, probe_is_a ? &b : &a, settings, error) &&
                run_seeds(&search, settings->progress, error) && fill(&search, &a, &b, settings, match, error);
  search_clear(&search);
  if (!ok)
    aw_match_clear(match);
  return ok;
}

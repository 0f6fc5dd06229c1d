/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/random.h"
#include "geometry/match_parts.h"

/*
 * A seed is a pair of probe points some four spacings apart: long enough that movement hardly turns it, short enough
 * that both ends and what lies about them are likely to be there. Each pair of the field of the same length fixes a
 * map; it is tried on the points about the seed, nearest first, until the likelihood ratio of "belongs" (a point hits
 * with P_HIT) against "chance" (with the local density's rate) leaves Wald's bounds (Wald 1945, Ann. Math. Stat.
 * 16:117; in model verification Matas & Chum 2005, ICCV). Nearly all maps end after a few looks into the raster.
 */
#define SEED 0x6d617463
#define TRIES_PER_SEED 30
#define MIN_BASE_SPACINGS 2.6
#define MAX_BASE_SPACINGS 5.0
#define MAX_ABOUT 72
#define ABOUT_BASES 1.3 /* points about the seed reach this many lengths of the pair from its middle */
#define P_HIT 0.5
#define MIN_CHANCE 0.05
#define MAX_CHANCE 0.35
#define LOG_KEEP 7.5
#define LOG_DROP -2.5
#define LOG_LEFT 4.0 /* enough when the points run out */

AwSpot aw_spot_map_apply(const AwSpotMap *map, AwSpot p)
{
  double y = map->mirrored ? -p.y : p.y;
  return (AwSpot){ map->c * p.x - map->s * y + map->tx, map->s * p.x + map->c * y + map->ty };
}

typedef struct {
  const AwField *field;
  AwSpot middle, half; /* of the probe's pair: its middle, and half the way from first to second point */
  double length_um;
  gsize n_about;
  guint32 about[MAX_ABOUT];
  AwSpot turned[MAX_ABOUT]; /* along and across the pair, from its middle */
} Seed;

/* The second point of the pair: one of those at a useful distance, else the farthest within reach. */
static gboolean choose_pair(const AwProbe *probe, double spacing_um, AwRandom *random, gsize pair[2])
{
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  pair[0] = aw_random_below(random, (guint32)probe->n);
  AwSpot p = probe->spots[pair[0]];
  aw_grid_within(probe->grid, p.x, p.y, MAX_BASE_SPACINGS * spacing_um, hits);
  guint first = 0;
  while (first < hits->len && g_array_index(hits, AwGridHit, first).distance < MIN_BASE_SPACINGS * spacing_um)
    first++;
  if (first == hits->len)
    return FALSE;
  guint chosen = first + aw_random_below(random, (guint32)(hits->len - first));
  pair[1] = g_array_index(hits, AwGridHit, chosen).index;
  return TRUE;
}

static void gather_about(const AwProbe *probe, const gsize pair[2], Seed *seed)
{
  AwGridHit hits[MAX_ABOUT + 2];
  gsize n = aw_grid_nearest(probe->grid, seed->middle.x, seed->middle.y, MAX_ABOUT + 2, hits);
  double ux = seed->half.x * 2 / seed->length_um, uy = seed->half.y * 2 / seed->length_um;
  for (gsize k = 0; k < n && seed->n_about < MAX_ABOUT; k++) {
    if (hits[k].distance > ABOUT_BASES * seed->length_um)
      break;
    if (hits[k].index == pair[0] || hits[k].index == pair[1])
      continue;
    AwSpot p = probe->spots[hits[k].index];
    double dx = p.x - seed->middle.x, dy = p.y - seed->middle.y;
    seed->about[seed->n_about] = (guint32)hits[k].index;
    seed->turned[seed->n_about++] = (AwSpot){ ux * dx + uy * dy, ux * dy - uy * dx };
  }
}

/* Wald's test of the map that lays the seed's pair on `middle` along the unit vector (ux, uy), scaled. */
static gboolean passes(const Seed *seed, AwSpot middle, double ux, double uy, double flip, double chance)
{
  double hit = log(P_HIT / chance), miss = log((1 - P_HIT) / (1 - chance)), odds = 0;
  for (gsize k = 0; k < seed->n_about; k++) {
    double u = seed->turned[k].x, v = flip * seed->turned[k].y;
    odds += aw_field_has(seed->field, middle.x + ux * u - uy * v, middle.y + uy * u + ux * v) ? hit : miss;
    if (odds < LOG_DROP)
      return FALSE;
    if (odds > LOG_KEEP)
      return TRUE;
  }
  return odds > LOG_LEFT;
}

/* The map that lays the pair's middle on `middle` and its direction on (ux, uy), a vector as long as the scale. */
static AwSpotMap map_of(const Seed *seed, AwSpot middle, double ux, double uy, gboolean mirrored)
{
  double hx = seed->half.x * 2 / seed->length_um, hy = seed->half.y * 2 / seed->length_um;
  if (mirrored)
    hy = -hy;
  AwSpotMap map = { ux * hx + uy * hy, uy * hx - ux * hy, 0, 0, mirrored };
  AwSpot at = aw_spot_map_apply(&map, seed->middle);
  map.tx = middle.x - at.x;
  map.ty = middle.y - at.y;
  return map;
}

typedef struct {
  const AwProbe *probe;
  AwSeedFound found;
  gpointer data;
} Search;

static void try_base(const Search *search, const Seed *seed, gsize i, const AwSpotNear *near)
{
  const AwField *field = seed->field;
  AwSpot p = field->spots[i], q = field->spots[near->index];
  AwSpot middle = { (p.x + q.x) / 2, (p.y + q.y) / 2 };
  double length = (double)near->distance;
  double scale = CLAMP(length / seed->length_um, search->probe->scale_min, search->probe->scale_max);
  double ux = (q.x - p.x) / length * scale, uy = (q.y - p.y) / length * scale;
  double chance =
      (field->density[i] + field->density[near->index]) / 2 * G_PI * field->tolerance_um * field->tolerance_um;
  chance = CLAMP(chance, MIN_CHANCE, MAX_CHANCE);
  for (int mirrored = 0; mirrored <= (search->probe->allow_mirror ? 1 : 0); mirrored++)
    if (passes(seed, middle, ux, uy, mirrored ? -1 : 1, chance)) {
      AwSpotMap map = map_of(seed, middle, ux, uy, mirrored);
      search->found(&map, seed->middle, seed->about, seed->n_about, search->data);
    }
}

static void try_field(const Search *search, const Seed *seed)
{
  const AwField *field = seed->field;
  double low = seed->length_um * search->probe->scale_min - field->tolerance_um;
  double high = seed->length_um * search->probe->scale_max + field->tolerance_um;
  for (gsize i = 0; i < field->n; i++) {
    gsize at = field->near_first[i], end = field->near_first[i + 1];
    for (gsize stop = end; at < stop;) {
      gsize middle = at + (stop - at) / 2;
      if ((double)field->near[middle].distance < low)
        at = middle + 1;
      else
        stop = middle;
    }
    for (; at < end && (double)field->near[at].distance <= high; at++)
      try_base(search, seed, i, &field->near[at]);
  }
}

void aw_seed_try(const AwProbe *probe, const AwField *field, guint number, AwSeedFound found, gpointer data)
{
  AwRandom random = aw_random_stream(SEED, number);
  gsize pair[2];
  gboolean has_pair = FALSE;
  double spacing_um = field->spacing_um / probe->scale_max;
  for (int k = 0; k < TRIES_PER_SEED && !has_pair; k++)
    has_pair = choose_pair(probe, spacing_um, &random, pair);
  if (!has_pair)
    return;
  AwSpot p = probe->spots[pair[0]], q = probe->spots[pair[1]];
  Seed seed = { .field = field,
                .middle = { (p.x + q.x) / 2, (p.y + q.y) / 2 },
                .half = { (q.x - p.x) / 2, (q.y - p.y) / 2 },
                .length_um = hypot(q.x - p.x, q.y - p.y) };
  gather_about(probe, pair, &seed);
  const Search search = { probe, found, data };
  try_field(&search, &seed);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_MATCH_PARTS_H
#define AW_GEOMETRY_MATCH_PARTS_H

#include "base/grid.h"
#include "geometry/match.h"

/* The parts of aw_match_find; for core/geometry/match*.c alone. Everything in um about the patterns' centroids. */

/* A point of the plane, whichever pattern it is of. */
typedef struct {
  double x, y;
} AwSpot;

/* The similarity from probe to field: (x', y') = R (x, +-y) + t with R = (c, -s; s, c), minus sign when mirrored. */
typedef struct {
  double c, s, tx, ty;
  gboolean mirrored;
} AwSpotMap;

AwSpot aw_spot_map_apply(const AwSpotMap *map, AwSpot p);

/* --- the field: the pattern in which the other one is looked for (match_field.c) --- */

/* A neighbour within reach of a field's point. */
typedef struct {
  float distance;
  guint32 index;
} AwSpotNear;

typedef struct {
  AwSpot *spots;
  gsize n;
  AwGrid *grid;
  double *density;     /* at each point, per um2, from its neighbours */
  double spacing_um;   /* median of 1 / sqrt (density) */
  double tolerance_um; /* a point lies "on" the field when it is at most this far from one of its points */
  double reach_um;     /* neighbours are listed up to here */
  AwSpotNear *near;    /* neighbours by rising distance, point after point */
  gsize *near_first;   /* n + 1 */
  guint64 *bits;       /* raster of what lies on the field */
  gsize columns, rows;
  double cell_um, x0, y0;
} AwField;

/* Copies the pattern about `centre`. movement_um 0: unknown. */
AwField *aw_field_new(const AwMatchPattern *pattern, AwSpot centre, double movement_um, GError **error);
void aw_field_free(AwField *field);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwField, aw_field_free)

/* The local density at each of n points, per um2, from the 8 nearest others. */
double *aw_spot_density(const AwGrid *grid, const AwSpot *spots, gsize n);

/* TRUE when p lies on the field, to about a third of the tolerance. */
static inline gboolean aw_field_has(const AwField *field, double x, double y)
{
  double u = (x - field->x0) / field->cell_um, v = (y - field->y0) / field->cell_um;
  if (!(u >= 0 && v >= 0 && u < (double)field->columns && v < (double)field->rows))
    return FALSE;
  gsize bit = (gsize)v * field->columns + (gsize)u;
  return (field->bits[bit >> 6] >> (bit & 63)) & 1;
}

/* --- the probe: the pattern that is looked for (match_seed.c, match_grow.c) --- */

typedef struct {
  AwSpot *spots;
  gsize n;
  AwGrid *grid;
  double scale_min, scale_max; /* from probe to field */
  gboolean allow_mirror;
} AwProbe;

/* A map with what speaks for it. */
typedef struct {
  AwSpotMap map;
  AwSpot centre;    /* of the probe's points that found it */
  double evidence;  /* minus the decimal logarithm of the chance of so many hits by one map given beforehand */
  double radius_um; /* of the hits that gave the evidence */
} AwCandidate;

/* Receives the maps that a seed suggests, with the probe's points about it (nearest first). */
typedef void (*AwSeedFound)(const AwSpotMap *map, AwSpot centre, const guint32 *about, gsize n_about, gpointer data);

/* Tries seed number `seed`, a pair of probe points, on all pairs of the field. Only the seed's number decides. */
void aw_seed_try(const AwProbe *probe, const AwField *field, guint number, AwSeedFound found, gpointer data);

/* Grows a map from the points about its seed over the probe as far as the evidence rises. FALSE: chance by the seed. */
gboolean aw_match_grow(const AwProbe *probe, const AwField *field, const guint32 *about, gsize n_about,
                       AwCandidate *candidate);

/* --- pairing (match_pair.c) --- */

/* Where pairing starts from; the match holds the map. */
typedef struct {
  double movement_um; /* per axis, a first guess */
  double spacing_um;  /* of b; partners are looked for no farther */
} AwMatchStart;

/* Fits map, movement and the shares of lost and new points in turn, then fills the match. */
gboolean aw_match_pair(const AwMatchPattern *a, const AwMatchPattern *b, const AwMatchSettings *settings,
                       AwMatchStart start, AwMatch *match, GError **error);

#endif

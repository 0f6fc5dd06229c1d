/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_MATCH_H
#define AW_GEOMETRY_MATCH_H

#include <glib.h>

#include "base/point.h"
#include "base/progress.h"
#include "geometry/registration.h"

/**
 * Matching two patterns of nuclei without a starting guess: the follow-up against the plan, or a few fields of the
 * beam stage against the scan. Positions alone decide. Method, equations, sources: docs/methods-match.md.
 */

/* Fewest points of a pattern, and most. */
#define AW_MATCH_MIN_POINTS 8
#define AW_MATCH_MAX_POINTS 1000000

/* One pattern: n positions in um, x then y. Borrowed. `name` tells the two apart in messages ("the scan"). */
typedef struct {
  const double *xy_um;
  gsize n;
  const char *name;
} AwMatchPattern;

typedef struct {
  double scale_min, scale_max; /* of the map from a to b; 0 < scale_min <= 1 <= scale_max */
  gboolean allow_mirror;       /* b may be a's mirror image */
  double movement_um;          /* rms per axis expected between the two; 0: unknown. Measured in either case */
  AwFitKind kind;              /* of the map that the result reports */
  AwProgress *progress;        /* may be NULL */
} AwMatchSettings;

/* Any rotation, shift and flip, scale 0.97 ... 1.03, movement unknown, similarity. */
void aw_match_settings_init(AwMatchSettings *settings);

/* What becomes of one point. */
typedef struct {
  gssize partner;    /* index in the other pattern, -1: none */
  double confidence; /* probability that the partner, or having none, is right; 0 ... 1. Given that the map is right */
} AwMatchPoint;

/* The map b = m a + shift and who belongs to whom. */
typedef struct {
  gboolean sure; /* FALSE: the map may be wrong, `note` says why; do not use it unseen */
  char *note;    /* a sentence on how sure the match is; owned */
  AwMatrix m;    /* identity when nothing was found */
  double shift_x_um, shift_y_um;
  gboolean mirrored;
  AwMatchPoint *of_a; /* n_a; owned */
  AwMatchPoint *of_b; /* n_b; owned */
  gsize n_a, n_b;
  gsize n_matched;       /* pairs, one to one */
  gsize n_shared_a;      /* points of a that lie where b was imaged, by b's own points */
  gsize n_shared_b;      /* and points of b that lie where a was imaged */
  double movement_um;    /* rms per axis of the pairs' residuals: movement and localisation together; NaN: none */
  double movement_se_um; /* its standard error */
  double log10_chance;   /* unrelated patterns give a match as good at most 10^this times (expected number) */
  double rival_log10;    /* the same for the best map that is clearly another one; 0 when there was none */
} AwMatch;

void aw_match_clear(AwMatch *match);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwMatch, aw_match_clear)

/**
 * aw_match_find: the map from a to b, a one-to-one matching, and how far both are to be trusted.
 *
 * Deterministic. Returns TRUE also when no map was found that chance would not give as well: then `sure` is FALSE and
 * n_matched may be 0. AW_ERROR_RANGE: a pattern with too few or too many points, with a number that is not finite, all
 * on one spot or line, or spread too thinly; a setting outside its limits. AW_ERROR_MEMORY, AW_ERROR_CANCELLED.
 */
gboolean aw_match_find(AwMatchPattern a, AwMatchPattern b, const AwMatchSettings *settings, AwMatch *match,
                       GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_SUPPORT_PATTERN_H
#define AW_SUPPORT_PATTERN_H

#include <glib.h>

#include "base/point.h"
#include "base/random.h"
#include "geometry/match.h"

/* Simulated dishes for the tests of matching: a pattern, what became of it, and the truth. */

typedef struct {
  double *xy_um;
  gsize n;
  gssize *truth; /* index of the same nucleus in the pattern it was made from; -1: new. NULL for a first pattern */
} AwTestPattern;

void aw_test_pattern_clear(AwTestPattern *pattern);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwTestPattern, aw_test_pattern_clear)

/* n points in a square of n spacing^2, no two nearer than `least`. */
AwTestPattern aw_test_dish(AwRandom *random, gsize n, double spacing_um, double least_um);

/* What happens between the two scans. */
typedef struct {
  double lost_frac, new_frac, movement_um, least_um;
  double scale, angle_rad, shift_x_um, shift_y_um;
  gboolean mirrored;
} AwTestChange;

/* 30 % lost, 20 % new, movement 3 um per axis; a random turn, flip, shift, and scale within 2 %. */
AwTestChange aw_test_change(AwRandom *random, double least_um);

/* The changed dish in random order. */
AwTestPattern aw_test_changed(AwRandom *random, const AwTestPattern *dish, const AwTestChange *change);

/* How a match does against the truth of b. */
typedef struct {
  gsize n_true, n_found, n_wrong; /* nuclei in both; pairs that are right; pairs that are not */
  gsize n_high, n_high_right;     /* pairs of confidence >= 0.95, and those of them that are right */
} AwTestScore;
void aw_test_score(const AwMatch *match, const AwTestPattern *b, AwTestScore *score);

/* Largest distance between where the match and the change lay the dish's corners. */
double aw_test_map_error(const AwMatch *match, const AwTestPattern *a, const AwTestChange *change);

#endif

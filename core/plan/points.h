/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_POINTS_H
#define AW_PLAN_POINTS_H

#include "plan/tour.h"

/* A table of points to be ordered: columns x_um and y_um, all others carried along. */
typedef struct AwPoints AwPoints;

/**
 * Reads a CSV. AW_ERROR_NOT_FOUND without x_um or y_um, AW_ERROR_EMPTY without rows, AW_ERROR_STATE when it has an
 * `order` column already, AW_ERROR_RANGE past AW_MAX_COORDINATE_UM.
 */
AwPoints *aw_points_read(const char *path, GError **error);
void aw_points_free(AwPoints *points);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwPoints, aw_points_free)

gsize aw_points_n(const AwPoints *points);
const AwStop *aw_points_stops(const AwPoints *points); /* owned by the table */

/* Appends one sentence per pair of rows on one spot to `warnings` (char *), at most ten and a count of the rest. */
void aw_points_warn_duplicates(const AwPoints *points, GPtrArray *warnings);

/* Writes the rows in that order with an `order` column from 1, comments kept; through AwOutput. */
gboolean aw_points_write(const AwPoints *points, const guint32 *order, const char *path, GError **error);

#endif

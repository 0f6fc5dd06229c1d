/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_OUTLINE_H
#define AW_GEOMETRY_OUTLINE_H

#include <glib.h>

#include "base/point.h"

/**
 * Outlines: closed polygons that do not cross themselves, n >= 3 points, the first not repeated at the end.
 *
 * They stand in scan um (loose images: in pixels, which then are the scan unit). Made by aw_outline_trace they run so
 * that the shoelace sum is positive; the functions below accept either sense.
 */

/* Enclosed area, never negative. Shoelace formula. */
double aw_outline_area(const AwScanPoint *p, gsize n);

/* Centroid of the enclosed area; of the points when the area is zero. */
AwScanPoint aw_outline_centroid(const AwScanPoint *p, gsize n);

/* TRUE when q lies inside (even-odd rule; a point on the line itself may be either). */
gboolean aw_outline_contains(const AwScanPoint *p, gsize n, AwScanPoint q);

/* Largest distance of a point of the outline from q. */
double aw_outline_reach(const AwScanPoint *p, gsize n, AwScanPoint q);

/* Shortest distance between the areas that two outlines enclose; 0 when they meet, overlap or contain one another. */
double aw_outline_distance(const AwScanPoint *a, gsize n_a, const AwScanPoint *b, gsize n_b);

/* Area that two outlines share, by lines across the common box: good to about 1 % of the smaller one. */
double aw_outline_common_area(const AwScanPoint *a, gsize n_a, const AwScanPoint *b, gsize n_b);

/* TRUE when no two edges cross. */
gboolean aw_outline_is_simple(const AwScanPoint *p, gsize n);

/* Moves every point: p becomes to + m (p - from). Turned round when m mirrors, so that the sense stays. */
void aw_outline_map(AwScanPoint *p, gsize n, AwMatrix m, AwScanPoint from, AwScanPoint to);

#endif

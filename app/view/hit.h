/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_HIT_H
#define AW_VIEW_HIT_H

#include "base/point.h"
#include "nuclei/nucleus.h"

/**
 * AwHitIndex: finds nuclei by place. Works in scan coordinates, on the outlines that hit probability and gating use;
 * a nucleus whose outline or centroid is not usable (not finite, beyond AW_MAX_COORDINATE_UM) is never found.
 * Borrows the nuclei: make a new index when they change. Results are indices into that array.
 */
typedef struct AwHitIndex AwHitIndex;

AwHitIndex *aw_hit_index_new(GPtrArray *nuclei);
void aw_hit_index_free(AwHitIndex *index);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwHitIndex, aw_hit_index_free)

/* The nuclei's centroids side by side, which is quicker to walk than the nuclei; owned by the index. */
const AwScanPoint *aw_hit_centroids(const AwHitIndex *index);

/* TRUE when q lies inside the polygon by the rule of odd crossings. */
gboolean aw_polygon_contains(const AwScanPoint *polygon, gsize n, AwScanPoint q);

/**
 * The nucleus at q: of those whose outline contains it the smallest, else the one whose centroid is nearest within
 * slack_um (which a caller sets to a few screen px, so that small nuclei can be picked). -1 when there is none.
 */
int aw_hit_at(const AwHitIndex *index, AwScanPoint q, double slack_um);

/* Nuclei whose bounding box overlaps the rectangle between two opposite corners; guint, rising. g_array_unref. */
GArray *aw_hit_in_rectangle(const AwHitIndex *index, AwScanPoint a, AwScanPoint b);

/**
 * Nuclei whose centroid lies inside a loop drawn by hand; the loop is closed by a straight line, and parts it goes
 * round twice count as inside. Also for rectangles on the screen, which are turned in scan coordinates.
 * guint, rising. Free with g_array_unref.
 */
GArray *aw_hit_in_loop(const AwHitIndex *index, const AwScanPoint *loop, gsize n);

#endif

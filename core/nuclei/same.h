/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SAME_H
#define AW_NUCLEI_SAME_H

#include "nuclei/nucleus.h"

/**
 * aw_nuclei_same: which nuclei of a new segmentation are those of an old one of the same scan.
 *
 * Two are the same when each one's centroid lies inside the other's outline, and no second nucleus of either list
 * claims the same partner (a nucleus that was split or joined is therefore not the same as its parts).
 * Returns one entry per nucleus of `now`: the index into `before`, or -1. Free with g_free.
 */
gint *aw_nuclei_same(GPtrArray *before, GPtrArray *now);

#endif

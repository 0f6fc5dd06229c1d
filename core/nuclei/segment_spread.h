/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SEGMENT_SPREAD_H
#define AW_NUCLEI_SEGMENT_SPREAD_H

#include "nuclei/segment_work.h"

/* A pixel and the label it carries. */
typedef struct {
  guint32 at, label;
} AwSpot;

/* Appends every label pixel that has another label or none above, below, left or right of it, in scan order. */
void aw_label_edges(const guint32 *label, int width, int height, GArray *edge);

/* The labels left, right, above and below a pixel; beyond the edge its own. */
void aw_labels_around(const guint32 *label, int width, int height, guint32 at, guint32 around[4]);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SEGMENT_SPREAD_H
#define AW_NUCLEI_SEGMENT_SPREAD_H

#include "nuclei/segment_work.h"

/* A pixel and the label it carries. */
typedef struct {
  guint32 at, label;
} AwSpot;

/* Appends every label pixel with an unlabelled neighbour up, down, left or right, in scan order. */
void aw_spread_start(const guint32 *label, int width, int height, GArray *edge);

#endif

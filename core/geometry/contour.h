/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_CONTOUR_H
#define AW_GEOMETRY_CONTOUR_H

#include <glib.h>

#include "base/point.h"

/* Empty rows and columns that a raster must have around its mask. */
#define AW_CONTOUR_MARGIN_PX 3

/* A small mask: 1 inside, 0 outside, rows from the top, `margin` empty pixels on every side. */
typedef struct {
  guint8 *mask; /* width_px x height_px */
  int width_px, height_px;
} AwRaster;

/* Keeps the largest 8-connected part (the first of equals, rows from the top) and fills its holes. */
void aw_raster_clean(AwRaster *raster);

/**
 * aw_contour_trace: the sub-pixel outline of a mask that is one part without holes (aw_raster_clean).
 *
 * Marching squares on the mask smoothed by a binomial filter, smoothed along the line; points within 0.1 px of the line
 * through their neighbours are left out; then scaled about its centroid and shifted so that area and centroid equal the
 * mask's. Never crosses itself. points (AwScanPoint, here in raster px) is emptied first and gets at least 3 points
 * with a positive shoelace sum. Source: Lorensen & Cline 1987 (in two dimensions), Douglas & Peucker 1973; docs.
 */
void aw_contour_trace(const AwRaster *raster, GArray *points);

#endif

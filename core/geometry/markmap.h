/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_MARKMAP_H
#define AW_GEOMETRY_MARKMAP_H

#include <glib.h>

#include "geometry/pixelmap.h"

/* One mark seen at one stage reading. */
typedef struct {
  AwScanPoint stage;
  AwPixelPoint p;
} AwMarkView;

/* The pixel map from one fixed mark; standard errors are NaN when the fit has no degrees of freedom. */
typedef struct {
  AwPixelMap map; /* fitted; rms_um is the residual per axis */
  gsize n;
  int n_free;                 /* 2 n - 6 */
  AwMatrix row_covariance;    /* of (xx, xy), and alike of (yx, yy): (um/px)2 */
  double scale, scale_se;     /* um/px, square root of |det A| */
  double scale_x, scale_y;    /* um/px of pixel columns and rows */
  double angle_rad, angle_se; /* of the pixel x axis on the stage */
  double shear_rad, shear_se; /* angle between the pixel axes less 90 degrees */
  gboolean mirrored;
} AwMarkMap;

/**
 * aw_mark_map_fit: A from S - A p = const by least squares over all views.
 *
 * pixel_um: the pixel size entered or read from files, 0 unknown; a scale 1000 times off is named as mm for um.
 * AW_ERROR_RANGE: fewer than three views, readings or pixels on one line, units mixed up.
 */
gboolean aw_mark_map_fit(const AwMarkView *views, gsize n, double pixel_um, AwMarkMap *map, GError **error);

/* S - A p of a view less its mean over the views, um. */
AwScanPoint aw_mark_map_residual(const AwMarkMap *map, const AwMarkView *views, gsize n, gsize i);

/* Axis flips, exchanges and turns against an upright camera of the same scale, in words; "" when there are none. */
char *aw_mark_map_words(const AwMarkMap *map);

/**
 * "mm" or the like when `ratio`, found over expected scale, looks like units mixed up (within 20 % of 1000 or 1/1000);
 * else NULL. The word is the unit that the um column seems to hold.
 */
const char *aw_unit_slip(double ratio);

#endif

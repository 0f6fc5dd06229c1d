/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SHAPE_H
#define AW_NUCLEI_SHAPE_H

#include "nuclei/nucleus.h"

/* Shape of one mask from its runs, in pixels; the runs come row by row and do not overlap. */

/* Moments of the pixel centres. The second moments are central, divided by the pixel count. */
typedef struct {
  gint64 n_px;
  double x_px, y_px; /* centroid */
  double xx, xy, yy; /* covariance, px2 */
} AwMoments;

AwMoments aw_runs_moments(const AwRun *runs, gsize n_runs);

/**
 * aw_runs_hull_px: the number of pixels of the mask's convex hull: pixel centres inside or on the convex hull of the
 * middles of all pixel edges. Exact, in integers. This is the count scikit-image's `area_convex` makes.
 */
gint64 aw_runs_hull_px(const AwRun *runs, gsize n_runs);

/* Smallest rectangle that holds all runs. */
AwRect aw_runs_box(const AwRun *runs, gsize n_runs);

/* The ellipse of covariance (xx, xy, yy): full axes 4 sqrt(eigenvalue), angle of the major axis in -pi/2 ... pi/2. */
void aw_ellipse_from_covariance(double xx, double xy, double yy, double *major, double *minor, double *angle_rad);

/* The same ellipse after the linear map m; `major`, `minor`, `angle_rad` are replaced. */
void aw_ellipse_map(AwMatrix m, double *major, double *minor, double *angle_rad);

#endif

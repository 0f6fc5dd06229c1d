/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_TESTS_DRAWN_H
#define AW_TESTS_DRAWN_H

#include "image/image.h"

/* Small pictures of known content for unit tests. All of these abort the test when something is amiss. */

/* A new picture filled with `level`; full_scale as aw_image_new gives it. Free with aw_image_free. */
AwImage *drawn_image(int width_px, int height_px, AwSample sample, double level);

/**
 * An ellipse to be drawn: full axes in px, angle of the major axis from +x towards +y (down) of the picture,
 * `height` added inside, edges softened by a Gaussian of sigma_px (0: only anti-aliased).
 */
typedef struct {
  double x_px, y_px;
  double major_px, minor_px;
  double angle_rad;
  double height;
  double sigma_px;
} DrawnBlob;

/* Adds the blob with exact pixel coverage; parts outside the picture are dropped. Integer samples round and clip. */
void drawn_blob(AwImage *image, DrawnBlob blob);

/* A disc of radius r_px: the common case of drawn_blob. */
void drawn_disc(AwImage *image, double x_px, double y_px, double r_px, double height, double sigma_px);

/* The same for any polygon, pixel coordinates. */
void drawn_polygon(AwImage *image, const AwPixelPoint *polygon, gsize n, double height, double sigma_px);

/* Adds dx x + dy y to every pixel: uneven light. */
void drawn_slope(AwImage *image, double dx_per_px, double dy_per_px);

/* Adds normal noise of standard deviation `sd`; the same seed gives the same noise. */
void drawn_noise(AwImage *image, double sd, guint64 seed);

/* Sets one pixel, rounded and clipped for integer samples. */
void drawn_set(AwImage *image, int x, int y, double value);

/* Sets `label` where the polygon, ellipse or disc covers at least half of the pixel; raises n_labels to it. */
void drawn_label(AwLabels *labels, DrawnBlob blob, guint32 label);

#endif

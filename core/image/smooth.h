/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_SMOOTH_H
#define AW_IMAGE_SMOOTH_H

#include "image/plane.h"

/**
 * aw_smooth_image: the image as real numbers, single hot pixels levelled, then smoothed with a Gaussian.
 *
 * A pixel above all eight neighbours is set to the largest of them before smoothing; nothing else changes.
 * sigma_px: 0.3 ... 50. Edges are mirrored (edge pixel repeated).
 * AW_ERROR_RANGE names the first pixel that is not a finite number (float images); AW_ERROR_MEMORY.
 */
AwPlane *aw_smooth_image(const AwImage *image, double sigma_px, GError **error);

/* The plane smoothed with a Gaussian of sigma_px (0.3 ... 50), edges mirrored; AW_ERROR_MEMORY. */
AwPlane *aw_smooth_plane(const AwPlane *plane, double sigma_px, GError **error);

#endif

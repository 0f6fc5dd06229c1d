/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_NOISE_H
#define AW_IMAGE_NOISE_H

#include "image/image.h"

/**
 * aw_image_noise: the standard deviation of the pixel noise, image units; 0 for images under 3 pixels a side.
 *
 * Robust against the objects in the image: the median magnitude of a second-difference residual, so that slopes and
 * flat ground cancel (mask of Immerkaer, Comput. Vis. Image Underst. 64:300, 1996; median in place of the mean).
 */
double aw_image_noise(const AwImage *image);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_LIGHT_H
#define AW_NUCLEI_LIGHT_H

#include "image/image.h"
#include "nuclei/nucleus.h"

/**
 * aw_light_measure: brightness of the nucleus with this label, whose runs and outline stand in px of the image.
 *
 * Sets mean, saturated_frac, the saturated flag and background (NaN when no pixel of the ring is free of masks). Until
 * aw_light_settle, integrated holds the plain sum and sharpness the plain slope in image units per px.
 */
void aw_light_measure(const AwImage *image, const AwLabels *labels, guint32 label, double saturation_level,
                      AwNucleus *nucleus);

/**
 * aw_light_settle: gives nuclei without a free ring the median background of the others (of an image without any
 * other: its smallest value), and makes integrated and sharpness relative to the background.
 */
void aw_light_settle(const AwImage *image, GPtrArray *nuclei);

#endif

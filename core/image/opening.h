/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_OPENING_H
#define AW_IMAGE_OPENING_H

#include "image/plane.h"

/**
 * aw_opening_disc: grey opening with a disc of radius_px (0.5 ... 100): what is narrower than the disc and brighter
 * than its surroundings is levelled down (Serra, Image Analysis and Mathematical Morphology, 1982).
 * Pixels beyond the edge do not take part. AW_ERROR_MEMORY.
 */
AwPlane *aw_opening_disc(const AwPlane *plane, double radius_px, GError **error);

#endif

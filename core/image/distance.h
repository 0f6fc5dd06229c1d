/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_DISTANCE_H
#define AW_IMAGE_DISTANCE_H

#include <glib.h>

/**
 * aw_distance_inside: Euclidean distance from the centre of every mask pixel to the nearest pixel centre off the mask.
 *
 * mask: width x height bytes, 0 or 1. distance: the result, px; 0 off the mask. Beyond the edge nothing is known, so
 * the edge counts neither as mask nor as background; where no background exists at all the distance is `largest`,
 * which also caps it elsewhere.
 * Method: Meijster, Roerdink and Hesselink, in Mathematical Morphology and its Applications, 2000; the row pass with
 * the parabolas of Felzenszwalb and Huttenlocher, Theory Comput. 8:415, 2012. Exact; work only where mask is.
 */
void aw_distance_inside(const guint8 *mask, int width, int height, float largest, float *distance);

#endif

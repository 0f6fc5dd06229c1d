/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_WATERSHED_H
#define AW_IMAGE_WATERSHED_H

#include <glib.h>

/**
 * aw_watershed: parts a mask into the regions of the plane's maxima.
 *
 * value: width x height numbers. mask: as many bytes; the flood stays inside. saddle_height: a maximum that rises less
 * than this above the saddle to a higher one does not count (its dynamics are too small: Grimaud, Proc. SPIE 1769:292,
 * 1992). label: the result, 0 off the mask, regions 1 ... n in the order of their highest value (highest first).
 * Returns n. Every mask pixel gets a label.
 * Method: pixels in falling order of value join the region of their highest neighbour; regions that meet above the
 * height limit are kept apart (Vincent and Soille, IEEE Trans. Pattern Anal. 13:583, 1991). Values are compared in
 * 65536 steps over their range inside the mask; equal ones go in scan order.
 */
guint32 aw_watershed(const float *value, const guint8 *mask, int width, int height, double saddle_height,
                     guint32 *label);

/* Gives mask pixels without a label that of their highest labelled neighbour, in falling order of value; returns the
 * number of pixels that no label could reach. */
guint32 aw_flood_gaps(const float *value, const guint8 *mask, int width, int height, guint32 *label);

#endif

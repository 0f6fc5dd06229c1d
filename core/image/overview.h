/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_OVERVIEW_H
#define AW_IMAGE_OVERVIEW_H

#include "image/reader.h"

/**
 * Overviews: small 8-bit pictures of planes, kept in the dish record as PNG and drawn in maps.
 *
 * A plane is shrunk by a whole factor k; picture pixel (X, Y) is the mean of the plane's pixels k X ... k X + k - 1 and
 * likewise down, at the right and lower rim of those that exist. Its centre is plane pixel (k X + (k - 1) / 2, ...).
 */

/* The k for which neither side of the picture exceeds max_side_px (1 or more). */
int aw_overview_factor(int width_px, int height_px, int max_side_px);

/* The shrunk plane as floats in the plane's own values. */
AwImage *aw_image_shrink(const AwImage *image, int max_side_px, GError **error);

/* The same straight from a file, a band of rows at a time. */
AwImage *aw_image_reader_shrink(AwImageReader *reader, int max_side_px, GError **error);

/* The 1st and 99.8th percentile of the pixels: a contrast to show them with. The frames of one scan should share one.
 */
gboolean aw_image_contrast(const AwImage *image, double *low, double *high, GError **error);

/**
 * aw_image_overview: the shrunk plane as PNG bytes; low and below becomes 0, high and above 255 (with high <= low,
 * all above low is 255). The same input gives the same bytes. A plane that fits is not shrunk again.
 */
GBytes *aw_image_overview(const AwImage *image, int max_side_px, double low, double high, GError **error);

/* Such PNG bytes as an 8-bit image; AW_ERROR_FORMAT when damaged, `name` says whose picture it is. */
AwImage *aw_overview_decode(GBytes *png, const char *name, GError **error);

#endif

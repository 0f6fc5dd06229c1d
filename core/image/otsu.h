/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_OTSU_H
#define AW_IMAGE_OTSU_H

#include <glib.h>

/**
 * aw_otsu: the threshold that parts n numbers into two classes with the largest variance between them (Otsu, IEEE
 * Trans. Syst. Man Cybern. 9:62, 1979), from a histogram of 256 equal bins over their range.
 * Returns the upper edge of the last bin of the lower class; the common value when all are equal.
 */
double aw_otsu(const float *value, gsize n);

#endif

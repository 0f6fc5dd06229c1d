/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_RANK_H
#define AW_IMAGE_RANK_H

#include <glib.h>

/* The q-quantile (0 ... 1) of n > 0 numbers: the floor(q (n - 1))-th smallest. Reorders them. */
float aw_quantile(float *value, gsize n, double q);

/* The value at which the weights, summed from the smallest value up, first reach half their total; NaN for n = 0. */
double aw_weighted_median(const double *value, const double *weight, gsize n);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_SCALEBAR_H
#define AW_FIGURES_SCALEBAR_H

#include "figures/style.h"

/* The longest of 1, 2 and 5 x 10^k um that is not above max_um; 0 for a max_um that is not above 0 and finite. */
double aw_scalebar_length(double max_um);

/**
 * Draws a bar of a round length of at most max_width, with its length written above; its left end at x, its top at y.
 * px_per_um: context units per um along the page's x axis. u: page unit. Returns the height used, 0 when no bar fits.
 */
double aw_scalebar_draw(cairo_t *cr, double x, double y, double max_width, double px_per_um, double u);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_PAGE_H
#define AW_FIGURES_PAGE_H

#include "figures/axes.h"
#include "figures/canvas.h"

/* A page of 1200 x 900 with a title, for the plots of measurements. */
typedef struct {
  AwCanvas *canvas;
  cairo_t *cr;
  double width, height, u;
  double top; /* below title and subtitle */
} AwPage;

extern const AwInk aw_ink_data, aw_ink_fit, aw_ink_other, aw_ink_warn;

gboolean aw_page_open(AwPage *page, const char *path, const char *title, const char *subtitle, GError **error);

/* Writes the file and frees the page. */
gboolean aw_page_close(AwPage *page, GError **error);

/* A line of text at (x, y); returns y of the next line. */
double aw_page_line(AwPage *page, double x, double y, const char *text, AwInk ink);

/* "VALUE +- SE UNIT" after a label. Free with g_free. */
char *aw_page_estimate(const char *label, double value, double se, int decimals, const char *unit);

/* Axes that cover both ranges with one scale inside the given box (context units). */
AwAxes aw_page_square_axes(const AwPage *page, const double box[4], const double range[4], const char *across,
                           const char *up);

/* A colour of the map of values 0 ... 1, dark to light, even in lightness. */
AwInk aw_page_shade(double value);

/* A vertical scale of those colours from `min` to `max` at (x, y). */
void aw_page_shade_scale(AwPage *page, const double box[4], const AwAxis *axis);

#endif

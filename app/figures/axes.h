/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_AXES_H
#define AW_FIGURES_AXES_H

#include "figures/style.h"

#define AW_MAX_TICKS 16

/* One axis of a plot. */
typedef struct {
  double min, max; /* min < max; both above 0 when log */
  gboolean log;
  const char *label; /* with its unit, such as "offset / µm"; may be NULL */
} AwAxis;

/* Where the ticks of an axis stand and how their numbers are written. */
typedef struct {
  double at[AW_MAX_TICKS];
  int n;
  int decimals; /* places after the point; for log axes each tick is written as short as it goes */
} AwTicks;

/* A plot frame: the box (context units) that data are drawn in; ticks and labels stand outside of it. */
typedef struct {
  double x, y, width, height; /* y is the top */
  AwAxis across, up;
  double u; /* page unit, which sets text and line sizes */
  gboolean grid;
} AwAxes;

/**
 * An axis that covers min ... max and ends on round numbers. Values that are not finite, or not above 0 on a log
 * axis, and an empty range give an axis that can still be drawn (0 ... 1; one decade; a little round one value).
 */
AwAxis aw_axis_cover(double min, double max, gboolean log, const char *label);

/* At most n_max (2 ... AW_MAX_TICKS) ticks within the axis, at 1, 2 or 5 x 10^k; on log axes at powers of ten, and at
 * 2 and 5 times those where fewer than three would stand. */
AwTicks aw_axis_ticks(const AwAxis *axis, int n_max);

/* The text of tick i. Free with g_free. */
char *aw_axis_tick_text(const AwAxis *axis, const AwTicks *ticks, int i);

/* Context coordinates of data values; values outside land outside the box, those that cannot be placed at NaN. */
double aw_axes_x(const AwAxes *axes, double value);
double aw_axes_y(const AwAxes *axes, double value);

/* Draws frame, grid, ticks, numbers and labels. */
void aw_axes_draw(cairo_t *cr, const AwAxes *axes);

/* As aw_axes_draw, but the axis across only: the rows of a bar chart carry words instead. */
void aw_axes_draw_across(cairo_t *cr, const AwAxes *axes);

/* Confines drawing to the box until cairo_restore; call cairo_save before. */
void aw_axes_clip(cairo_t *cr, const AwAxes *axes);

/* The room that numbers and label need left of and below the box, context units. */
double aw_axes_room_left(double u);
double aw_axes_room_below(double u);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/axes.h"

#include "base/text.h"
#include "figures/label.h"

#define TICK 6.0     /* length of a tick, u */
#define NUMBERS 14.0 /* text size of the numbers, u */
#define LABELS 15.0

/* The smallest of 1, 2, 5 x 10^k that is not below `least`. */
static double round_step(double least)
{
  double decade = pow(10, floor(log10(least)));
  double digits = least / decade * (1 - 1e-9);
  return decade * (digits <= 1 ? 1 : digits <= 2 ? 2 : digits <= 5 ? 5 : 10);
}

static AwAxis cover_log(double min, double max, const char *label)
{
  gboolean usable = min > 0 && isfinite(min) && max > 0 && isfinite(max);
  double lo = usable ? floor(log10(MIN(min, max)) + 1e-9) : 0;
  double hi = usable ? ceil(log10(MAX(min, max)) - 1e-9) : 1;
  return (AwAxis){ pow(10, lo), pow(10, MAX(hi, lo + 1)), TRUE, label };
}

AwAxis aw_axis_cover(double min, double max, gboolean log, const char *label)
{
  if (log)
    return cover_log(min, max, label);
  if (!(fabs(min) < 1e300) || !(fabs(max) < 1e300))
    min = 0, max = 1;
  if (min > max) {
    double swap = min;
    min = max;
    max = swap;
  }
  double size = MAX(fabs(min), fabs(max));
  if (max - min <= size * 1e-9) {
    double half = size > 0 ? size * 0.1 : 0.5;
    min -= half;
    max += half;
  }
  double step = round_step((max - min) / 6);
  return (AwAxis){ floor(min / step + 1e-9) * step, ceil(max / step - 1e-9) * step, FALSE, label };
}

static void add_tick(AwTicks *ticks, const AwAxis *axis, double value)
{
  double slack = axis->log ? axis->max * 1e-9 : (axis->max - axis->min) * 1e-9;
  if (ticks->n < AW_MAX_TICKS && value >= axis->min * (axis->log ? 1 - 1e-9 : 1) - (axis->log ? 0 : slack) &&
      value <= axis->max + slack)
    ticks->at[ticks->n++] = value;
}

static AwTicks log_ticks(const AwAxis *axis, int n_max)
{
  static const double within[] = { 1, 2, 5 };
  AwTicks ticks = { .n = 0 };
  int lo = (int)floor(log10(axis->min) + 1e-9), hi = (int)floor(log10(axis->max) + 1e-9);
  int stride = (hi - lo) / n_max + 1;
  gsize n_within = hi - lo < 2 ? G_N_ELEMENTS(within) : 1;
  for (int k = lo; k <= hi; k += stride)
    for (gsize i = 0; i < n_within; i++)
      if (ticks.n < n_max)
        add_tick(&ticks, axis, within[i] * pow(10, k));
  return ticks;
}

AwTicks aw_axis_ticks(const AwAxis *axis, int n_max)
{
  AwTicks ticks = { .n = 0 };
  n_max = CLAMP(n_max, 2, AW_MAX_TICKS);
  g_return_val_if_fail(axis->max > axis->min && (!axis->log || axis->min > 0), ticks);
  if (axis->log)
    return log_ticks(axis, n_max);
  double step = round_step((axis->max - axis->min) / (n_max - 1));
  double first = ceil(axis->min / step - 1e-9);
  for (int i = 0; i < n_max; i++)
    add_tick(&ticks, axis, (first + i) * step);
  ticks.decimals = CLAMP((int)-floor(log10(step) + 1e-9), 0, 12);
  return ticks;
}

char *aw_axis_tick_text(const AwAxis *axis, const AwTicks *ticks, int i)
{
  double value = ticks->at[i], size = MAX(fabs(axis->min), fabs(axis->max));
  if (size >= 1e7 || size < 1e-4 || (axis->log && (value >= 1e5 || value < 1e-3))) {
    char text[G_ASCII_DTOSTR_BUF_SIZE];
    return g_strdup(value == 0 ? "0" : g_ascii_formatd(text, sizeof text, "%.3g", value));
  }
  int decimals = axis->log ? CLAMP((int)-floor(log10(value) + 1e-9), 0, 12) : ticks->decimals;
  return aw_text_from_double(value, decimals);
}

static double fraction(const AwAxis *axis, double value)
{
  if (axis->log)
    return value > 0 ? log(value / axis->min) / log(axis->max / axis->min) : NAN;
  return (value - axis->min) / (axis->max - axis->min);
}

double aw_axes_x(const AwAxes *axes, double value)
{
  return axes->x + axes->width * fraction(&axes->across, value);
}

double aw_axes_y(const AwAxes *axes, double value)
{
  return axes->y + axes->height * (1 - fraction(&axes->up, value));
}

double aw_axes_room_left(double u)
{
  return (TICK + 4 * NUMBERS + 1.8 * LABELS) * u;
}

double aw_axes_room_below(double u)
{
  return (TICK + 1.6 * NUMBERS + 1.8 * LABELS) * u;
}

static void line(cairo_t *cr, double x0, double y0, double x1, double y1)
{
  cairo_move_to(cr, x0, y0);
  cairo_line_to(cr, x1, y1);
  cairo_stroke(cr);
}

static void draw_across(cairo_t *cr, const AwAxes *axes)
{
  double u = axes->u, bottom = axes->y + axes->height;
  AwLabel number = { .size = NUMBERS * u, .ink = aw_ink_text, .align = AW_ALIGN_CENTRE };
  AwTicks ticks = aw_axis_ticks(&axes->across, (int)(axes->width / (70 * u)));
  for (int i = 0; i < ticks.n; i++) {
    double x = aw_axes_x(axes, ticks.at[i]);
    g_autofree char *text = aw_axis_tick_text(&axes->across, &ticks, i);
    aw_style_set_ink(cr, aw_ink_hair);
    if (axes->grid)
      line(cr, x, axes->y, x, bottom);
    aw_style_set_ink(cr, aw_ink_text);
    line(cr, x, bottom, x, bottom + TICK * u);
    aw_label_draw(cr, &number, text, x, bottom + (TICK + 2) * u);
  }
  AwLabel label = { .size = LABELS * u, .ink = aw_ink_text, .align = AW_ALIGN_CENTRE, .max_width = axes->width };
  if (axes->across.label)
    aw_label_draw(cr, &label, axes->across.label, axes->x + axes->width / 2, bottom + (TICK + 2 + 1.4 * NUMBERS) * u);
}

static void draw_up(cairo_t *cr, const AwAxes *axes)
{
  double u = axes->u;
  AwLabel number = { .size = NUMBERS * u, .ink = aw_ink_text, .align = AW_ALIGN_RIGHT };
  AwTicks ticks = aw_axis_ticks(&axes->up, (int)(axes->height / (45 * u)));
  double widest = 0;
  for (int i = 0; i < ticks.n; i++) {
    double y = aw_axes_y(axes, ticks.at[i]), width, height;
    g_autofree char *text = aw_axis_tick_text(&axes->up, &ticks, i);
    aw_style_set_ink(cr, aw_ink_hair);
    if (axes->grid)
      line(cr, axes->x, y, axes->x + axes->width, y);
    aw_style_set_ink(cr, aw_ink_text);
    line(cr, axes->x - TICK * u, y, axes->x, y);
    aw_label_measure(cr, &number, text, &width, &height);
    widest = MAX(widest, width);
    aw_label_draw(cr, &number, text, axes->x - (TICK + 3) * u, y - height / 2);
  }
  if (!axes->up.label)
    return;
  AwLabel label = { .size = LABELS * u, .ink = aw_ink_text, .align = AW_ALIGN_CENTRE, .max_width = axes->height };
  cairo_save(cr);
  cairo_translate(cr, axes->x - widest - (TICK + 6 + 1.4 * LABELS) * u, axes->y + axes->height / 2);
  cairo_rotate(cr, -G_PI / 2);
  aw_label_draw(cr, &label, axes->up.label, 0, 0);
  cairo_restore(cr);
}

static void draw_frame(cairo_t *cr, const AwAxes *axes, gboolean with_up)
{
  g_return_if_fail(axes->width > 0 && axes->height > 0 && axes->u > 0);
  cairo_save(cr);
  cairo_set_dash(cr, NULL, 0, 0);
  cairo_set_line_width(cr, axes->u);
  draw_across(cr, axes);
  if (with_up)
    draw_up(cr, axes);
  aw_style_set_ink(cr, aw_ink_text);
  cairo_rectangle(cr, axes->x, axes->y, axes->width, axes->height);
  cairo_stroke(cr);
  cairo_restore(cr);
}

void aw_axes_draw(cairo_t *cr, const AwAxes *axes)
{
  draw_frame(cr, axes, TRUE);
}

void aw_axes_draw_across(cairo_t *cr, const AwAxes *axes)
{
  draw_frame(cr, axes, FALSE);
}

void aw_axes_clip(cairo_t *cr, const AwAxes *axes)
{
  cairo_rectangle(cr, axes->x, axes->y, axes->width, axes->height);
  cairo_clip(cr);
}

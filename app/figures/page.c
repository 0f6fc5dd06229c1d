/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/page.h"

#include <math.h>

#include "base/text.h"
#include "figures/label.h"

#define WIDTH 1200.0
#define HEIGHT 900.0
#define TEXT 19.0

const AwInk aw_ink_data = { 0.07, 0.36, 0.65, 1 };
const AwInk aw_ink_fit = { 0.80, 0.33, 0.0, 1 };
const AwInk aw_ink_other = { 0.45, 0.25, 0.55, 1 };
const AwInk aw_ink_warn = { 0.72, 0.10, 0.10, 1 };

gboolean aw_page_open(AwPage *page, const char *path, const char *title, const char *subtitle, GError **error)
{
  *page = (AwPage){ .width = WIDTH, .height = HEIGHT, .u = aw_style_unit(WIDTH, HEIGHT) };
  page->canvas = aw_canvas_open(path, WIDTH, HEIGHT, error);
  if (!page->canvas)
    return FALSE;
  page->cr = aw_canvas_cairo(page->canvas);
  aw_canvas_set_title(page->canvas, title);
  double u = page->u, left = 40 * u, y = 30 * u;
  AwLabel head = { .size = 30 * u, .bold = TRUE, .ink = aw_ink_text, .max_width = WIDTH - 2 * left };
  AwLabel below = { .size = TEXT * u, .ink = aw_ink_faint, .max_width = WIDTH - 2 * left, .max_lines = 2 };
  y += aw_label_draw(page->cr, &head, title, left, y) + 4 * u;
  y += aw_label_draw(page->cr, &below, subtitle, left, y);
  page->top = y + 26 * u;
  return TRUE;
}

gboolean aw_page_close(AwPage *page, GError **error)
{
  gboolean ok = aw_canvas_commit(page->canvas, error);
  g_clear_pointer(&page->canvas, aw_canvas_free);
  return ok;
}

double aw_page_line(AwPage *page, double x, double y, const char *text, AwInk ink)
{
  AwLabel label = { .size = TEXT * page->u, .ink = ink, .max_width = page->width - x - 20 * page->u, .max_lines = 4 };
  return y + aw_label_draw(page->cr, &label, text, x, y) + 7 * page->u;
}

char *aw_page_estimate(const char *label, double value, double se, int decimals, const char *unit)
{
  g_autofree char *text = aw_text_from_double(value, decimals);
  g_autofree char *error = isfinite(se) ? aw_text_from_double(se, decimals) : g_strdup("unknown");
  return g_strdup_printf("%s  %s ± %s %s", label, text, error, unit);
}

AwAxes aw_page_square_axes(const AwPage *page, const double box[4], const double range[4], const char *across,
                           const char *up)
{
  double w = fmax(range[1] - range[0], 1e-9), h = fmax(range[3] - range[2], 1e-9);
  double per_unit = fmin(box[2] / w, box[3] / h), mx = (range[0] + range[1]) / 2, my = (range[2] + range[3]) / 2;
  AwAxes axes = {
    .x = box[0], .y = box[1], .width = per_unit * w, .height = per_unit * h, .u = page->u, .grid = FALSE
  };
  axes.across = (AwAxis){ mx - w / 2, mx + w / 2, FALSE, across };
  axes.up = (AwAxis){ my - h / 2, my + h / 2, FALSE, up };
  return axes;
}

AwInk aw_page_shade(double value)
{
  static const AwInk stops[] = { { 0.16, 0.11, 0.33, 1 },
                                 { 0.20, 0.36, 0.58, 1 },
                                 { 0.17, 0.60, 0.58, 1 },
                                 { 0.58, 0.79, 0.36, 1 },
                                 { 0.99, 0.91, 0.47, 1 } };
  const double last = 4; /* of the stops */
  double v = CLAMP(value, 0.0, 1.0) * last;
  gsize i = (gsize)fmin(v, last - 1);
  double f = v - (double)i;
  const AwInk *a = &stops[i], *b = &stops[i + 1];
  return (AwInk){ a->r + f * (b->r - a->r), a->g + f * (b->g - a->g), a->b + f * (b->b - a->b), 1 };
}

void aw_page_shade_scale(AwPage *page, const double box[4], const AwAxis *axis)
{
  for (int i = 0; i < 128; i++) {
    aw_style_set_ink(page->cr, aw_page_shade((i + 0.5) / 128));
    cairo_rectangle(page->cr, box[0], box[1] + box[3] * (1 - (i + 1) / 128.0), box[2], box[3] / 128 + 0.6);
    cairo_fill(page->cr);
  }
  AwAxes axes = { .x = box[0], .y = box[1], .width = box[2], .height = box[3], .u = page->u };
  axes.up = *axis;
  axes.across = (AwAxis){ 0, 1, FALSE, NULL };
  AwTicks ticks = aw_axis_ticks(axis, 8);
  AwLabel number = { .size = 17 * page->u, .ink = aw_ink_text };
  for (int i = 0; i < ticks.n; i++) {
    g_autofree char *text = aw_axis_tick_text(axis, &ticks, i);
    double y = aw_axes_y(&axes, ticks.at[i]), height;
    aw_style_set_ink(page->cr, aw_ink_text);
    cairo_set_line_width(page->cr, page->u);
    cairo_move_to(page->cr, box[0] + box[2], y);
    cairo_line_to(page->cr, box[0] + box[2] + 6 * page->u, y);
    cairo_stroke(page->cr);
    aw_label_measure(page->cr, &number, text, NULL, &height);
    aw_label_draw(page->cr, &number, text, box[0] + box[2] + 10 * page->u, y - height / 2);
  }
  cairo_rectangle(page->cr, box[0], box[1], box[2], box[3]);
  cairo_stroke(page->cr);
  AwLabel title = {
    .size = 17 * page->u, .ink = aw_ink_text, .max_width = page->width - box[0] - 10 * page->u, .max_lines = 3
  };
  aw_label_draw(page->cr, &title, axis->label, box[0], box[1] + box[3] + 10 * page->u);
}

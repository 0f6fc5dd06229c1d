/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/text.h"
#include "figures/calibration.h"
#include "figures/page.h"

/* Chi square with two degrees of freedom that 95 % stay below, as a factor of sigma. */
#define ELLIPSE_95 2.447747

/* Extent of the grid with half a step all round: x from, to, y from, to. */
static void extent(const GArray *points, double range[4], double *step)
{
  *step = INFINITY;
  range[0] = range[2] = INFINITY;
  range[1] = range[3] = -INFINITY;
  const AwBeadPoint *p = (const AwBeadPoint *)(const void *)points->data;
  for (guint i = 0; i < points->len; i++) {
    range[0] = fmin(range[0], p[i].stage.bx_um);
    range[1] = fmax(range[1], p[i].stage.bx_um);
    range[2] = fmin(range[2], p[i].stage.by_um);
    range[3] = fmax(range[3], p[i].stage.by_um);
    double d = i ? hypot(p[i].stage.bx_um - p[i - 1].stage.bx_um, p[i].stage.by_um - p[i - 1].stage.by_um) : 0;
    *step = d > 0 ? fmin(*step, d) : *step;
  }
  for (int i = 0; i < 4; i++)
    range[i] += (i % 2 ? 0.5 : -0.5) * *step;
}

static void draw_ellipse(cairo_t *cr, const AwAxes *axes, AwBeamPoint centre, AwMatrix c, double factor)
{
  double half = (c.xx + c.yy) / 2, d = hypot((c.xx - c.yy) / 2, c.xy), angle = atan2(2 * c.xy, c.xx - c.yy) / 2;
  double a = factor * sqrt(half + d), b = factor * sqrt(fmax(half - d, 0));
  for (int i = 0; i < 72; i++) {
    double t = i * G_PI / 36, x = a * cos(t), y = b * sin(t);
    cairo_line_to(cr, aw_axes_x(axes, centre.bx_um + x * cos(angle) - y * sin(angle)),
                  aw_axes_y(axes, centre.by_um + x * sin(angle) + y * cos(angle)));
  }
  cairo_close_path(cr);
  cairo_stroke(cr);
}

static void draw_cells(AwPage *page, const AwAxes *axes, const GArray *points, double step)
{
  for (guint i = 0; i < points->len; i++) {
    const AwBeadPoint *p = &g_array_index(points, AwBeadPoint, i);
    double x0 = aw_axes_x(axes, p->stage.bx_um - step / 2), x1 = aw_axes_x(axes, p->stage.bx_um + step / 2);
    double y0 = aw_axes_y(axes, p->stage.by_um + step / 2), y1 = aw_axes_y(axes, p->stage.by_um - step / 2);
    aw_style_set_ink(page->cr, aw_page_shade(p->n_degraded / (p->n_full + p->n_degraded)));
    cairo_rectangle(page->cr, x0, y0, x1 - x0 + 0.4, y1 - y0 + 0.4);
    cairo_fill(page->cr);
  }
}

static void mark_place(AwPage *page, const AwAxes *axes, AwBeamPoint at, AwGlyph glyph, AwInk ink)
{
  double x = aw_axes_x(axes, at.bx_um), y = aw_axes_y(axes, at.by_um);
  for (int pass = 0; pass < 2; pass++) {
    aw_style_set_ink(page->cr, pass ? ink : aw_ink_casing);
    cairo_set_line_width(page->cr, (pass ? 2.6 : 5) * page->u);
    aw_style_draw_glyph(page->cr, glyph, x, y, 11 * page->u);
    cairo_stroke(page->cr);
  }
}

static void write_numbers(AwPage *page, const AwBeadFit *fit, const AwBeamPoint *crosshair, double x, double y)
{
  const AwMatrix *c = &fit->covariance_um2;
  g_autofree char *cx = aw_page_estimate("Centre x", fit->centre.bx_um, sqrt(c->xx), 2, "µm");
  g_autofree char *cy = aw_page_estimate("Centre y", fit->centre.by_um, sqrt(c->yy), 2, "µm");
  g_autofree char *sx = aw_page_estimate("σ x", fit->sigma_x.value, fit->sigma_x.se, 2, "µm");
  g_autofree char *sy = aw_page_estimate("σ y", fit->sigma_y.value, fit->sigma_y.se, 2, "µm");
  y = aw_page_line(page, x, y, cx, aw_ink_text);
  y = aw_page_line(page, x, y, cy, aw_ink_text);
  y = aw_page_line(page, x, y, sx, aw_ink_text);
  y = aw_page_line(page, x, y, sy, aw_ink_text);
  g_autofree char *p = aw_text_from_double(fit->p_value, 3);
  g_autofree char *quality = g_strdup_printf("Chi square: p = %s", p);
  y = aw_page_line(page, x, y, quality, fit->notes & AW_BEAD_POOR_FIT ? aw_ink_warn : aw_ink_text);
  y = aw_page_line(page, x, y + 10 * page->u, "Plus and small ring: centre and its 95 % region. Large ring: one σ.",
                   aw_ink_faint);
  if (!crosshair)
    return;
  g_autofree char *ox = aw_page_estimate("Offset x", fit->centre.bx_um - crosshair->bx_um, sqrt(c->xx), 2, "µm");
  g_autofree char *oy = aw_page_estimate("Offset y", fit->centre.by_um - crosshair->by_um, sqrt(c->yy), 2, "µm");
  y = aw_page_line(page, x, y + 10 * page->u, ox, aw_ink_text);
  y = aw_page_line(page, x, y, oy, aw_ink_text);
  aw_page_line(page, x, y, "Cross: the crosshair reading.", aw_ink_faint);
}

gboolean aw_figure_bead(const AwBeadFit *fit, const GArray *points, const AwBeamPoint *crosshair, const char *path,
                        GError **error)
{
  AwPage page;
  double range[4], step;
  g_autofree char *below =
      g_strdup_printf("%u positions, %s bump", points->len, fit->elliptical ? "elliptical" : "round");
  if (!aw_page_open(&page, path, "Bead scan", below, error))
    return FALSE;
  double u = page.u, left = aw_axes_room_left(u) + 30 * u;
  extent(points, range, &step);
  double box[4] = { left, page.top, 700 * u, page.height - page.top - aw_axes_room_below(u) - 20 * u };
  AwAxes axes = aw_page_square_axes(&page, box, range, "beam stage x / µm", "beam stage y / µm");
  cairo_set_antialias(page.cr, CAIRO_ANTIALIAS_NONE); /* no seams between the cells */
  draw_cells(&page, &axes, points, step);
  cairo_set_antialias(page.cr, CAIRO_ANTIALIAS_DEFAULT);
  aw_axes_draw(page.cr, &axes);
  cairo_save(page.cr);
  aw_axes_clip(page.cr, &axes);
  aw_style_set_ink(page.cr, aw_ink_tour);
  cairo_set_line_width(page.cr, 2 * u);
  AwMatrix shape = { fit->sigma_x.value * fit->sigma_x.value, 0, 0, fit->sigma_y.value * fit->sigma_y.value };
  draw_ellipse(page.cr, &axes, fit->centre, shape, 1);
  draw_ellipse(page.cr, &axes, fit->centre, fit->covariance_um2, ELLIPSE_95);
  mark_place(&page, &axes, fit->centre, AW_GLYPH_PLUS, aw_ink_tour);
  if (crosshair)
    mark_place(&page, &axes, *crosshair, AW_GLYPH_CROSS, (AwInk){ 1, 0.6, 0.35, 1 });
  cairo_restore(page.cr);
  AwAxis scale = { 0, 1, FALSE, "degraded fraction" };
  double x = axes.x + axes.width + 30 * u, bar[4] = { x, page.top, 26 * u, 300 * u };
  aw_page_shade_scale(&page, bar, &scale);
  write_numbers(&page, fit, crosshair, x, page.top + 370 * u);
  return aw_page_close(&page, error);
}

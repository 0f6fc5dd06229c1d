/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/text.h"
#include "figures/calibration.h"
#include "figures/label.h"
#include "figures/page.h"

/* Wilson's interval of one standard error for k of n, Wilson 1927. */
static void wilson(double fraction, double n, double *low, double *high)
{
  double middle = (fraction + 0.5 / n) / (1 + 1 / n);
  double half = sqrt(fraction * (1 - fraction) / n + 0.25 / (n * n)) / (1 + 1 / n);
  *low = middle - half;
  *high = middle + half;
}

static double fraction_of(const AwEdgePoint *p, gboolean counts)
{
  return counts ? p->n_full / (p->n_full + p->n_degraded) : p->fraction;
}

static void draw_curve(cairo_t *cr, const AwAxes *axes, const AwEdgeFit *fit, gboolean disc)
{
  static const double dashes[] = { 8, 5 };
  aw_style_set_ink(cr, disc ? aw_ink_other : aw_ink_fit);
  cairo_set_dash(cr, dashes, disc ? 2 : 0, 0);
  cairo_set_line_width(cr, 2.2 * axes->u);
  for (int i = 0; i <= 400; i++) {
    double x = axes->across.min + (axes->across.max - axes->across.min) * i / 400;
    cairo_line_to(cr, aw_axes_x(axes, x), aw_axes_y(axes, aw_edge_predict(fit, x, disc)));
  }
  cairo_stroke(cr);
  cairo_set_dash(cr, NULL, 0, 0);
}

static void draw_point(cairo_t *cr, const AwAxes *axes, double x, double y, double low, double high)
{
  double at = aw_axes_x(axes, x);
  aw_style_set_ink(cr, aw_ink_data);
  cairo_set_line_width(cr, 1.4 * axes->u);
  cairo_move_to(cr, at, aw_axes_y(axes, low));
  cairo_line_to(cr, at, aw_axes_y(axes, high));
  cairo_stroke(cr);
  aw_style_draw_glyph(cr, AW_GLYPH_DISC, at, aw_axes_y(axes, y), 4 * axes->u);
  cairo_fill(cr);
}

/* Levels of the named widths and the span between their crossings. */
static void draw_width(cairo_t *cr, const AwAxes *axes, const AwEdgeFit *fit, const char *name, double width_um,
                       double level)
{
  double height = fit->high.value - fit->low.value, y = aw_axes_y(axes, fit->low.value + level * height);
  double left = aw_axes_x(axes, fit->centre_um.value - width_um / 2);
  double right = aw_axes_x(axes, fit->centre_um.value + width_um / 2);
  aw_style_set_ink(cr, aw_ink_faint);
  cairo_set_line_width(cr, axes->u);
  cairo_move_to(cr, left, y);
  cairo_line_to(cr, right, y);
  cairo_stroke(cr);
  aw_style_arrow_head(cr, left, y, -1, 0, 9 * axes->u);
  aw_style_arrow_head(cr, right, y, 1, 0, 9 * axes->u);
  AwLabel label = { .size = 16 * axes->u, .ink = aw_ink_faint, .align = level > 0.5 ? AW_ALIGN_RIGHT : AW_ALIGN_LEFT };
  AwPatchInk patch = { { 1, 1, 1, 0.85 }, 3 * axes->u, 2 * axes->u };
  aw_label_draw_on(cr, &label, &patch, name, level > 0.5 ? left - 12 * axes->u : right + 12 * axes->u, y - 9 * axes->u);
}

static void draw_fractions(AwPage *page, const AwAxes *axes, const AwEdgeFit *fit, const GArray *points,
                           gboolean counts)
{
  cairo_t *cr = page->cr;
  aw_axes_draw(cr, axes);
  cairo_save(cr);
  aw_axes_clip(cr, axes);
  draw_width(cr, axes, fit, "10–90 %", fit->w1090_um.value, 0.1);
  draw_width(cr, axes, fit, "FWHM", fit->fwhm_um.value, 0.93);
  draw_width(cr, axes, fit, "16–84 %", fit->w1684_um.value, 0.84);
  draw_curve(cr, axes, fit, TRUE);
  draw_curve(cr, axes, fit, FALSE);
  for (guint i = 0; i < points->len; i++) {
    const AwEdgePoint *p = &g_array_index(points, AwEdgePoint, i);
    double f = fraction_of(p, counts), low = f, high = f;
    if (counts)
      wilson(f, p->n_full + p->n_degraded, &low, &high);
    draw_point(cr, axes, p->position_um, f, low, high);
  }
  cairo_restore(cr);
}

/* Residuals over their expected errors for counts, as they are for fractions. */
static double residual(const AwEdgeFit *fit, const AwEdgePoint *p, gboolean counts)
{
  double f = aw_edge_predict(fit, p->position_um, FALSE), n = p->n_full + p->n_degraded;
  double off = fraction_of(p, counts) - f;
  return counts ? off / sqrt(fmax(f * (1 - f), 0.25 / n) / n) : off;
}

static void draw_residuals(AwPage *page, AwAxes axes, const AwEdgeFit *fit, const GArray *points, gboolean counts)
{
  double most = counts ? 3 : 1e-9;
  for (guint i = 0; i < points->len; i++)
    most = fmax(most, fabs(residual(fit, &g_array_index(points, AwEdgePoint, i), counts)) + (counts ? 1 : 0));
  axes.up = aw_axis_cover(-most, most, FALSE, counts ? "residual / σ" : "residual");
  aw_axes_draw(page->cr, &axes);
  aw_style_set_ink(page->cr, aw_ink_fit);
  cairo_set_line_width(page->cr, 2 * page->u);
  cairo_move_to(page->cr, axes.x, aw_axes_y(&axes, 0));
  cairo_line_to(page->cr, axes.x + axes.width, aw_axes_y(&axes, 0));
  cairo_stroke(page->cr);
  for (guint i = 0; i < points->len; i++) {
    const AwEdgePoint *p = &g_array_index(points, AwEdgePoint, i);
    double r = residual(fit, p, counts);
    draw_point(page->cr, &axes, p->position_um, r, counts ? r - 1 : r, counts ? r + 1 : r);
  }
}

static void write_numbers(AwPage *page, const AwEdgeFit *fit, gboolean counts, double x, double y)
{
  const struct {
    const char *label;
    AwEstimate value;
  } rows[] = { { "Centre", fit->centre_um },
               { "σ", fit->sigma_um },
               { "FWHM", fit->fwhm_um },
               { "10–90 %", fit->w1090_um },
               { "16–84 %", fit->w1684_um } };
  y = aw_page_line(page, x, y, "Gaussian (full line)", aw_ink_fit);
  for (gsize i = 0; i < G_N_ELEMENTS(rows); i++) {
    g_autofree char *text = aw_page_estimate(rows[i].label, rows[i].value.value, rows[i].value.se, 3, "µm");
    y = aw_page_line(page, x, y, text, aw_ink_text);
  }
  g_autofree char *disc = aw_text_from_double(fit->disc_diameter_um, 3), *p = aw_text_from_double(fit->p_value, 3);
  g_autofree char *other = g_strdup_printf("Uniform disc (dashed), %s µm across", disc);
  y = aw_page_line(page, x, y + 14 * page->u, other, aw_ink_other);
  g_autofree char *quality = g_strdup_printf("Chi square: p = %s, %d degrees of freedom", p, fit->n_judged_free);
  if (counts)
    y = aw_page_line(page, x, y + 14 * page->u, quality, aw_ink_text);
  if (fit->notes & AW_EDGE_NOT_GAUSSIAN)
    y = aw_page_line(page, x, y, "Not Gaussian: the disc fits far better; use its diameter.", aw_ink_warn);
  if (fit->notes & AW_EDGE_POOR_FIT)
    y = aw_page_line(page, x, y, "The counts scatter more than chance allows.", aw_ink_warn);
  if (fit->notes & AW_EDGE_COARSE)
    aw_page_line(page, x, y, "Fewer than three points on the slope.", aw_ink_warn);
}

gboolean aw_figure_edge(const AwEdgeFit *fit, const GArray *points, gboolean counts, char axis, const char *path,
                        GError **error)
{
  AwPage page;
  g_autofree char *title = g_strdup_printf("Knife edge in %c", axis);
  g_autofree char *below = g_strdup_printf("%u points, %s", points->len,
                                           counts ? "bars: one standard error of the counts" : "equal weights");
  if (!aw_page_open(&page, path, title, below, error))
    return FALSE;
  double u = page.u, min = INFINITY, max = -INFINITY, left = aw_axes_room_left(u) + 30 * u;
  for (guint i = 0; i < points->len; i++) {
    min = fmin(min, g_array_index(points, AwEdgePoint, i).position_um);
    max = fmax(max, g_array_index(points, AwEdgePoint, i).position_um);
  }
  double margin = 0.02 * (max - min);
  AwAxes axes = { .x = left, .y = page.top, .width = 760 * u, .height = 540 * u, .u = u, .grid = TRUE };
  axes.across = (AwAxis){ min - margin, max + margin, FALSE, NULL };
  axes.up = (AwAxis){ -0.04, 1.04, FALSE, counts ? "fraction of full energy" : "transmitted fraction" };
  draw_fractions(&page, &axes, fit, points, counts);
  write_numbers(&page, fit, counts, left + axes.width + 36 * u, page.top);
  axes.y += axes.height + 50 * u;
  axes.height = page.height - axes.y - aw_axes_room_below(u) - 14 * u;
  axes.across.label = "edge position / µm";
  draw_residuals(&page, axes, fit, points, counts);
  return aw_page_close(&page, error);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/text.h"
#include "figures/calibration.h"
#include "figures/label.h"
#include "figures/page.h"

/* One arrow: where it stands, what it shows (um), and a name or NULL. */
typedef struct {
  double x, y, dx, dy;
  const char *name;
} Arrow;

static void widen(double range[4], double x, double y)
{
  range[0] = fmin(range[0], x);
  range[1] = fmax(range[1], x);
  range[2] = fmin(range[2], y);
  range[3] = fmax(range[3], y);
}

static void add_margin(double range[4], double part)
{
  double m = part * fmax(fmax(range[1] - range[0], range[3] - range[2]), 1e-6);
  range[0] -= m;
  range[1] += m;
  range[2] -= m;
  range[3] += m;
}

static AwAxes axes_for(const AwPage *page, const double range[4], const char *across, const char *up)
{
  double u = page->u, left = aw_axes_room_left(u) + 30 * u;
  double box[4] = { left, page->top, 760 * u, page->height - page->top - aw_axes_room_below(u) - 20 * u };
  return aw_page_square_axes(page, box, range, across, up);
}

static void draw_arrow(AwPage *page, const AwAxes *axes, const Arrow *a, double px_per_um)
{
  double u = page->u, x = aw_axes_x(axes, a->x), y = aw_axes_y(axes, a->y);
  double ex = x + px_per_um * a->dx, ey = y - px_per_um * a->dy, length = hypot(ex - x, ey - y);
  aw_style_set_ink(page->cr, aw_ink_data);
  aw_style_draw_glyph(page->cr, AW_GLYPH_DISC, x, y, 5 * u);
  cairo_fill(page->cr);
  aw_style_set_ink(page->cr, aw_ink_fit);
  cairo_set_line_width(page->cr, 2.4 * u);
  cairo_move_to(page->cr, x, y);
  cairo_line_to(page->cr, ex, ey);
  cairo_stroke(page->cr);
  if (length > 6 * u)
    aw_style_arrow_head(page->cr, ex, ey, ex - x, ey - y, fmin(12 * u, length));
  gboolean leftwards = x > axes->x + 0.8 * axes->width;
  AwLabel label = { .size = 18 * u, .ink = aw_ink_text, .align = leftwards ? AW_ALIGN_RIGHT : AW_ALIGN_LEFT };
  if (a->name)
    aw_label_draw(page->cr, &label, a->name, leftwards ? x - 9 * u : x + 9 * u, y + 5 * u);
}

/* Draws arrows so that the longest is a tenth of the box, and a key of a round length. */
static double draw_arrows(AwPage *page, const AwAxes *axes, const Arrow *arrows, gsize n, double x, double y)
{
  double longest = 1e-9;
  for (gsize i = 0; i < n; i++)
    longest = fmax(longest, hypot(arrows[i].dx, arrows[i].dy));
  double px_per_um = 0.1 * fmin(axes->width, axes->height) / longest;
  for (gsize i = 0; i < n; i++)
    draw_arrow(page, axes, &arrows[i], px_per_um);
  double key = pow(10, floor(log10(longest)));
  key *= longest / key >= 5 ? 5 : longest / key >= 2 ? 2 : 1;
  aw_style_set_ink(page->cr, aw_ink_fit);
  cairo_set_line_width(page->cr, 2.4 * page->u);
  cairo_move_to(page->cr, x, y + 10 * page->u);
  cairo_line_to(page->cr, x + px_per_um * key, y + 10 * page->u);
  cairo_stroke(page->cr);
  g_autofree char *length = aw_label_length(key);
  return aw_page_line(page, x, y + 18 * page->u, length, aw_ink_text);
}

gboolean aw_figure_pixel(const AwMarkMap *map, const GArray *views, const char *path, GError **error)
{
  AwPage page;
  const AwMarkView *v = (const AwMarkView *)(const void *)views->data;
  double range[4] = { INFINITY, -INFINITY, INFINITY, -INFINITY };
  g_autofree Arrow *arrows = g_new0(Arrow, views->len);
  for (guint i = 0; i < views->len; i++) {
    AwScanPoint r = aw_mark_map_residual(map, v, views->len, i);
    arrows[i] = (Arrow){ v[i].p.x_px, -v[i].p.y_px, r.x_um, r.y_um, NULL };
    widen(range, arrows[i].x, arrows[i].y);
  }
  if (!aw_page_open(
          &page, path, "Pixel map from one mark",
          "Residuals of the stage readings (x to the right, y up), enlarged, where the mark stood in the image", error))
    return FALSE;
  add_margin(range, 0.12);
  AwAxes axes = axes_for(&page, range, "column / px", "−row / px");
  double x = axes.x + axes.width + 36 * page.u, y = page.top;
  aw_axes_draw(page.cr, &axes);
  y = draw_arrows(&page, &axes, arrows, views->len, x, y) + 14 * page.u;
  g_autofree char *scale = aw_page_estimate("Scale", map->scale, map->scale_se, 5, "µm/px");
  g_autofree char *angle =
      aw_page_estimate("Rotation", map->angle_rad * 180 / G_PI, map->angle_se * 180 / G_PI, 3, "°");
  g_autofree char *shear = aw_page_estimate("Shear", map->shear_rad * 180 / G_PI, map->shear_se * 180 / G_PI, 3, "°");
  g_autofree char *rms = aw_text_from_double(map->map.rms_um, 3);
  g_autofree char *residual = g_strdup_printf("Residual  %s µm rms per axis", rms);
  y = aw_page_line(&page, x, y, scale, aw_ink_text);
  y = aw_page_line(&page, x, y, angle, aw_ink_text);
  y = aw_page_line(&page, x, y, shear, aw_ink_text);
  aw_page_line(&page, x, y, residual, aw_ink_text);
  return aw_page_close(&page, error);
}

static const AwMarkPair *pair_at(const AwMarksFigure *f, guint i)
{
  return &g_array_index(f->pairs, AwMarkPair, i);
}

gboolean aw_figure_residuals(const AwMarksFigure *f, const char *path, GError **error)
{
  AwPage page;
  double range[4] = { INFINITY, -INFINITY, INFINITY, -INFINITY };
  g_autofree Arrow *arrows = g_new0(Arrow, f->pairs->len);
  for (guint i = 0; i < f->pairs->len; i++) {
    AwBeamPoint at = pair_at(f, i)->beam, e = aw_registration_residual(f->fit, pair_at(f, i));
    arrows[i] = (Arrow){ at.bx_um / 1000, at.by_um / 1000, e.bx_um, e.by_um, f->names->pdata[i] };
    widen(range, arrows[i].x, arrows[i].y);
  }
  if (!aw_page_open(
          &page, path, "Relocation: residuals at the marks",
          "Read minus fitted place on the beam stage, enlarged. Small residuals are no proof of accuracy at a "
          "target.",
          error))
    return FALSE;
  add_margin(range, 0.12);
  AwAxes axes = axes_for(&page, range, "beam stage x / mm", "beam stage y / mm");
  double x = axes.x + axes.width + 36 * page.u, y = page.top;
  aw_axes_draw(page.cr, &axes);
  y = draw_arrows(&page, &axes, arrows, f->pairs->len, x, y) + 14 * page.u;
  g_autofree char *rms = aw_text_from_double(f->fit->rms_um, 3), *loc = aw_text_from_double(f->fit->localisation_um, 3);
  g_autofree char *kind = g_strdup_printf("%s%s, %u marks", f->fit->mirrored ? "Mirrored " : "",
                                          aw_fit_kind_name(f->fit->kind), f->pairs->len);
  g_autofree char *residual = g_strdup_printf("Residual  %s µm rms radial", rms);
  g_autofree char *localisation =
      g_strdup_printf("Localisation  %s µm per axis (%s)", loc, aw_origin_name(f->fit->localisation_origin));
  y = aw_page_line(&page, x, y, kind, aw_ink_text);
  y = aw_page_line(&page, x, y, residual, aw_ink_text);
  aw_page_line(&page, x, y, localisation, aw_ink_text);
  return aw_page_close(&page, error);
}

static double error_at(const AwMarksFigure *f, double x_mm, double y_mm)
{
  return f->fit->widening * aw_registration_error_um(f->fit, (AwScanPoint){ 1000 * x_mm, 1000 * y_mm });
}

/* Cells of a raster over the axes; also finds the largest value when `cr` is NULL. */
static double raster(cairo_t *cr, const AwMarksFigure *f, const AwAxes *axes, const AwAxis *scale)
{
  const int n = 120;
  double most = 0;
  for (int j = 0; j < n; j++)
    for (int i = 0; i < n; i++) {
      double x = axes->across.min + (axes->across.max - axes->across.min) * (i + 0.5) / n;
      double y = axes->up.min + (axes->up.max - axes->up.min) * (j + 0.5) / n, um = error_at(f, x, y);
      most = fmax(most, um);
      if (!cr)
        continue;
      aw_style_set_ink(cr, aw_page_shade((um - scale->min) / (scale->max - scale->min)));
      cairo_rectangle(cr, axes->x + axes->width * i / n, axes->y + axes->height * (n - 1 - j) / n,
                      axes->width / n + 0.5, axes->height / n + 0.5);
      cairo_fill(cr);
    }
  return most;
}

static void draw_places(AwPage *page, const AwMarksFigure *f, const AwAxes *axes)
{
  aw_style_set_ink(page->cr, (AwInk){ 1, 1, 1, 0.8 });
  for (guint i = 0; f->places && i < f->places->len; i++) {
    AwScanPoint q = g_array_index(f->places, AwScanPoint, i);
    aw_style_draw_glyph(page->cr, AW_GLYPH_DISC, aw_axes_x(axes, q.x_um / 1000), aw_axes_y(axes, q.y_um / 1000),
                        1.6 * page->u);
    cairo_fill(page->cr);
  }
  AwLabel label = { .size = 18 * page->u, .ink = aw_ink_text, .bold = TRUE };
  AwPatchInk patch = { { 1, 1, 1, 0.8 }, 4 * page->u, 3 * page->u };
  for (guint i = 0; i < f->pairs->len; i++) {
    AwScanPoint q = pair_at(f, i)->scan;
    double x = aw_axes_x(axes, q.x_um / 1000), y = aw_axes_y(axes, q.y_um / 1000);
    aw_style_set_ink(page->cr, aw_ink_tour);
    cairo_set_line_width(page->cr, 3 * page->u);
    aw_style_draw_glyph(page->cr, AW_GLYPH_CROSS, x, y, 8 * page->u);
    cairo_stroke(page->cr);
    gboolean leftwards = x > axes->x + 0.8 * axes->width;
    label.align = leftwards ? AW_ALIGN_RIGHT : AW_ALIGN_LEFT;
    aw_label_draw_on(page->cr, &label, &patch, f->names->pdata[i], x + (leftwards ? -14 : 14) * page->u,
                     y - 10 * page->u);
  }
}

gboolean aw_figure_target_error(const AwMarksFigure *f, const char *path, GError **error)
{
  AwPage page;
  double range[4] = { INFINITY, -INFINITY, INFINITY, -INFINITY };
  for (guint i = 0; i < f->pairs->len; i++)
    widen(range, pair_at(f, i)->scan.x_um / 1000, pair_at(f, i)->scan.y_um / 1000);
  for (guint i = 0; f->places && i < f->places->len; i++)
    widen(range, g_array_index(f->places, AwScanPoint, i).x_um / 1000,
          g_array_index(f->places, AwScanPoint, i).y_um / 1000);
  if (!aw_page_open(&page, path, "Relocation: expected target error",
                    "rms per axis, widened for few marks. Crosses: marks. Dots: nuclei.", error))
    return FALSE;
  add_margin(range, 0.15);
  AwAxes axes = axes_for(&page, range, "scan x / mm", "scan y / mm");
  AwAxis scale = aw_axis_cover(0, raster(NULL, f, &axes, NULL), FALSE, "expected rms error per axis / µm");
  cairo_set_antialias(page.cr, CAIRO_ANTIALIAS_NONE); /* no seams between the cells */
  raster(page.cr, f, &axes, &scale);
  cairo_set_antialias(page.cr, CAIRO_ANTIALIAS_DEFAULT);
  aw_axes_draw(page.cr, &axes);
  cairo_save(page.cr);
  aw_axes_clip(page.cr, &axes);
  draw_places(&page, f, &axes);
  cairo_restore(page.cr);
  double bar[4] = { axes.x + axes.width + 30 * page.u, page.top, 26 * page.u, 400 * page.u };
  aw_page_shade_scale(&page, bar, &scale);
  return aw_page_close(&page, error);
}

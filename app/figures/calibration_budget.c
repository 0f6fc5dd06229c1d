/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/text.h"
#include "figures/calibration.h"
#include "figures/label.h"
#include "figures/page.h"

#define ROW 64.0

/* Hatching that leaves no doubt that a bar was not measured. */
static void hatch(cairo_t *cr, double x, double y, double w, double h, double u)
{
  cairo_save(cr);
  cairo_rectangle(cr, x, y, w, h);
  cairo_clip(cr);
  cairo_set_line_width(cr, 1.6 * u);
  int n = (int)ceil((w + h) / (9 * u));
  for (int i = 0; i < n; i++) {
    double s = 9 * u * i - h;
    cairo_move_to(cr, x + s, y + h);
    cairo_line_to(cr, x + s + h, y);
  }
  cairo_stroke(cr);
  cairo_restore(cr);
}

static void draw_bar(cairo_t *cr, const double box[4], AwInk ink, gboolean assumed, double u)
{
  aw_style_set_ink(cr, ink);
  if (assumed)
    hatch(cr, box[0], box[1], box[2], box[3], u);
  cairo_rectangle(cr, box[0], box[1], box[2], box[3]);
  if (!assumed)
    cairo_fill_preserve(cr);
  cairo_set_line_width(cr, 1.6 * u);
  cairo_stroke(cr);
}

/* One row: a name, a note below it, and the rms in x and y. */
typedef struct {
  const char *name, *note;
  double s[2];
  AwInk ink;
  gboolean assumed;
} Row;

static void draw_row(AwPage *page, const AwAxes *axes, const Row *row, double y)
{
  double u = page->u;
  AwLabel label = { .size = 20 * u, .ink = aw_ink_text, .align = AW_ALIGN_RIGHT };
  AwLabel small = { .size = 16 * u, .ink = row->assumed ? aw_ink_warn : aw_ink_faint, .align = AW_ALIGN_RIGHT };
  aw_label_draw(page->cr, &label, row->name, axes->x - 16 * u, y + 4 * u);
  aw_label_draw(page->cr, &small, row->note, axes->x - 16 * u, y + 29 * u);
  for (int i = 0; i < 2; i++) {
    double box[4] = { axes->x, y + (5 + 22 * i) * u, fmax(aw_axes_x(axes, row->s[i]) - axes->x, 1), 19 * u };
    g_autofree char *value = aw_text_from_double(row->s[i], 2);
    g_autofree char *text = g_strdup_printf("%s %s", i ? "y" : "x", value);
    AwLabel number = { .size = 16 * u, .ink = aw_ink_text };
    draw_bar(page->cr, box, row->ink, row->assumed, u);
    aw_label_draw(page->cr, &number, text, box[0] + box[2] + 8 * u, box[1]);
  }
}

static void draw_rows(AwPage *page, const AwAxes *axes, const AwBudget *b, double y)
{
  for (int i = 0; i < AW_N_TERMS; i++, y += ROW * page->u) {
    const AwBudgetTerm *t = &b->term[i];
    g_autofree char *share = aw_text_from_double(100 * t->share, 0);
    g_autofree char *note = g_strdup_printf("%s, %s %%", aw_origin_name(t->origin), share);
    AwInk ink = aw_term_kind(t->id) == AW_TERM_DISH ? aw_ink_data : aw_ink_fit;
    Row row = { aw_term_name(t->id), note, { t->sx_um, t->sy_um }, ink, t->origin == AW_ORIGIN_ASSUMED };
    draw_row(page, axes, &row, y);
  }
  const Row sums[] = {
    { "all dish-wide", "one draw for the run", { b->dish_sx_um, b->dish_sy_um }, aw_ink_data, FALSE },
    { "all per target", "a fresh draw each", { b->target_sx_um, b->target_sy_um }, aw_ink_fit, FALSE },
    { "together", "", { b->sx_um, b->sy_um }, aw_ink_text, FALSE },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(sums); i++)
    draw_row(page, axes, &sums[i], y + (10 + ROW * (double)i) * page->u);
}

static char *age_text(const char *what, double age_s, const char *unknown)
{
  g_autofree char *hours = aw_text_from_double(fabs(age_s) / 3600, 1);
  return isnan(age_s) ? g_strdup_printf("%s %s", what, unknown)
                      : g_strdup_printf("%s %s h %s", what, hours, age_s < 0 ? "later" : "ago");
}

gboolean aw_figure_budget(const AwBudget *budget, const char *path, GError **error)
{
  AwPage page;
  g_autofree char *scan = age_text("Scan", budget->scan_age_s, "of unknown age, one hour assumed");
  g_autofree char *check = age_text("beam check", budget->check_age_s, "never, four hours assumed");
  g_autofree char *below = g_strdup_printf("Blue: dish-wide. Orange: fresh at every target. Hatched: assumed, nobody "
                                           "measured it. %s; %s.",
                                           scan, check);
  if (!aw_page_open(&page, path, "Aim-error budget, rms per axis", below, error))
    return FALSE;
  double u = page.u, left = 230 * u;
  AwAxes axes = { .x = left, .y = page.top, .width = page.width - left - 110 * u, .u = u, .grid = TRUE };
  axes.height = (11 * ROW + 14) * u;
  axes.across = aw_axis_cover(0, fmax(budget->sx_um, budget->sy_um), FALSE, "rms per axis / µm");
  axes.up = (AwAxis){ 0, 1, FALSE, NULL };
  aw_axes_draw_across(page.cr, &axes);
  draw_rows(&page, &axes, budget, page.top);
  return aw_page_close(&page, error);
}

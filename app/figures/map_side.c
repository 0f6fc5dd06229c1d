/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "figures/label.h"
#include "figures/map_parts.h"

#define TEXT 17.0
#define SMALL 14.0
#define LINE 30.0 /* height of a row of the legend, u */
#define CHIP_W 46.0
#define CHIP_H 24.0

/* Each block draws at (x, y) within `width` and returns the height it used. */
typedef double (*Block)(const AwMapPage *page, double x, double y, double width);

static double heading(const AwMapPage *page, double x, double y, double width, const char *text)
{
  AwLabel label = { .size = TEXT * page->u, .bold = TRUE, .ink = aw_ink_text, .max_width = width };
  return aw_label_draw(page->cr, &label, text, x, y) + 8 * page->u;
}

static double paragraph(const AwMapPage *page, double x, double y, double width, const char *text)
{
  AwLabel label = { .size = SMALL * page->u, .ink = aw_ink_faint, .max_width = width, .max_lines = 4 };
  return aw_label_draw(page->cr, &label, text, x, y) + 6 * page->u;
}

/* A piece of the dish's dark ground, so that a sample looks as it does in the dish. */
static void chip(const AwMapPage *page, double x, double y)
{
  double u = page->u;
  aw_style_set_ink(page->cr, aw_ink_night);
  aw_style_round_rect(page->cr, x, y, CHIP_W * u, CHIP_H * u, 4 * u);
  cairo_fill(page->cr);
}

static void state_row(const AwMapPage *page, double x, double y, double width, AwState state)
{
  double u = page->u, cy = y + CHIP_H * u / 2, cx = x + CHIP_W * u / 2;
  const AwLook *look = aw_look_of_state(state);
  chip(page, x, y);
  cairo_save(page->cr);
  cairo_translate(page->cr, cx, cy);
  cairo_scale(page->cr, 1.5, 1);
  cairo_arc(page->cr, 0, 0, 8.5 * u, 0, 2 * G_PI);
  cairo_restore(page->cr);
  aw_style_set_line(page->cr, look, u);
  cairo_stroke(page->cr);
  aw_style_draw_glyph(page->cr, look->glyph, cx, cy, 3.6 * u);
  g_autofree char *count = aw_label_count(page->n_in_state[state]);
  AwLabel name = { .size = TEXT * u, .ink = aw_ink_text };
  AwLabel number = { .size = TEXT * u, .bold = TRUE, .ink = aw_ink_text, .align = AW_ALIGN_RIGHT };
  aw_label_draw(page->cr, &name, aw_state_name(state), x + (CHIP_W + 10) * u, y + 1.5 * u);
  aw_label_draw(page->cr, &number, count, x + width, y + 1.5 * u);
}

static double nuclei_block(const AwMapPage *page, double x, double y, double width)
{
  static const AwState order[] = { AW_STATE_ACCEPTED, AW_STATE_PROPOSED, AW_STATE_REJECTED, AW_STATE_FOUND };
  double u = page->u, used = 0;
  gsize n = page->content->nuclei ? page->content->nuclei->len : 0;
  g_autofree char *count = aw_label_count(n);
  g_autofree char *title = g_strdup_printf(n == 1 ? "%s nucleus" : "%s nuclei", count);
  used += heading(page, x, y, width, n ? title : "No nuclei yet");
  for (gsize i = 0; i < G_N_ELEMENTS(order); i++, used += LINE * u)
    state_row(page, x, y + used, width, order[i]);
  return used;
}

static void tour_sample(const AwMapPage *page, double x, double y)
{
  double u = page->u, cy = y + CHIP_H * u / 2;
  chip(page, x, y);
  aw_style_set_ink(page->cr, aw_ink_tour);
  cairo_set_dash(page->cr, NULL, 0, 0);
  cairo_set_line_width(page->cr, 1.7 * u);
  cairo_move_to(page->cr, x + 8 * u, cy);
  cairo_line_to(page->cr, x + (CHIP_W - 8) * u, cy);
  cairo_stroke(page->cr);
  aw_style_arrow_head(page->cr, x + (CHIP_W / 2 + 6) * u, cy, 1, 0, 11 * u);
  cairo_arc(page->cr, x + 8 * u, cy, 4.5 * u, 0, 2 * G_PI);
  cairo_rectangle(page->cr, x + (CHIP_W - 12) * u, cy - 4 * u, 8 * u, 8 * u);
  cairo_fill(page->cr);
}

static double tour_block(const AwMapPage *page, double x, double y, double width)
{
  double u = page->u;
  if (page->n_stops == 0)
    return heading(page, x, y, width, "No tour yet");
  g_autofree char *count = aw_label_count(page->n_stops), *length = aw_label_length(page->tour_um);
  g_autofree char *title = g_strdup_printf(page->n_stops == 1 ? "Tour of %s stop" : "Tour of %s stops", count);
  double used = heading(page, x, y, width, title);
  tour_sample(page, x, y + used);
  AwLabel label = { .size = TEXT * u, .ink = aw_ink_text, .max_width = width - (CHIP_W + 10) * u };
  g_autofree char *text = g_strdup_printf("%s of travel", length);
  aw_label_draw(page->cr, &label, text, x + (CHIP_W + 10) * u, y + used + 1.5 * u);
  used += LINE * u;
  return used + paragraph(page, x, y + used, width, "Disc: start. Square: end. Numbers count the stops.");
}

/* One arrow of the axis cross: the page direction in which a scan coordinate grows. */
static void axis_arrow(const AwMapPage *page, double x, double y, double dx, double dy, const char *text)
{
  double u = page->u, d = hypot(dx, dy), len = 34 * u, h;
  double ux = dx / d, uy = dy / d;
  AwLabel label = { .size = SMALL * u, .bold = TRUE, .ink = aw_ink_text, .align = AW_ALIGN_CENTRE };
  aw_style_set_ink(page->cr, aw_ink_text);
  cairo_set_dash(page->cr, NULL, 0, 0);
  cairo_set_line_width(page->cr, 2 * u);
  cairo_move_to(page->cr, x, y);
  cairo_line_to(page->cr, x + ux * (len - 6 * u), y + uy * (len - 6 * u));
  cairo_stroke(page->cr);
  aw_style_arrow_head(page->cr, x + ux * len, y + uy * len, dx, dy, 11 * u);
  aw_label_measure(page->cr, &label, text, NULL, &h);
  aw_label_draw(page->cr, &label, text, x + ux * (len + 13 * u), y + uy * (len + 11 * u) - h / 2);
}

static double axes_block(const AwMapPage *page, double x, double y, double width)
{
  double u = page->u, used = heading(page, x, y, width, "Scan stage axes");
  AwMatrix m = page->upright.px_per_um;
  double cx = x + 60 * u, cy = y + used + 52 * u;
  axis_arrow(page, cx, cy, m.xx, m.yx, "+x");
  axis_arrow(page, cx, cy, m.xy, m.yy, "+y");
  paragraph(page, x + 122 * u, y + used + 8 * u, width - 122 * u,
            "Arrows: where scan coordinates grow. Pictures stand as in the microscope.");
  return used + 112 * u;
}

static gboolean any_picture(GPtrArray *frames)
{
  for (guint i = 0; frames && i < frames->len; i++)
    if (((const AwFrame *)frames->pdata[i])->overview)
      return TRUE;
  return FALSE;
}

/* What is missing, as the next step to take. */
static const char *hint(const AwMapPage *page)
{
  const AwMapContent *content = page->content;
  if (!content->frames || content->frames->len == 0)
    return "Start the record from a scan table or from images with positions.";
  if (!content->nuclei || content->nuclei->len == 0)
    return "Segment the scan to find its nuclei.";
  if (page->n_in_state[AW_STATE_ACCEPTED] + page->n_in_state[AW_STATE_PROPOSED] == 0)
    return "Choose nuclei by gates or by hand; none is proposed or accepted.";
  if (page->n_stops == 0)
    return "Route the targets to order them.";
  return NULL;
}

static double next_block(const AwMapPage *page, double x, double y, double width)
{
  const char *text = hint(page);
  gboolean pictures = any_picture(page->content->frames);
  double used = 0;
  if (text) {
    AwLabel label = { .size = TEXT * page->u, .ink = aw_ink_text, .max_width = width, .max_lines = 4 };
    used += heading(page, x, y, width, "Next step");
    used += aw_label_draw(page->cr, &label, text, x, y + used) + 8 * page->u;
  }
  if (!pictures && page->content->frames && page->content->frames->len > 0)
    used +=
        paragraph(page, x, y + used, width, "The record holds no pictures of its frames; only their places are drawn.");
  return used;
}

void aw_map_draw_side(const AwMapPage *page, double x, double y, double width, gboolean in_row)
{
  static const Block blocks[] = { nuclei_block, tour_block, axes_block, next_block };
  const gsize n = G_N_ELEMENTS(blocks);
  double u = page->u, column = (width - ((double)n - 1) * 30 * u) / (double)n;
  for (gsize i = 0; i < n; i++) {
    if (blocks[i] == axes_block && !page->placed)
      continue;
    double used = blocks[i](page, x, y, in_row ? column : width);
    if (in_row)
      x += column + 30 * u;
    else if (used > 0)
      y += used + 20 * u;
  }
}

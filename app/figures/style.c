/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/style.h"

const AwInk aw_ink_text = { 0.11, 0.13, 0.16, 1 };
const AwInk aw_ink_faint = { 0.38, 0.41, 0.45, 1 };
const AwInk aw_ink_hair = { 0.80, 0.82, 0.84, 1 };
const AwInk aw_ink_night = { 0.085, 0.10, 0.125, 1 };
const AwInk aw_ink_casing = { 0.04, 0.05, 0.07, 0.75 };
const AwInk aw_ink_tour = { 1, 1, 1, 1 };

static const AwLook looks[] = {
  [AW_STATE_FOUND] = { { 0.58, 0.615, 0.66, 1 }, 1.4, { 0.5, 2.6 }, 2, AW_GLYPH_NONE },
  [AW_STATE_PROPOSED] = { { 1.0, 0.82, 0.29, 1 }, 2.0, { 5, 2.8 }, 2, AW_GLYPH_DIAMOND },
  [AW_STATE_ACCEPTED] = { { 0.22, 0.74, 0.97, 1 }, 2.3, { 0 }, 0, AW_GLYPH_DISC },
  [AW_STATE_REJECTED] = { { 0.97, 0.40, 0.25, 1 }, 2.0, { 5, 2.6, 0.4, 2.6 }, 4, AW_GLYPH_CROSS },
};

const AwLook *aw_look_of_state(AwState state)
{
  g_return_val_if_fail((gsize)state < G_N_ELEMENTS(looks), &looks[AW_STATE_FOUND]);
  return &looks[state];
}

double aw_style_unit(double width, double height)
{
  return MAX(MIN(width / 1333.0, height / 1000.0), 0.45);
}

void aw_style_set_ink(cairo_t *cr, AwInk ink)
{
  cairo_set_source_rgba(cr, ink.r, ink.g, ink.b, ink.a);
}

void aw_style_set_line(cairo_t *cr, const AwLook *look, double u)
{
  double dash[4];
  for (int i = 0; i < look->n_dash; i++)
    dash[i] = look->dash[i] * u;
  cairo_set_dash(cr, dash, look->n_dash, 0);
  cairo_set_line_width(cr, look->width * u);
  cairo_set_line_cap(cr, look->n_dash ? CAIRO_LINE_CAP_ROUND : CAIRO_LINE_CAP_BUTT);
  cairo_set_line_join(cr, CAIRO_LINE_JOIN_ROUND);
  aw_style_set_ink(cr, look->ink);
}

static void diamond(cairo_t *cr, double x, double y, double r)
{
  cairo_move_to(cr, x, y - r);
  cairo_line_to(cr, x + r, y);
  cairo_line_to(cr, x, y + r);
  cairo_line_to(cr, x - r, y);
  cairo_close_path(cr);
}

static void cross(cairo_t *cr, double x, double y, double r)
{
  cairo_move_to(cr, x - r, y - r);
  cairo_line_to(cr, x + r, y + r);
  cairo_move_to(cr, x - r, y + r);
  cairo_line_to(cr, x + r, y - r);
}

static void plus(cairo_t *cr, double x, double y, double r)
{
  cairo_move_to(cr, x - r, y);
  cairo_line_to(cr, x + r, y);
  cairo_move_to(cr, x, y - r);
  cairo_line_to(cr, x, y + r);
}

static void triangle(cairo_t *cr, double x, double y, double r)
{
  cairo_move_to(cr, x, y - r);
  cairo_line_to(cr, x + r, y + r * 0.8);
  cairo_line_to(cr, x - r, y + r * 0.8);
  cairo_close_path(cr);
}

void aw_style_draw_glyph(cairo_t *cr, AwGlyph glyph, double x, double y, double r)
{
  cairo_set_dash(cr, NULL, 0, 0);
  cairo_set_line_width(cr, r * (glyph == AW_GLYPH_CROSS ? 0.62 : 0.5));
  cairo_set_line_cap(cr, CAIRO_LINE_CAP_BUTT);
  cairo_new_path(cr);
  switch (glyph) {
  case AW_GLYPH_NONE:
    break;
  case AW_GLYPH_RING:
    cairo_arc(cr, x, y, r * 0.75, 0, 2 * G_PI);
    cairo_stroke(cr);
    break;
  case AW_GLYPH_DIAMOND:
    diamond(cr, x, y, r);
    cairo_stroke(cr);
    break;
  case AW_GLYPH_DISC:
    cairo_arc(cr, x, y, r, 0, 2 * G_PI);
    cairo_fill(cr);
    break;
  case AW_GLYPH_CROSS:
    cross(cr, x, y, r);
    cairo_stroke(cr);
    break;
  case AW_GLYPH_PLUS:
    plus(cr, x, y, r);
    cairo_set_line_width(cr, r * 0.3);
    cairo_stroke(cr);
    break;
  case AW_GLYPH_TRIANGLE:
    triangle(cr, x, y, r);
    cairo_fill(cr);
    break;
  }
}

void aw_style_round_rect(cairo_t *cr, double x, double y, double w, double h, double r)
{
  r = MIN(r, MIN(w, h) / 2);
  cairo_new_path(cr);
  cairo_arc(cr, x + w - r, y + r, r, -G_PI / 2, 0);
  cairo_arc(cr, x + w - r, y + h - r, r, 0, G_PI / 2);
  cairo_arc(cr, x + r, y + h - r, r, G_PI / 2, G_PI);
  cairo_arc(cr, x + r, y + r, r, G_PI, 3 * G_PI / 2);
  cairo_close_path(cr);
}

void aw_style_arrow_head(cairo_t *cr, double x, double y, double dx, double dy, double len)
{
  double d = hypot(dx, dy);
  if (!(d > 0))
    return;
  double ux = dx / d * len, uy = dy / d * len;
  cairo_new_path(cr);
  cairo_move_to(cr, x, y);
  cairo_line_to(cr, x - ux - uy * 0.42, y - uy + ux * 0.42);
  cairo_line_to(cr, x - ux * 0.72, y - uy * 0.72);
  cairo_line_to(cr, x - ux + uy * 0.42, y - uy - ux * 0.42);
  cairo_close_path(cr);
  cairo_fill(cr);
}

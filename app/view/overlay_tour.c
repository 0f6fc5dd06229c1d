/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/overlay_parts.h"

#define MAX_STROKED 200 /* legs that cairo strokes in one redraw */
#define MAX_ARROWS 80
#define MAX_CAUTIONS 400

static AwScreenPoint stop(const AwPass *pass, gsize i)
{
  guint nucleus = pass->scene->tour[i];
  const AwNucleus *n = pass->scene->nuclei->pdata[nucleus];
  return aw_pass_point(pass, pass->scene->aim ? pass->scene->aim[nucleus] : n->centroid);
}

static gboolean in_view(const AwPass *pass, AwScreenPoint a, AwScreenPoint b)
{
  return MAX(a.sx, b.sx) >= 0 && MIN(a.sx, b.sx) <= pass->view->width && MAX(a.sy, b.sy) >= 0 &&
         MIN(a.sy, b.sy) <= pass->view->height && fabs(a.sx - b.sx) + fabs(a.sy - b.sy) < 1e7;
}

static gsize count_legs(const AwPass *pass)
{
  gsize n = 0;
  for (gsize i = 0; i + 1 < pass->scene->n_tour; i++)
    n += in_view(pass, stop(pass, i), stop(pass, i + 1));
  return n;
}

static AwInk leg_ink(const AwPass *pass, gsize leg)
{
  AwInk ink = aw_ink_tour;
  ink.a = leg + 1 < pass->scene->n_done ? 0.35 : 1;
  return ink;
}

static void stroke_leg(const AwPass *pass, AwScreenPoint a, AwScreenPoint b, AwInk ink)
{
  cairo_move_to(pass->cr, a.sx, a.sy);
  cairo_line_to(pass->cr, b.sx, b.sy);
  cairo_set_line_width(pass->cr, 3 * pass->u);
  aw_style_set_ink(pass->cr, aw_ink_casing);
  cairo_stroke_preserve(pass->cr);
  cairo_set_line_width(pass->cr, 1.4 * pass->u);
  aw_style_set_ink(pass->cr, ink);
  cairo_stroke(pass->cr);
}

void aw_overlay_tour(const AwPass *pass)
{
  if (!pass->scene->tour || pass->scene->n_tour < 2)
    return;
  gboolean stroked = count_legs(pass) <= MAX_STROKED;
  cairo_set_dash(pass->cr, NULL, 0, 0);
  cairo_set_line_cap(pass->cr, CAIRO_LINE_CAP_ROUND);
  for (gsize i = 0; i + 1 < pass->scene->n_tour; i++) {
    AwScreenPoint a = stop(pass, i), b = stop(pass, i + 1);
    if (!in_view(pass, a, b))
      continue;
    if (stroked)
      stroke_leg(pass, a, b, leg_ink(pass, i));
    else
      aw_raster_line(pass->raster, a.sx, a.sy, b.sx, b.sy, leg_ink(pass, i));
  }
}

static void arrow(const AwPass *pass, AwScreenPoint a, AwScreenPoint b, double length)
{
  double dx = b.sx - a.sx, dy = b.sy - a.sy, size = 9 * pass->u, at = 0.5 + 0.5 * size / length;
  aw_style_set_ink(pass->cr, aw_ink_casing);
  aw_style_arrow_head(pass->cr, a.sx + dx * (at + 0.25 * size / length), a.sy + dy * (at + 0.25 * size / length), dx,
                      dy, size * 1.5);
  aw_style_set_ink(pass->cr, aw_ink_tour);
  aw_style_arrow_head(pass->cr, a.sx + dx * at, a.sy + dy * at, dx, dy, size);
}

/* Arrow heads along the part of the tour in view, at regular spacing, on legs long enough to carry one. */
static void draw_arrows(const AwPass *pass)
{
  double gone = 0, next = 0, seen = 0;
  gsize n_tour = pass->scene->n_tour;
  for (int round = 0; round < 2; round++) /* first measures how much is in view */
    for (gsize i = 0; i + 1 < n_tour; i++) {
      AwScreenPoint a = stop(pass, i), b = stop(pass, i + 1);
      double length = hypot(b.sx - a.sx, b.sy - a.sy);
      if (!in_view(pass, a, b))
        continue;
      if (round == 0) {
        seen += length;
        continue;
      }
      gone += length;
      if (gone < next || length < 14 * pass->u)
        continue;
      arrow(pass, a, b, length);
      next = gone + MAX(80 * pass->u, seen / MAX_ARROWS);
    }
}

static void draw_end(const AwPass *pass, AwScreenPoint at, gboolean start)
{
  double r = 6 * pass->u;
  if (!in_view(pass, at, at))
    return;
  cairo_new_path(pass->cr);
  if (start)
    cairo_arc(pass->cr, at.sx, at.sy, r, 0, 2 * G_PI);
  else
    cairo_rectangle(pass->cr, at.sx - r * 0.9, at.sy - r * 0.9, r * 1.8, r * 1.8);
  aw_style_set_ink(pass->cr, aw_ink_tour);
  cairo_fill_preserve(pass->cr);
  cairo_set_line_width(pass->cr, 2 * pass->u);
  aw_style_set_ink(pass->cr, aw_ink_night);
  cairo_stroke(pass->cr);
}

/* A small triangle at the upper right of a nucleus that asks for care. */
static void draw_caution(const AwPass *pass, AwScreenPoint at)
{
  double r = 4.5 * pass->u, off = pass->size * 0.42 + 2 * pass->u, x = at.sx + off, y = at.sy - off;
  cairo_new_path(pass->cr);
  cairo_move_to(pass->cr, x, y - r);
  cairo_line_to(pass->cr, x + r, y + r * 0.8);
  cairo_line_to(pass->cr, x - r, y + r * 0.8);
  cairo_close_path(pass->cr);
  aw_style_set_ink(pass->cr, aw_ink_tour);
  cairo_fill_preserve(pass->cr);
  cairo_set_line_width(pass->cr, 1.5 * pass->u);
  aw_style_set_ink(pass->cr, aw_ink_night);
  cairo_stroke(pass->cr);
}

static void draw_cautions(const AwPass *pass, const GArray *item)
{
  if (!pass->scene->marks || pass->size < 8 * pass->u)
    return;
  guint n = 0;
  for (guint k = 0; k < item->len && n < MAX_CAUTIONS; k++) {
    guint i = g_array_index(item, guint, k);
    const AwNucleus *nucleus = pass->scene->nuclei->pdata[i];
    if (!(pass->scene->marks[i] & AW_MARK_CAUTION))
      continue;
    draw_caution(pass, aw_pass_point(pass, nucleus->centroid));
    n++;
  }
}

/* Four corners round the nucleus being decided, never smaller than can be seen from afar. */
static void draw_brackets(const AwPass *pass)
{
  const AwNucleus *nucleus = pass->scene->nuclei->pdata[pass->scene->current];
  AwScreenPoint at = aw_pass_point(pass, nucleus->centroid);
  double size = nucleus->diameter / pass->scene->nucleus_um * pass->size;
  double r = MAX(size * 0.75, 12 * pass->u), arm = r * 0.45;
  if (!isfinite(at.sx + at.sy + r))
    return;
  cairo_new_path(pass->cr);
  for (int k = 0; k < 4; k++) {
    double sx = k & 1 ? 1 : -1, sy = k & 2 ? 1 : -1;
    cairo_move_to(pass->cr, at.sx + sx * r, at.sy + sy * (r - arm));
    cairo_line_to(pass->cr, at.sx + sx * r, at.sy + sy * r);
    cairo_line_to(pass->cr, at.sx + sx * (r - arm), at.sy + sy * r);
  }
  cairo_set_dash(pass->cr, NULL, 0, 0);
  cairo_set_line_width(pass->cr, 4.5 * pass->u);
  aw_style_set_ink(pass->cr, aw_ink_casing);
  cairo_stroke_preserve(pass->cr);
  cairo_set_line_width(pass->cr, 2.2 * pass->u);
  aw_style_set_ink(pass->cr, aw_ink_tour);
  cairo_stroke(pass->cr);
}

void aw_overlay_signs(const AwPass *pass, const GArray *item)
{
  const AwScene *scene = pass->scene;
  if (scene->tour && scene->n_tour > 0) {
    draw_arrows(pass);
    if (scene->n_tour > 1)
      draw_end(pass, stop(pass, scene->n_tour - 1), FALSE);
    draw_end(pass, stop(pass, 0), TRUE);
  }
  draw_cautions(pass, item);
  if (scene->current >= 0 && (guint)scene->current < scene->nuclei->len)
    draw_brackets(pass);
}

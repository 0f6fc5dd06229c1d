/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/overlay_parts.h"

#define MAX_SEAMED 700 /* legs in view that get a dark seam */
#define MAX_ARROWS 80

AwScreenPoint *aw_overlay_stops(const AwPass *pass)
{
  const AwScene *scene = pass->scene;
  AwScreenPoint *stop = scene->tour && scene->n_tour > 0 ? g_new(AwScreenPoint, scene->n_tour) : NULL;
  const AwScanPoint *at = scene->aim ? scene->aim : pass->centroid;
  for (gsize i = 0; stop && i < scene->n_tour; i++)
    stop[i] = aw_pass_point(pass, at[scene->tour[i]]);
  return stop;
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
    n += in_view(pass, pass->stop[i], pass->stop[i + 1]);
  return n;
}

void aw_overlay_tour(const AwPass *pass)
{
  gsize n = pass->stop ? pass->scene->n_tour : 0;
  AwStroke seam = { .ink = aw_ink_casing, .width = 3 * pass->u }, line = { .width = 1.4 * pass->u };
  gboolean crowded = n > MAX_SEAMED && count_legs(pass) > MAX_SEAMED;
  for (gsize i = 0; i + 1 < n; i++) {
    AwScreenPoint a = pass->stop[i], b = pass->stop[i + 1];
    if (!in_view(pass, a, b))
      continue;
    line.ink = aw_ink_tour;
    line.ink.a = i + 1 < pass->scene->n_done ? 0.35 : 1;
    line.width = crowded ? pass->u : 1.4 * pass->u;
    if (!crowded)
      aw_raster_line(pass->raster, &seam, a.sx, a.sy, b.sx, b.sy);
    aw_raster_line(pass->raster, &line, a.sx, a.sy, b.sx, b.sy);
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
      AwScreenPoint a = pass->stop[i], b = pass->stop[i + 1];
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

void aw_overlay_signs(const AwPass *pass)
{
  const AwScene *scene = pass->scene;
  if (pass->stop) {
    draw_arrows(pass);
    if (scene->n_tour > 1)
      draw_end(pass, pass->stop[scene->n_tour - 1], FALSE);
    draw_end(pass, pass->stop[0], TRUE);
  }
  if (scene->current >= 0 && (guint)scene->current < scene->nuclei->len)
    draw_brackets(pass);
}

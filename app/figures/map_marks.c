/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdlib.h>

#include "figures/label.h"
#include "figures/map_parts.h"
#include "figures/scalebar.h"

#define OUTLINE_FROM 5.0 /* typical diameter from which outlines are drawn, u; below it marks stand in */
#define GLYPH_FROM 6.0   /* diameter from which an outline carries its state's glyph, u */
#define CASING_FROM 7.0  /* diameter from which outlines get a dark seam, u */
#define MAX_ARROWS 160
#define CHUNK 48 /* stops per stroke: cairo's cost grows fast with the crossings inside one path */

/* From the least to the most important, which is drawn last. */
static const AwState draw_order[AW_N_STATES] = { AW_STATE_FOUND, AW_STATE_REJECTED, AW_STATE_PROPOSED,
                                                 AW_STATE_ACCEPTED };

AwState aw_map_page_state(const AwMapPage *page, guint nucleus)
{
  AwState state = page->content->state ? page->content->state[nucleus] : AW_STATE_FOUND;
  return (guint)state < AW_N_STATES ? state : AW_STATE_FOUND;
}

static int by_size(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* The median diameter of all nuclei, um; 0 without any. */
static double median_diameter(GPtrArray *nuclei)
{
  g_autofree double *sizes = g_new(double, nuclei->len + 1);
  gsize n = 0;
  for (guint i = 0; i < nuclei->len; i++) {
    double d = ((const AwNucleus *)nuclei->pdata[i])->diameter;
    if (d > 0 && isfinite(d))
      sizes[n++] = d;
  }
  qsort(sizes, n, sizeof *sizes, by_size);
  return n ? sizes[n / 2] : 0;
}

static void find_stops(AwMapPage *page)
{
  const AwMapContent *content = page->content;
  g_autoptr(GHashTable) by_id = g_hash_table_new(g_int64_hash, g_int64_equal);
  for (guint i = 0; i < content->nuclei->len; i++) {
    AwNucleus *nucleus = content->nuclei->pdata[i];
    g_hash_table_insert(by_id, &nucleus->id, nucleus);
  }
  page->stops = g_new(AwPixelPoint, content->n_tour + 1);
  const AwNucleus *last = NULL;
  for (gsize i = 0; i < content->n_tour; i++) {
    const AwNucleus *nucleus = g_hash_table_lookup(by_id, &content->tour[i]);
    if (!nucleus || !aw_scan_point_is_sane(nucleus->centroid))
      continue;
    page->stops[page->n_stops++] = aw_map_page_point(page, nucleus->centroid);
    if (last)
      page->tour_um +=
          hypot(nucleus->centroid.x_um - last->centroid.x_um, nucleus->centroid.y_um - last->centroid.y_um);
    last = nucleus;
  }
}

void aw_map_page_measure(AwMapPage *page)
{
  GPtrArray *nuclei = page->content->nuclei;
  if (!nuclei)
    return;
  for (guint i = 0; i < nuclei->len; i++)
    page->n_in_state[aw_map_page_state(page, i)]++;
  if (!page->placed)
    return;
  page->nucleus_size = median_diameter(nuclei) / aw_pixel_map_scale(&page->content->map) * page->scale;
  if (page->content->tour && page->content->n_tour > 0)
    find_stops(page);
}

void aw_map_page_clear(AwMapPage *page)
{
  g_clear_pointer(&page->stops, g_free);
}

/* Adds the outline as a closed path; points nearer than 0.7 of a page pixel to the last are left out. */
static gboolean outline_path(const AwMapPage *page, const AwNucleus *nucleus)
{
  AwPixelPoint last = { 0, 0 };
  cairo_new_path(page->cr);
  for (gsize i = 0; i < nucleus->n_outline; i++) {
    if (!aw_scan_point_is_sane(nucleus->outline[i])) {
      cairo_new_path(page->cr);
      return FALSE;
    }
    AwPixelPoint p = aw_map_page_point(page, nucleus->outline[i]);
    if (i > 0 && hypot(p.x_px - last.x_px, p.y_px - last.y_px) < 0.7)
      continue;
    cairo_line_to(page->cr, p.x_px, p.y_px);
    last = p;
  }
  cairo_close_path(page->cr);
  return nucleus->n_outline >= 3;
}

static void draw_outline(const AwMapPage *page, const AwNucleus *nucleus, const AwLook *look)
{
  double unit = CLAMP(page->nucleus_size / 12, 0.6 * page->u, page->u); /* thinner when nuclei are small */
  if (!outline_path(page, nucleus))
    return;
  if (page->nucleus_size >= CASING_FROM * page->u) {
    cairo_set_dash(page->cr, NULL, 0, 0);
    cairo_set_line_width(page->cr, (look->width + 1.8) * unit);
    aw_style_set_ink(page->cr, aw_ink_casing);
    cairo_stroke_preserve(page->cr);
  }
  aw_style_set_line(page->cr, look, unit);
  cairo_stroke(page->cr);
}

static void draw_glyph(const AwMapPage *page, const AwNucleus *nucleus, const AwLook *look, double r)
{
  if (!aw_scan_point_is_sane(nucleus->centroid))
    return;
  AwPixelPoint p = aw_map_page_point(page, nucleus->centroid);
  aw_style_set_ink(page->cr, look->ink);
  aw_style_draw_glyph(page->cr, look->glyph, p.x_px, p.y_px, r);
}

/* Half width of the marks that stand for nuclei too small to outline: never so large that the dish clogs up. */
static double mark_size(const AwMapPage *page)
{
  double pitch = sqrt(page->width * page->height / (page->content->nuclei->len + 1.0));
  return CLAMP(page->nucleus_size * 0.5, MIN(1.2, 1.2 * page->u), MAX(1.2, MIN(4 * page->u, pitch * 0.3)));
}

static void draw_nucleus(const AwMapPage *page, const AwNucleus *nucleus, AwState state, double mark)
{
  const AwLook *look = aw_look_of_state(state);
  AwLook small = *look;
  if (small.glyph == AW_GLYPH_NONE)
    small.glyph = AW_GLYPH_RING;
  if (page->nucleus_size < OUTLINE_FROM * page->u) {
    draw_glyph(page, nucleus, &small, mark);
    return;
  }
  draw_outline(page, nucleus, look);
  if (page->nucleus_size >= GLYPH_FROM * page->u)
    draw_glyph(page, nucleus, look, CLAMP(page->nucleus_size * 0.18, 1.6 * page->u, 7 * page->u));
}

void aw_map_draw_nuclei(const AwMapPage *page)
{
  GPtrArray *nuclei = page->content->nuclei;
  if (!nuclei || nuclei->len == 0)
    return;
  double mark = mark_size(page);
  for (int s = 0; s < AW_N_STATES; s++)
    for (guint i = 0; i < nuclei->len; i++)
      if (aw_map_page_state(page, i) == draw_order[s])
        draw_nucleus(page, nuclei->pdata[i], draw_order[s], mark);
}

static void stroke_tour(const AwMapPage *page, double width, AwInk ink)
{
  aw_style_set_ink(page->cr, ink);
  cairo_set_dash(page->cr, NULL, 0, 0);
  cairo_set_line_width(page->cr, width);
  cairo_set_line_join(page->cr, CAIRO_LINE_JOIN_ROUND);
  cairo_set_line_cap(page->cr, CAIRO_LINE_CAP_ROUND);
  for (gsize i = 0; i + 1 < page->n_stops; i += CHUNK) {
    for (gsize k = i; k <= MIN(i + CHUNK, page->n_stops - 1); k++)
      cairo_line_to(page->cr, page->stops[k].x_px, page->stops[k].y_px);
    cairo_stroke(page->cr);
  }
}

static double leg(const AwMapPage *page, gsize i)
{
  return hypot(page->stops[i + 1].x_px - page->stops[i].x_px, page->stops[i + 1].y_px - page->stops[i].y_px);
}

static void arrow_on_leg(const AwMapPage *page, gsize i, double size)
{
  AwPixelPoint a = page->stops[i], b = page->stops[i + 1];
  double dx = b.x_px - a.x_px, dy = b.y_px - a.y_px, d = hypot(dx, dy);
  double at = 0.5 + 0.5 * size / d; /* the head's middle on the middle of the leg */
  aw_style_set_ink(page->cr, aw_ink_casing);
  aw_style_arrow_head(page->cr, a.x_px + dx * at + dx / d * size * 0.25, a.y_px + dy * at + dy / d * size * 0.25, dx,
                      dy, size * 1.5);
  aw_style_set_ink(page->cr, aw_ink_tour);
  aw_style_arrow_head(page->cr, a.x_px + dx * at, a.y_px + dy * at, dx, dy, size);
}

/* Arrow heads at regular spacing along the path, each moved on to the middle of the next leg long enough for it. */
static void draw_arrows(const AwMapPage *page)
{
  double u = page->u, size = 10 * u, total = 0, gone = 0;
  for (gsize i = 0; i + 1 < page->n_stops; i++)
    total += leg(page, i);
  double spacing = MAX(75 * u, total / MAX_ARROWS), next = spacing / 3;
  for (gsize i = 0; i + 1 < page->n_stops; i++) {
    double d = leg(page, i);
    gone += d;
    if (gone < next || d < size * 1.3)
      continue;
    arrow_on_leg(page, i, size);
    next = gone + spacing;
  }
}

/* A text on a dark pill beside `at`, moved to stay inside the panel. */
static void draw_pill(const AwMapPage *page, AwPixelPoint at, double dy, const char *text, double size)
{
  double u = page->u, w, h;
  AwLabel label = { .size = size, .bold = TRUE, .ink = aw_ink_tour };
  aw_label_measure(page->cr, &label, text, &w, &h);
  double x = CLAMP(at.x_px + 9 * u, page->x + 2 * u, MAX(page->x + page->width - w - 12 * u, page->x + 2 * u));
  double y = CLAMP(at.y_px + dy - (dy < 0 ? h : 0), page->y + 2 * u, MAX(page->y + page->height - h - 2 * u, page->y));
  AwPatchInk patch = { { aw_ink_night.r, aw_ink_night.g, aw_ink_night.b, 0.85 }, 5 * u, 5 * u };
  aw_label_draw_on(page->cr, &label, &patch, text, x + 5 * u, y);
}

static void mark_end(const AwMapPage *page, AwPixelPoint at, gboolean start)
{
  double u = page->u, r = 7 * u;
  if (start)
    cairo_arc(page->cr, at.x_px, at.y_px, r, 0, 2 * G_PI);
  else
    cairo_rectangle(page->cr, at.x_px - r * 0.9, at.y_px - r * 0.9, r * 1.8, r * 1.8);
  aw_style_set_ink(page->cr, aw_ink_tour);
  cairo_fill_preserve(page->cr);
  cairo_set_line_width(page->cr, 2.5 * u);
  aw_style_set_ink(page->cr, aw_ink_night);
  cairo_stroke(page->cr);
}

/* Every so many stops its number, in round steps, so that a place along the tour can be told. */
static void number_stops(const AwMapPage *page)
{
  gsize step = (gsize)aw_scalebar_length((double)page->n_stops / 4);
  for (gsize i = step; step >= 5 && i + step / 4 < page->n_stops; i += step) {
    g_autofree char *text = aw_label_count(i);
    draw_pill(page, page->stops[i - 1], -6 * page->u, text, 11.5 * page->u);
  }
}

void aw_map_draw_tour_line(const AwMapPage *page)
{
  double width = CLAMP(page->u * 60 / sqrt(page->n_stops + 1.0), 0.7 * page->u, 1.5 * page->u);
  stroke_tour(page, width * 2.2, aw_ink_casing);
  stroke_tour(page, width, aw_ink_tour);
}

void aw_map_draw_tour_signs(const AwMapPage *page)
{
  double u = page->u;
  if (page->n_stops == 0)
    return;
  draw_arrows(page);
  number_stops(page);
  if (page->n_stops > 1) {
    mark_end(page, page->stops[page->n_stops - 1], FALSE);
    draw_pill(page, page->stops[page->n_stops - 1], 7 * u, "end", 14 * u);
  }
  mark_end(page, page->stops[0], TRUE);
  draw_pill(page, page->stops[0], -7 * u, "start", 14 * u);
}

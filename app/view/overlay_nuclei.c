/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "figures/label.h"
#include "view/overlay_parts.h"

#define N_STATES 4
#define GLYPH_FROM 10.0 /* diameter from which an outline carries its state's glyph, logical px */
#define LABEL_FROM 26.0 /* diameter from which there is room for a number */
#define AIM_FROM 14.0   /* diameter from which aim points are drawn */
#define MAX_LABELS 150

static const AwState draw_order[N_STATES] = { AW_STATE_FOUND, AW_STATE_REJECTED, AW_STATE_PROPOSED, AW_STATE_ACCEPTED };

static const AwNucleus *nucleus_at(const AwPass *pass, guint i)
{
  return pass->scene->nuclei->pdata[i];
}

static gboolean has_mark(const AwPass *pass, guint i, AwMark mark)
{
  return pass->scene->marks && (pass->scene->marks[i] & mark);
}

static AwInk ink_of(const AwPass *pass, guint i, const AwLook *look)
{
  return has_mark(pass, i, AW_MARK_SELECTED) ? aw_ink_tour : look->ink;
}

/* Hairline outline; points nearer than 1.5 px to the last are left out, which the eye does not miss. */
static void hairline(const AwPass *pass, const AwNucleus *nucleus, AwInk ink)
{
  if (nucleus->n_outline < 3)
    return;
  AwScreenPoint first = aw_pass_point(pass, nucleus->outline[0]), last = first;
  for (gsize i = 1; i < nucleus->n_outline; i++) {
    AwScreenPoint p = aw_pass_point(pass, nucleus->outline[i]);
    if (fabs(p.sx - last.sx) + fabs(p.sy - last.sy) < 1.5)
      continue;
    aw_raster_line(pass->raster, last.sx, last.sy, p.sx, p.sy, ink);
    last = p;
  }
  aw_raster_line(pass->raster, last.sx, last.sy, first.sx, first.sy, ink);
}

/* A glyph for each state and one more for its selected form; those without a glyph get a ring when marks stand alone.
 */
static void make_stamps(const AwPass *pass, gboolean outlines, AwStamp *stamp[N_STATES][2])
{
  double r = outlines ? CLAMP(pass->size * 0.16, 1.5 * pass->u, 6 * pass->u)
                      : CLAMP(pass->size * 0.5, 1.3 * pass->u, 3.5 * pass->u);
  memset(stamp, 0, sizeof(AwStamp *[N_STATES][2]));
  for (int s = 0; s < N_STATES; s++) {
    const AwLook *look = aw_look_of_state((AwState)s);
    AwGlyph glyph = look->glyph == AW_GLYPH_NONE && !outlines ? AW_GLYPH_RING : look->glyph;
    if (glyph == AW_GLYPH_NONE || (outlines && pass->size < GLYPH_FROM * pass->u))
      continue;
    stamp[s][0] = aw_stamp_new(glyph, look->ink, r);
    stamp[s][1] = aw_stamp_new(glyph, aw_ink_tour, r);
  }
}

void aw_overlay_marks(const AwPass *pass, const GArray *item, gboolean outlines)
{
  AwStamp *stamp[N_STATES][2];
  make_stamps(pass, outlines, stamp);
  for (int s = 0; s < N_STATES; s++) {
    AwState state = draw_order[s];
    const AwLook *look = aw_look_of_state(state);
    for (guint k = 0; k < item->len; k++) {
      guint i = g_array_index(item, guint, k);
      if (pass->scene->state[i] != state)
        continue;
      const AwStamp *mark = stamp[state][has_mark(pass, i, AW_MARK_SELECTED)];
      AwScreenPoint at = aw_pass_point(pass, nucleus_at(pass, i)->centroid);
      if (outlines)
        hairline(pass, nucleus_at(pass, i), ink_of(pass, i, look));
      if (mark)
        aw_raster_stamp(pass->raster, mark, at.sx, at.sy);
    }
  }
  for (int s = 0; s < N_STATES; s++) {
    aw_stamp_free(stamp[s][0]);
    aw_stamp_free(stamp[s][1]);
  }
}

static void outline_path(const AwPass *pass, const AwNucleus *nucleus)
{
  cairo_new_path(pass->cr);
  for (gsize i = 0; i < nucleus->n_outline; i++) {
    AwScreenPoint p = aw_pass_point(pass, nucleus->outline[i]);
    cairo_line_to(pass->cr, p.sx, p.sy);
  }
  cairo_close_path(pass->cr);
}

static void full_outline(const AwPass *pass, guint i, const AwLook *look)
{
  double u = pass->u * CLAMP(pass->size / (24 * pass->u), 0.6, 1.2);
  outline_path(pass, nucleus_at(pass, i));
  cairo_set_dash(pass->cr, NULL, 0, 0);
  if (has_mark(pass, i, AW_MARK_SELECTED)) {
    cairo_set_line_width(pass->cr, (look->width + 5) * u);
    aw_style_set_ink(pass->cr, aw_ink_tour);
    cairo_stroke_preserve(pass->cr);
  }
  cairo_set_line_width(pass->cr, (look->width + 1.6) * u);
  aw_style_set_ink(pass->cr, aw_ink_casing);
  cairo_stroke_preserve(pass->cr);
  aw_style_set_line(pass->cr, look, u);
  cairo_stroke(pass->cr);
}

static void draw_aim(const AwPass *pass, AwScreenPoint at)
{
  double r = 4.5 * pass->u;
  cairo_set_dash(pass->cr, NULL, 0, 0);
  cairo_set_line_cap(pass->cr, CAIRO_LINE_CAP_BUTT);
  for (int seam = 1; seam >= 0; seam--) {
    cairo_set_line_width(pass->cr, (seam ? 3 : 1.4) * pass->u);
    aw_style_set_ink(pass->cr, seam ? aw_ink_casing : aw_ink_tour);
    cairo_move_to(pass->cr, at.sx - r, at.sy);
    cairo_line_to(pass->cr, at.sx + r, at.sy);
    cairo_move_to(pass->cr, at.sx, at.sy - r);
    cairo_line_to(pass->cr, at.sx, at.sy + r);
    cairo_stroke(pass->cr);
  }
}

/* Number on a dark patch under the nucleus, so that it reads on any picture. */
static void draw_number(const AwPass *pass, const AwNucleus *nucleus, AwScreenPoint at)
{
  double u = pass->u;
  g_autofree char *text = g_strdup_printf("%" G_GINT64_FORMAT, nucleus->id);
  AwLabel label = { .size = 11 * u, .ink = aw_ink_tour, .align = AW_ALIGN_CENTRE };
  AwPatchInk patch = { aw_ink_casing, 3 * u, 3 * u };
  aw_label_draw_on(pass->cr, &label, &patch, text, at.sx, at.sy + pass->size * 0.6);
}

static void full_nucleus(const AwPass *pass, guint i, const AwLook *look, gboolean with_number)
{
  const AwNucleus *nucleus = nucleus_at(pass, i);
  AwScreenPoint at = aw_pass_point(pass, nucleus->centroid);
  if (nucleus->n_outline >= 3)
    full_outline(pass, i, look);
  if (pass->size >= GLYPH_FROM * pass->u) {
    aw_style_set_ink(pass->cr, look->ink);
    aw_style_draw_glyph(pass->cr, look->glyph, at.sx, at.sy, CLAMP(pass->size * 0.14, 2 * pass->u, 6 * pass->u));
  }
  if (pass->scene->aim && pass->size >= AIM_FROM * pass->u)
    draw_aim(pass, aw_pass_point(pass, pass->scene->aim[i]));
  if (with_number)
    draw_number(pass, nucleus, at);
}

void aw_overlay_full(const AwPass *pass, const GArray *item)
{
  gboolean numbers = pass->scene->show_labels && pass->size >= LABEL_FROM * pass->u && item->len <= MAX_LABELS;
  for (int s = 0; s < N_STATES; s++)
    for (guint k = 0; k < item->len; k++) {
      guint i = g_array_index(item, guint, k);
      if (pass->scene->state[i] == draw_order[s])
        full_nucleus(pass, i, aw_look_of_state(draw_order[s]), numbers);
    }
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/label.h"
#include "view/overlay_parts.h"

#define N_STATES 4
#define GLYPH_FROM 10.0   /* diameter from which an outline carries its state's glyph, logical px */
#define CAUTION_FROM 7.0  /* diameter from which cautions are drawn */
#define AIM_FROM 28.0     /* diameter from which the aim points of likely targets are drawn */
#define LABEL_FROM 26.0   /* diameter from which there is room for a number */
#define MAX_LABELS 120    /* a text costs as much as forty outlines */
#define MAX_OUTLINE 256   /* points of an outline that are drawn */
#define LEAST_STEP_PX 1.5 /* outline points nearer than this to the last are left out */

static const AwState draw_order[N_STATES] = { AW_STATE_FOUND, AW_STATE_REJECTED, AW_STATE_PROPOSED, AW_STATE_ACCEPTED };

/* What one redraw stamps; NULL where nothing is to be stamped. */
typedef struct {
  AwStamp *state[N_STATES], *selected[N_STATES];
  AwStamp *aim, *caution;
} Stamps;

static const AwNucleus *nucleus_at(const AwPass *pass, guint i)
{
  return pass->scene->nuclei->pdata[i];
}

static gboolean has_mark(const AwPass *pass, guint i, AwMark mark)
{
  return pass->scene->marks && (pass->scene->marks[i] & mark);
}

/* States without a glyph get a ring where marks stand alone. */
static Stamps make_stamps(const AwPass *pass, AwDetail detail)
{
  double u = pass->u, size = pass->size;
  gboolean alone = detail == AW_DETAIL_MARKS;
  double r = alone ? CLAMP(size * 0.5, 1.3 * u, 3.5 * u) : CLAMP(size * 0.15, 1.5 * u, 6 * u);
  Stamps stamps = { .aim = NULL };
  for (int s = 0; s < N_STATES && (alone || size >= GLYPH_FROM * u); s++) {
    const AwLook *look = aw_look_of_state((AwState)s);
    AwGlyph glyph = look->glyph == AW_GLYPH_NONE && alone ? AW_GLYPH_RING : look->glyph;
    if (glyph == AW_GLYPH_NONE)
      continue;
    stamps.state[s] = aw_stamp_new(glyph, look->ink, r);
    stamps.selected[s] = aw_stamp_new(glyph, alone ? aw_ink_tour : look->ink, r);
  }
  if (pass->scene->aim && size >= AIM_FROM * u)
    stamps.aim = aw_stamp_new(AW_GLYPH_PLUS, aw_ink_tour, 4.5 * u);
  if (pass->scene->marks && size >= CAUTION_FROM * u)
    stamps.caution = aw_stamp_new(AW_GLYPH_TRIANGLE, aw_ink_tour, 4 * u);
  return stamps;
}

static void free_stamps(Stamps *stamps)
{
  for (int s = 0; s < N_STATES; s++) {
    aw_stamp_free(stamps->state[s]);
    aw_stamp_free(stamps->selected[s]);
  }
  aw_stamp_free(stamps->aim);
  aw_stamp_free(stamps->caution);
}

/* The outline on the screen as x, y, x, y, ...; what the eye cannot tell apart is left out. Returns the points. */
static gsize screen_outline(const AwPass *pass, const AwNucleus *nucleus, double xy[2 * MAX_OUTLINE])
{
  gsize n = 0, stride = nucleus->n_outline / MAX_OUTLINE + 1;
  for (gsize i = 0; i < nucleus->n_outline; i += stride) {
    AwScreenPoint p = aw_pass_point(pass, nucleus->outline[i]);
    if (n > 0 && fabs(p.sx - xy[2 * n - 2]) + fabs(p.sy - xy[2 * n - 1]) < LEAST_STEP_PX)
      continue;
    xy[2 * n] = p.sx;
    xy[2 * n + 1] = p.sy;
    n++;
  }
  return n;
}

/* Full style: a light halo when selected, a dark seam, then the line of the state. Hairlines are one pixel wide. */
static void draw_outline(const AwPass *pass, guint i, const AwLook *look, AwDetail detail)
{
  double xy[2 * MAX_OUTLINE], u = pass->u * CLAMP(pass->size / (24 * pass->u), 0.55, 1.2), dash[4];
  gsize n = screen_outline(pass, nucleus_at(pass, i), xy);
  gboolean selected = has_mark(pass, i, AW_MARK_SELECTED), full = detail == AW_DETAIL_FULL;
  AwStroke seam = { .ink = aw_ink_casing, .width = (look->width + 2) * u };
  AwStroke halo = { .ink = aw_ink_tour, .width = (look->width + 5) * u };
  AwStroke line = { .ink = !full && selected ? aw_ink_tour : look->ink, .width = full ? look->width * u : pass->u };
  for (int k = 0; k < look->n_dash; k++)
    dash[k] = look->dash[k] * u + (k % 2 ? -0.5 : 0.5) * look->width * u; /* as round ends would lengthen them */
  if (full && look->n_dash) {
    line.dash = dash;
    line.n_dash = look->n_dash;
  }
  if (full && selected)
    aw_raster_outline(pass->raster, &halo, xy, n);
  if (full)
    aw_raster_outline(pass->raster, &seam, xy, n);
  aw_raster_outline(pass->raster, &line, xy, n);
}

static void draw_nucleus(const AwPass *pass, guint i, AwState state, AwDetail detail, const Stamps *stamps)
{
  AwScreenPoint at = aw_pass_point(pass, pass->centroid[i]);
  const AwStamp *mark = has_mark(pass, i, AW_MARK_SELECTED) ? stamps->selected[state] : stamps->state[state];
  if (detail != AW_DETAIL_MARKS)
    draw_outline(pass, i, aw_look_of_state(state), detail);
  if (mark)
    aw_raster_stamp(pass->raster, mark, at.sx, at.sy);
  if (stamps->aim && (state == AW_STATE_ACCEPTED || state == AW_STATE_PROPOSED)) {
    AwScreenPoint aim = aw_pass_point(pass, pass->scene->aim[i]);
    aw_raster_stamp(pass->raster, stamps->aim, aim.sx, aim.sy);
  }
  if (stamps->caution && has_mark(pass, i, AW_MARK_CAUTION)) {
    double off = pass->size * 0.42 + 3 * pass->u;
    aw_raster_stamp(pass->raster, stamps->caution, at.sx + off, at.sy - off);
  }
}

void aw_overlay_nuclei(const AwPass *pass, const GArray *item, AwDetail detail)
{
  Stamps stamps = make_stamps(pass, detail);
  for (int s = 0; s < N_STATES; s++)
    for (guint k = 0; k < item->len; k++) {
      guint i = g_array_index(item, guint, k);
      if (pass->scene->state[i] == draw_order[s])
        draw_nucleus(pass, i, draw_order[s], detail, &stamps);
    }
  free_stamps(&stamps);
}

void aw_overlay_numbers(const AwPass *pass, const GArray *item)
{
  double u = pass->u;
  AwLabel label = { .size = 11 * u, .ink = aw_ink_tour, .align = AW_ALIGN_CENTRE };
  AwPatchInk patch = { aw_ink_casing, 3 * u, 3 * u };
  if (pass->size < LABEL_FROM * u || item->len > MAX_LABELS)
    return;
  for (guint k = 0; k < item->len; k++) {
    const AwNucleus *nucleus = nucleus_at(pass, g_array_index(item, guint, k));
    AwScreenPoint at = aw_pass_point(pass, nucleus->centroid);
    g_autofree char *text = g_strdup_printf("%" G_GINT64_FORMAT, nucleus->id);
    aw_label_draw_on(pass->cr, &label, &patch, text, at.sx, at.sy + pass->size * 0.6);
  }
}

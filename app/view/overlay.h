/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_OVERLAY_H
#define AW_VIEW_OVERLAY_H

#include <cairo.h>

#include "view/hit.h"
#include "view/viewport.h"

/* What makes a nucleus stand out besides its state; bits. */
typedef enum {
  AW_MARK_SELECTED = 1 << 0, /* chosen by the pointer or a loop: a light halo */
  AW_MARK_CAUTION = 1 << 1   /* touching neighbour or low promise: a small triangle at its upper right */
} AwMark;

/* All that lies over the pictures; borrowed. Arrays run along `nuclei`. */
typedef struct {
  const AwUpright *upright;
  GPtrArray *nuclei;       /* AwNucleus */
  const AwHitIndex *index; /* over the same nuclei */
  const AwState *state;
  const guint8 *marks;    /* AwMark bits, or NULL */
  const AwScanPoint *aim; /* aim points, or NULL for none shown */
  double nucleus_um;      /* typical diameter: aw_overlay_typical_um */
  int current;            /* the nucleus being decided, framed by brackets at every zoom; -1 for none */
  const guint *tour;      /* nuclei in visiting order, or NULL */
  gsize n_tour;
  gsize n_done;         /* stops already played; the way to them is drawn faint */
  gboolean show_labels; /* nucleus numbers, where there is room */
  double scale;         /* device px per logical px: 1, or 2 on dense screens */
} AwScene;

/* How much detail a view gets. */
typedef enum {
  AW_DETAIL_MARKS,    /* one small glyph per nucleus */
  AW_DETAIL_HAIRLINE, /* thin outline, and a glyph where it fits */
  AW_DETAIL_FULL      /* outlines in full line style, aim points, labels */
} AwDetail;

/* By the typical size of a nucleus on the screen (logical px) and the number in view: keeps a redraw within 16 ms. */
AwDetail aw_overlay_detail(double size_px, gsize n_in_view);

/* The median diameter, um; 1 when there is none. */
double aw_overlay_typical_um(GPtrArray *nuclei);

/* AwOverlay: keeps the scratch memory between redraws. */
typedef struct AwOverlay AwOverlay;

AwOverlay *aw_overlay_new(void);
void aw_overlay_free(AwOverlay *overlay);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwOverlay, aw_overlay_free)

/* Draws the scene as `view` shows it; context units are device px. Returns the number of nuclei in view. */
gsize aw_overlay_draw(AwOverlay *overlay, cairo_t *cr, const AwScene *scene, const AwViewport *view);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_OVERLAY_PARTS_H
#define AW_VIEW_OVERLAY_PARTS_H

#include "view/overlay.h"
#include "view/raster.h"

/* One redraw of an overlay; only the files overlay*.c include it. */
typedef struct {
  const AwScene *scene;
  const AwViewport *view;
  cairo_t *cr;
  AwRaster *raster;            /* begun, for marks and hairlines; painted by aw_overlay_draw */
  double u;                    /* logical px */
  double size;                 /* typical diameter of a nucleus on the screen, device px */
  AwMatrix px_per_um;          /* scan to screen: s = px_per_um (q - q0) + origin */
  AwScreenPoint origin;        /* where q0 stands */
  const AwScanPoint *centroid; /* of all nuclei */
  AwScreenPoint *stop;         /* of the tour, n_tour of them; NULL without a tour */
} AwPass;

static inline AwScreenPoint aw_pass_point(const AwPass *pass, AwScanPoint q)
{
  double dx = q.x_um - pass->scene->upright->q0.x_um, dy = q.y_um - pass->scene->upright->q0.y_um;
  const AwMatrix *m = &pass->px_per_um;
  return (AwScreenPoint){ pass->origin.sx + m->xx * dx + m->xy * dy, pass->origin.sy + m->yx * dx + m->yy * dy };
}

/* The nuclei `item` (guint) on the raster. */
void aw_overlay_nuclei(const AwPass *pass, const GArray *item, AwDetail detail);

/* Their numbers, through cairo. */
void aw_overlay_numbers(const AwPass *pass, const GArray *item);

/* The places of the tour's stops, or NULL; g_free. */
AwScreenPoint *aw_overlay_stops(const AwPass *pass);

/* The way of the tour, on the raster, under the nuclei. */
void aw_overlay_tour(const AwPass *pass);

/* Above everything, through cairo: direction and ends of the tour, brackets round the current nucleus. */
void aw_overlay_signs(const AwPass *pass);

#endif

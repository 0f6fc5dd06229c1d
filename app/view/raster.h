/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_RASTER_H
#define AW_VIEW_RASTER_H

#include <cairo.h>
#include <glib.h>

#include "figures/style.h"

/**
 * AwRaster: a transparent layer for tens of thousands of small marks and hairlines, which cairo would draw one by one
 * at microseconds each. Marks are drawn once (by cairo) and stamped; the layer is composited in one go.
 */
typedef struct AwRaster AwRaster;

/* One small picture to stamp. */
typedef struct AwStamp AwStamp;

AwRaster *aw_raster_new(void);
void aw_raster_free(AwRaster *raster);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwRaster, aw_raster_free)

/* Clears the layer and gives it a size, device px (1 ... 32767 a side). FALSE when memory cannot be had. */
gboolean aw_raster_begin(AwRaster *raster, int width, int height);

/* Paints the layer over the context at its origin. */
void aw_raster_paint(const AwRaster *raster, cairo_t *cr);

/* A glyph of half width r px in that ink with a dark seam, so that it reads on bright nuclei. */
AwStamp *aw_stamp_new(AwGlyph glyph, AwInk ink, double r);
void aw_stamp_free(AwStamp *stamp);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwStamp, aw_stamp_free)

/* Puts the stamp's middle on the pixel that holds (x, y), device px; parts outside are cut off. */
void aw_raster_stamp(AwRaster *raster, const AwStamp *stamp, double x, double y);

/* How a line is drawn. */
typedef struct {
  AwInk ink;
  double width;       /* px, at least 1 */
  const double *dash; /* on, off, ... px; NULL for a full line */
  int n_dash;
} AwStroke;

/* A straight line with smooth edges and square ends. Points may lie anywhere; those not finite draw nothing. */
void aw_raster_line(AwRaster *raster, const AwStroke *stroke, double x0, double y0, double x1, double y1);

/* A closed line through n points x, y, x, y, ...; the dashes run on round the corners. */
void aw_raster_outline(AwRaster *raster, const AwStroke *stroke, const double *xy, gsize n);

#endif

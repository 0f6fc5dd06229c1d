/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_MAP_H
#define AW_FIGURES_MAP_H

#include <cairo.h>
#include <glib.h>

#include "image/image.h"
#include "record/record.h"

/* All that a dish map shows; borrowed. */
typedef struct {
  const char *title;    /* dish name */
  const char *subtitle; /* one line of counts */
  GPtrArray *frames;    /* AwFrame; overviews are drawn in place when present */
  AwPixelMap map;
  GPtrArray *nuclei;    /* AwNucleus with outlines */
  const AwState *state; /* one per nucleus of `nuclei` */
  const gint64 *tour;   /* nucleus ids in visiting order */
  gsize n_tour;
  const char *const *notes; /* lines at the foot (map origin, cautions), NULL-terminated; may be NULL */
} AwMapContent;

/**
 * Draws the dish as the microscope shows it: each frame upright in the orientation of its image (+x px to the right,
 * y down, camera rotation kept in the frame's outline), so that scan axes run against the page; an axis cross says so.
 * Writes PNG, SVG or PDF by the ending of `path`, through AwOutput.
 */
gboolean aw_map_write(const AwMapContent *content, const char *path, int width_px, int height_px, GError **error);

/* The same onto a cairo context of that size. */
void aw_map_draw(const AwMapContent *content, cairo_t *cr, double width_px, double height_px);

/* The largest side of a stored overview that is shown: a damaged record must not claim gigabytes. */
#define AW_MAX_OVERVIEW_SIDE_PX 8192

/* The overview of a frame as an 8-bit image, or NULL when there is none that can be shown. Free with aw_image_free. */
AwImage *aw_frame_picture(const AwFrame *frame);

#endif

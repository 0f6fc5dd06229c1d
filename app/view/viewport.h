/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_VIEWPORT_H
#define AW_VIEW_VIEWPORT_H

#include "figures/upright.h"

/* A point of the drawing area: device pixels from its upper left corner, y down. */
typedef struct {
  double sx, sy;
} AwScreenPoint;

#define AW_MAX_ZOOM 48.0        /* screen px per dish px */
#define AW_FIT_MARGIN_FRAC 0.02 /* rim left free by a fit, of the smaller side */

/**
 * AwViewport: which part of the dish the drawing area shows. Dish pixels (figures/upright.h) are only shifted and
 * scaled to the screen, so pictures stay upright. A plain value: copy it to remember a view.
 */
typedef struct {
  double width, height; /* of the drawing area, device px, > 0 */
  AwBox dish;           /* the whole dish, dish px, not empty */
  AwPixelPoint centre;  /* the dish pixel in the middle of the area */
  double zoom;          /* screen px per dish px */
} AwViewport;

/* A view of the whole dish. A side below 1 counts as 1; an empty or infinite dish becomes one pixel. */
AwViewport aw_viewport_new(AwBox dish, double width, double height);

/* Shows the whole dish. */
void aw_viewport_fit(AwViewport *view);

/* TRUE when the view is the one that aw_viewport_fit gives. */
gboolean aw_viewport_is_fit(const AwViewport *view);

/* Takes a new size of the area: a fitted view stays fitted, any other keeps its centre and zoom. */
void aw_viewport_resize(AwViewport *view, double width, double height);

/* Moves the picture by that many screen px, as a drag does; the centre stays inside the dish. */
void aw_viewport_pan(AwViewport *view, double dx, double dy);

/* Zooms by `factor` (> 1: closer) so that what lies under `at` stays there, within the limits of zoom and centre. */
void aw_viewport_zoom_at(AwViewport *view, double factor, AwScreenPoint at);

/* Brings `box` (dish px) into the middle, as large as fits with `margin` screen px around it, at most `max_zoom`. */
void aw_viewport_show(AwViewport *view, AwBox box, double margin, double max_zoom);

AwScreenPoint aw_viewport_from_dish(const AwViewport *view, AwPixelPoint dish);
AwPixelPoint aw_viewport_to_dish(const AwViewport *view, AwScreenPoint at);

/* The same from and to scan coordinates. */
AwScreenPoint aw_viewport_from_scan(const AwViewport *view, const AwUpright *upright, AwScanPoint q);
AwScanPoint aw_viewport_to_scan(const AwViewport *view, const AwUpright *upright, AwScreenPoint at);

/* The part of the dish's plane that the area shows, dish px. */
AwBox aw_viewport_visible(const AwViewport *view);

gboolean aw_box_overlap(AwBox a, AwBox b);

/**
 * The frame on top at a dish pixel (later frames lie over earlier ones) and the point in its own pixels.
 * Returns its index, or -1 where there is none. pixel may be NULL.
 */
int aw_view_frame_at(const AwUpright *upright, GPtrArray *frames, AwPixelPoint dish, AwPixelPoint *pixel);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_MAP_PARTS_H
#define AW_FIGURES_MAP_PARTS_H

#include "figures/map.h"
#include "figures/upright.h"

/* The parts of the dish map share this; only the files map*.c include it. */

#define AW_N_STATES 4

typedef struct {
  const AwMapContent *content;
  cairo_t *cr;
  double u;                      /* page unit */
  gboolean placed;               /* FALSE when nothing can be placed; then upright, box and scale are not set */
  AwUpright upright;             /* scan coordinates to dish pixels */
  AwBox box;                     /* of the dish, dish pixels */
  double scale;                  /* page units per dish pixel */
  double x, y, width, height;    /* the panel the dish is drawn in */
  double nucleus_size;           /* typical diameter on the page */
  gsize n_in_state[AW_N_STATES]; /* nuclei per AwState */
  gsize n_stops;                 /* stops of the tour that can be drawn */
  AwPixelPoint *stops;           /* their places on the page, owned */
  double tour_um;                /* straight length of the tour */
} AwMapPage;

/* Counts, typical size and stops; needs placed, upright, box, scale and the panel. Free with aw_map_page_clear. */
void aw_map_page_measure(AwMapPage *page);
void aw_map_page_clear(AwMapPage *page);

AwPixelPoint aw_map_page_point(const AwMapPage *page, AwScanPoint q);
AwState aw_map_page_state(const AwMapPage *page, guint nucleus);

/* Each fills its part of the panel. */
void aw_map_draw_pictures(const AwMapPage *page);
void aw_map_draw_nuclei(const AwMapPage *page);
void aw_map_draw_tour_line(const AwMapPage *page);  /* beneath the nuclei */
void aw_map_draw_tour_signs(const AwMapPage *page); /* arrows, start, end and numbers, above them */

/* The explanations beside the panel: a column at (x, y), or a row across `width` when `in_row`. */
void aw_map_draw_side(const AwMapPage *page, double x, double y, double width, gboolean in_row);

/* The room of the explanations, page units u. */
#define AW_MAP_SIDE_WIDTH 292.0
#define AW_MAP_SIDE_ROW_HEIGHT 205.0

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_STYLE_H
#define AW_FIGURES_STYLE_H

#include <cairo.h>

#include "record/record.h"

/* Looks shared by every figure and by the viewer's overlays. Lengths are in page units u (see aw_style_unit). */

/* Colour, each channel and the opacity 0 ... 1, sRGB. */
typedef struct {
  double r, g, b, a;
} AwInk;

extern const AwInk aw_ink_text;   /* near black, on white paper */
extern const AwInk aw_ink_faint;  /* secondary text on paper */
extern const AwInk aw_ink_hair;   /* hairlines on paper */
extern const AwInk aw_ink_night;  /* ground of the dish, behind pictures */
extern const AwInk aw_ink_casing; /* dark seam under bright lines, so that they read on bright nuclei */
extern const AwInk aw_ink_tour;

/* The small mark at a centroid; each state has its own, so that colour is never the only sign. PLUS marks aim points,
 * TRIANGLE asks for care. */
typedef enum {
  AW_GLYPH_NONE,
  AW_GLYPH_RING,
  AW_GLYPH_DIAMOND,
  AW_GLYPH_DISC,
  AW_GLYPH_CROSS,
  AW_GLYPH_PLUS,
  AW_GLYPH_TRIANGLE
} AwGlyph;

typedef struct {
  AwInk ink;
  double width;   /* of the line, u */
  double dash[4]; /* on, off, ... in u; n_dash 0 draws a full line */
  int n_dash;
  AwGlyph glyph;
} AwLook;

/**
 * The look of a nucleus in that state. The four inks stay apart for normal sight, protanopia, deuteranopia and
 * tritanopia (CIEDE2000 >= 16 between any two, simulated after Machado, Oliveira & Fernandes 2009) on dark pictures.
 */
const AwLook *aw_look_of_state(AwState state);

/* Page unit: 1/1000 of the height of a page of 4:3, smaller on narrow pages; never below 0.45 px. */
double aw_style_unit(double width, double height);

void aw_style_set_ink(cairo_t *cr, AwInk ink);

/* Sets ink, width and dashes of a look; `u` is the page unit in context units. */
void aw_style_set_line(cairo_t *cr, const AwLook *look, double u);

/* Adds the closed path of a glyph of half width `r` round (x, y); strokes or fills it in the present ink. */
void aw_style_draw_glyph(cairo_t *cr, AwGlyph glyph, double x, double y, double r);

/* A path round a rectangle with corners of radius r. */
void aw_style_round_rect(cairo_t *cr, double x, double y, double w, double h, double r);

/* A filled arrow head of length `len` with its point at (x, y), flying in direction (dx, dy) (any length > 0). */
void aw_style_arrow_head(cairo_t *cr, double x, double y, double dx, double dy, double len);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_LABEL_H
#define AW_FIGURES_LABEL_H

#include "figures/style.h"

/* Text on figures: DejaVu Sans through pango, unhinted, so that the same text gives the same pixels everywhere. */

typedef enum { AW_ALIGN_LEFT, AW_ALIGN_CENTRE, AW_ALIGN_RIGHT } AwAlign;

typedef struct {
  double size; /* height of the font's em, context units */
  gboolean bold;
  AwInk ink;
  AwAlign align;    /* of the block against x */
  double max_width; /* longer text is wrapped, then ended by an ellipsis; 0 sets no limit */
  int max_lines;    /* 0 means one */
} AwLabel;

/**
 * Draws `text` with its top at y and its left edge, middle or right edge at x; returns the height used.
 * Text from users is taken as it is: no markup, broken UTF-8 repaired, line breaks shown as a sign.
 */
double aw_label_draw(cairo_t *cr, const AwLabel *label, const char *text, double x, double y);

/* A patch of ink with round corners behind a text, `pad` to its sides. */
typedef struct {
  AwInk ink;
  double pad, corner;
} AwPatchInk;

/* As aw_label_draw, over a patch that keeps the text readable on a picture. */
double aw_label_draw_on(cairo_t *cr, const AwLabel *label, const AwPatchInk *patch, const char *text, double x,
                        double y);

/* The size that aw_label_draw would use. Either result may be NULL. */
void aw_label_measure(cairo_t *cr, const AwLabel *label, const char *text, double *width, double *height);

/* A whole number with narrow spaces between groups of three digits. Free with g_free. */
char *aw_label_count(gsize n);

/* A length in a unit that suits it (nm, um, mm), three significant digits at least. Free with g_free. */
char *aw_label_length(double length_um);

#endif

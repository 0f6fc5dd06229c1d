/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_OVERLAP_PARTS_H
#define AW_GEOMETRY_OVERLAP_PARTS_H

#include "geometry/overlap.h"

/* The parts of aw_overlap_fit; for core/geometry/overlap*.c, and the words for markmap.c. */

/* The shift between the pictures of two frames, found from their marks alone. */
typedef struct {
  gsize a, b;      /* frames */
  double sx, sy;   /* S_a - S_b, um */
  double dx, dy;   /* (p_a - c_a) - (p_b - c_b) of the shared marks, c the frames' centres; px */
  gsize n;         /* marks that agree on it */
  double evidence; /* natural logarithm of the odds against chance; above 0 when it is not likely chance */
} AwOverlapShift;

/* Two views of one mark. */
typedef struct {
  gsize a, b;    /* frames */
  double sx, sy; /* S_a - S_b, um */
  double dx, dy; /* (p_a - c_a) - (p_b - c_b), px */
} AwOverlapPair;

/* The typical diameter of the marks, px; 0 without marks. */
double aw_overlap_mark_px(const AwOverlapFrame *frames, gsize n_frames);

/* c_a - c_b of two frames. */
AwPixelPoint aw_overlap_centre_shift(const AwOverlapFrame *a, const AwOverlapFrame *b);

/**
 * aw_overlap_shifts: shifts with evidence above 0 of at most 48 neighbouring pairs of frames, spread over directions
 * (AwOverlapShift). Pairs at nearly the same stage move vote as one; `start` corrects for what is left.
 */
GArray *aw_overlap_shifts(const AwOverlapFrame *frames, gsize n_frames, AwMatrix start, double mark_px);

/* The map that most shifts agree on; FALSE when too few do or all lie in one direction. */
gboolean aw_overlap_consensus(const AwOverlapShift *shifts, gsize n, double tolerance_px, AwMatrix *a);

/* Directions of stage moves, half turns: a wrong axis shows in one of them while another one may look right. */
#define AW_OVERLAP_SECTORS 4
int aw_overlap_sector(double sx, double sy);

/**
 * aw_overlap_match: pairs of views of one mark within tolerance_px of where `a` puts them (AwOverlapPair), by frames,
 * then marks. possible (AW_OVERLAP_SECTORS numbers) gets by sector how many views should have a partner by `a`: those
 * that fall into another frame by more than 0.6 mark_px, so that they are whole in it.
 */
GArray *aw_overlap_match(const AwOverlapFrame *frames, gsize n_frames, AwMatrix a, double tolerance_px, double mark_px,
                         gsize *possible);

/* Trimmed least squares for A over the pairs; what lies too far off is removed from `pairs`. FALSE: not determined. */
gboolean aw_overlap_solve(GArray *pairs, AwMatrix *a, double *rms_um);

/* What would have to be different for `start` to become `fitted`, as a clause: "the x readings run the other way". */
char *aw_overlap_name_difference(AwMatrix start, AwMatrix fitted);

/* TRUE when `fitted` is `start` turned by at most 15 degrees and scaled by at most 10 %, not mirrored. */
gboolean aw_overlap_is_near(AwMatrix start, AwMatrix fitted);

#endif

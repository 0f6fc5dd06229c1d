/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_TRUTH_H
#define AW_NUCLEI_TRUTH_H

#include <glib.h>

#include "base/point.h"

/* What a drawn object is. Nuclei to be found are interphase and mitotic; the rest is there to mislead. */
typedef enum { AW_TRUTH_INTERPHASE, AW_TRUTH_MITOTIC, AW_TRUTH_DEBRIS, AW_TRUTH_FIBRE } AwTruthKind;

/* "interphase", "mitotic", "debris" or "fibre". */
const char *aw_truth_kind_name(AwTruthKind kind);

/**
 * AwTruth: one object of an invented dish, known exactly. Its outline is the truth that hits, areas and centroids are
 * judged by; pictures are drawn from it by core/nuclei/render. Positions are scan um, so nothing here depends on
 * where a frame was taken.
 */
typedef struct {
  AwTruthKind kind;
  AwScanPoint *outline; /* simple closed polygon, first point not repeated; owned */
  gsize n_outline;
  AwScanPoint centroid;      /* of the outline's area */
  double area_um2;           /* of the outline */
  double major_um, minor_um; /* full axes of the ellipse of equal second moments */
  double angle_rad;          /* of the major axis against +x of the scan, -pi/2 ... pi/2 */
  double reach_um;           /* largest distance of an outline point from the centroid */
  double gap_um;    /* to the nearest outline of another object, 0 when they overlap; set by aw_truths_measure_gaps */
  double light_e;   /* photoelectrons that the whole object gives in one exposure under full light */
  double dome_frac; /* 0: flat; to 1: thinner towards the edge; to -1: hollow in the middle */
  double texture_frac; /* standard deviation of the chromatin texture, relative; 0: smooth */
  double blur_um;      /* Gaussian blur of its own beside the optics': it lies out of focus */
  guint64 seed;        /* of its texture */
} AwTruth;

/* A truth with a copy of the outline and all that follows from it; gap_um infinite, the rest 0. n >= 3. */
AwTruth *aw_truth_new(AwTruthKind kind, const AwScanPoint *outline, gsize n);
void aw_truth_free(AwTruth *truth);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTruth, aw_truth_free)

/* A GPtrArray of AwTruth that frees its elements. */
GPtrArray *aw_truths_new(void);

/* TRUE when `point` lies inside the outline. */
gboolean aw_truth_contains(const AwTruth *truth, AwScanPoint point);

/* Shortest distance between two outlines, um; 0 when they overlap. Beyond `far_um` INFINITY is returned unmeasured. */
double aw_truth_gap(const AwTruth *a, const AwTruth *b, double far_um);

/* Sets gap_um of all, INFINITY where no other object is within far_um. */
void aw_truths_measure_gaps(GPtrArray *truths, double far_um);

#define AW_SHAPE_N_POINTS 96
#define AW_SHAPE_N_WAVES 5

/**
 * AwShape: a nucleus-like form: an ellipse whose radius carries a few slow waves, its long axis bent to an arc.
 * With t the angle parameter and f(t) = 1 + sum_k (c_k cos kt + s_k sin kt), k = 2 ... 6, the point
 * (a f cos t, b f sin t) is laid along an arc whose half length a spans bend_rad, turned and moved to the position.
 */
typedef struct {
  AwScanPoint position;
  double major_um, minor_um;                                     /* full axes of the ellipse: 2a, 2b */
  double angle_rad;                                              /* of the major axis against +x of the scan */
  double wave_cos[AW_SHAPE_N_WAVES], wave_sin[AW_SHAPE_N_WAVES]; /* c_k, s_k of k = 2 ... 6; sum of sizes below 0.5 */
  double bend_rad;                                               /* 0 straight; about 1 a kidney */
} AwShape;

/* Writes the AW_SHAPE_N_POINTS points of the form's outline. */
void aw_shape_outline(const AwShape *shape, AwScanPoint *outline);

#endif

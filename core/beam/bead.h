/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BEAM_BEAD_H
#define AW_BEAM_BEAD_H

#include "base/point.h"
#include "beam/edge.h"

/* One position of a bead scan: the beam-stage reading and what the detector behind the bead counted. */
typedef struct {
  AwBeamPoint stage;
  double n_full, n_degraded; /* particles beside and through the bead */
} AwBeadPoint;

/* What deserves a word beside the numbers. */
typedef enum {
  AW_BEAD_POOR_FIT = 1 << 0, /* the counts scatter more than chance allows (p < 0.01): is the bead round and alone? */
  AW_BEAD_COARSE = 1 << 1    /* the bump is narrower than the step of the grid */
} AwBeadNote;

typedef struct {
  AwBeamPoint centre;          /* the reading that centres the bead on the beam */
  AwMatrix covariance_um2;     /* of the centre */
  AwEstimate sigma_x, sigma_y; /* um, of the bump: beam and bead together; equal unless elliptical */
  AwEstimate floor, peak;      /* degraded fraction far from the bead and at its centre */
  gboolean elliptical;
  double deviance;
  double p_value; /* aw_scoring_p_value */
  int n_judged_free;
  guint notes; /* AwBeadNote bits */
} AwBeadFit;

/**
 * aw_bead_fit: centre of a bead from a grid of positions: degraded fraction = floor + (peak - floor)
 * exp(-(x/sx)2/2 - (y/sy)2/2), maximum likelihood with binomial errors, started from moments.
 *
 * The shape is a stand-in for beam and bead folded together; by symmetry it leaves the centre free of bias.
 * AW_ERROR_RANGE: too few points, points on one line, negative or zero counts (the point is named by its number from
 * 1), no bead in the grid, a bead at its edge.
 */
gboolean aw_bead_fit(const AwBeadPoint *points, gsize n, gboolean elliptical, AwBeadFit *fit, GError **error);

/* Degraded fraction that the fit predicts. */
double aw_bead_predict(const AwBeadFit *fit, AwBeamPoint stage);

/* One finding of the beam offset o. */
typedef struct {
  double at_unix_s;
  double x_um, y_um;
  AwMatrix covariance_um2;
} AwOffsetCheck;

/* o = the reading that centres the mark on the beam minus the reading that puts it on the crosshair. */
AwOffsetCheck aw_bead_offset(const AwBeadFit *fit, AwBeamPoint crosshair, double at_unix_s);

/**
 * Drift of the beam as a random walk: variance per axis and hour, um2/h, from checks in any order, each step less its
 * errors of measurement; never below 0. NaN with fewer than two checks at different times.
 */
double aw_offset_drift(const AwOffsetCheck *checks, gsize n);

#endif

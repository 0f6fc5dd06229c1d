/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BEAM_EDGE_H
#define AW_BEAM_EDGE_H

#include <glib.h>

/* A value with its standard error; both NaN when it was not fitted. */
typedef struct {
  double value, se;
} AwEstimate;

/* One position of a knife-edge scan. */
typedef struct {
  double position_um;
  double n_full, n_degraded; /* particles of full and of degraded energy; unused for fractions */
  double fraction;           /* transmitted fraction 0 ... 1; for counts n_full / (n_full + n_degraded) */
} AwEdgePoint;

typedef struct {
  gboolean counts;       /* points carry counts: binomial errors; otherwise equal weights */
  gboolean fit_plateaus; /* fit the levels far from the edge instead of 0 and 1 */
} AwEdgeSettings;

/* What deserves a word beside the numbers. */
typedef enum {
  AW_EDGE_REVERSED = 1 << 0,     /* positions do not rise; they were sorted */
  AW_EDGE_REPEATED = 1 << 1,     /* a position stands more than once */
  AW_EDGE_COARSE = 1 << 2,       /* fewer than three points between 10 and 90 %: the width rests on the step */
  AW_EDGE_NOT_GAUSSIAN = 1 << 3, /* a uniform disc fits far better: use the disc's width */
  AW_EDGE_POOR_FIT = 1 << 4      /* the residuals exceed the counting errors (p < 0.01) */
} AwEdgeNote;

typedef struct {
  AwEstimate centre_um, sigma_um; /* of the Gaussian beam profile along the scan */
  AwEstimate fwhm_um, w1090_um,
      w1684_um;         /* 2.354820 sigma, 2.563103 sigma, 1.988916 sigma (ISO/TR 11146-3:2004 names) */
  AwEstimate low, high; /* plateaus; 0 and 1 without error unless fitted */
  gboolean rising;      /* the fraction rises with position */
  double misfit;        /* deviance for counts, residual sum of squares for fractions */
  int n_free;
  double p_value;          /* that chance alone scatters the counts so (aw_scoring_p_value); NaN for fractions */
  int n_judged_free;       /* degrees of freedom behind p_value */
  double disc_diameter_um; /* of the uniform disc that fits best */
  double disc_misfit;
  guint notes; /* AwEdgeNote bits */
} AwEdgeFit;

/**
 * aw_edge_fit: centre and width of the beam from a knife-edge scan: fraction = low + (high - low) Phi(+-(x -
 * centre)/sigma).
 *
 * Counts: maximum likelihood with binomial errors (probit regression; Finney 1971, Probit Analysis) by Fisher scoring;
 * fractions: least squares by the same steps with equal weights. Standard errors from the information matrix; for
 * fractions scaled by the residuals. A uniform disc is fitted beside it.
 * AW_ERROR_RANGE: too few points, a scan that stops short or misses one side (named), sigma that cannot be found;
 * negative or zero counts, fractions outside 0 ... 1 (the point is named by its number from 1).
 */
gboolean aw_edge_fit(const AwEdgePoint *points, gsize n, const AwEdgeSettings *settings, AwEdgeFit *fit,
                     GError **error);

/* Fraction that the fit predicts at a position; disc = TRUE takes the disc of the same centre. */
double aw_edge_predict(const AwEdgeFit *fit, double position_um, gboolean disc);

#endif

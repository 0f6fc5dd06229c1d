/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BEAM_SCORING_H
#define AW_BEAM_SCORING_H

#include <glib.h>

#define AW_MAX_SCORING_PARAMETERS 8

/**
 * AwScoring: a model of fractions fitted to points: by maximum likelihood for binomial counts, by least squares
 * otherwise. The caller fills all but the covariance; p holds the starting values and then the answer.
 */
typedef struct {
  gsize n;
  int n_parameters;       /* 1 ... AW_MAX_SCORING_PARAMETERS */
  const double *fraction; /* n observed fractions */
  const double *n_trials; /* n counts behind them, all above 0; NULL for least squares with equal weights */
  /* The model's fraction at point i; fills gradient (d fraction / d p) unless it is NULL. */
  double (*model)(const void *data, gsize i, const double *p, double *gradient);
  const void *data;
  double p[AW_MAX_SCORING_PARAMETERS];
  double covariance[AW_MAX_SCORING_PARAMETERS][AW_MAX_SCORING_PARAMETERS]; /* least squares: for unit variance */
} AwScoring;

/**
 * aw_scoring_fit: Fisher scoring (least squares: Gauss-Newton) with Levenberg's damping.
 *
 * FALSE when the points do not determine the parameters. Sources: Finney 1971, Probit Analysis; McCullagh & Nelder
 * 1989, Generalized Linear Models, section 2.5; Levenberg 1944.
 */
gboolean aw_scoring_fit(AwScoring *scoring);

/* Deviance (counts) or residual sum of squares at scoring->p. */
double aw_scoring_misfit(const AwScoring *scoring);

/**
 * Goodness of fit for counts: Pearson's chi square over the points that expect at least one count on either side,
 * since rarer ones hardly follow a chi square. *n_free gets its degrees of freedom; NaN with none left or without
 * counts.
 */
double aw_scoring_p_value(const AwScoring *scoring, int *n_free);

#endif

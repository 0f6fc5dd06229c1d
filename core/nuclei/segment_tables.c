/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/segment_tables.h"
#include "nuclei/segment_pieces.h"

/*
 * Logistic regression (Cox, J. R. Stat. Soc. B 20:215, 1958) on standardised features, their squares and products.
 * The coefficients were fitted on open images by tests/reference/fit_segment.py.
 */
static double log_odds(const double *feature, int n, const double *mean, const double *inverse_scale,
                       const double *weight)
{
  double z[AW_MAX_FEATURES], sum = *weight++;
  for (int i = 0; i < n; i++) {
    z[i] = CLAMP((feature[i] - mean[i]) * inverse_scale[i], -4, 4);
    sum += *weight++ * z[i];
  }
  for (int i = 0; i < n; i++)
    for (int j = i; j < n; j++)
      sum += *weight++ * 0.5 * z[i] * z[j];
  return sum;
}

double aw_pair_merge_odds(const double feature[AW_N_PAIR_FEATURES])
{
  return log_odds(feature, AW_N_PAIR_FEATURES, pair_mean, pair_scale, pair_weight);
}

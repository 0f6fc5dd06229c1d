/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/segment_tables.h"
#include "nuclei/segment_pieces.h"

/*
 * Logistic regression (Cox, J. R. Stat. Soc. B 20:215, 1958) on standardised features, their squares and products.
 * The coefficients were fitted on open images by tests/reference/fit_segment.py.
 */
static double quadratic(const double *feature, int n, const double *mean, const double *inverse_scale,
                        const double *weight)
{
  double z[AW_MAX_FEATURES], sum = *weight++;
  for (int i = 0; i < n; i++) {
    z[i] = CLAMP((feature[i] - mean[i]) * inverse_scale[i], -3, 3);
    sum += *weight++ * z[i];
  }
  for (int i = 0; i < n; i++)
    for (int j = i; j < n; j++)
      sum += *weight++ * 0.5 * z[i] * z[j];
  return sum;
}

double aw_pair_merge_odds(const double feature[AW_N_PAIR_FEATURES])
{
  return quadratic(feature, AW_N_PAIR_FEATURES, pair_mean, pair_scale, pair_weight);
}

double aw_outline_level(const double feature[AW_N_OUTLINE_FEATURES])
{
  double level = quadratic(feature, AW_N_OUTLINE_FEATURES, outline_mean, outline_scale, outline_weight);
  return CLAMP(level, 0.15, 0.6);
}

double aw_object_odds(const double feature[AW_N_OBJECT_FEATURES])
{
  return quadratic(feature, AW_N_OBJECT_FEATURES, object_mean, object_scale, object_weight);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "beam/scoring.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_linalg.h>
#include <math.h>
#include <string.h>

#include "base/quiet.h"

#define MAX_STEPS 200
#define TINY_P 1e-9

static double xlogy(double x, double y)
{
  return x > 0 ? x * log(y) : 0;
}

static double misfit_at(const AwScoring *s, const double *p)
{
  double sum = 0;
  for (gsize i = 0; i < s->n; i++) {
    double f = s->model(s->data, i, p, NULL), y = s->fraction[i];
    if (!s->n_trials) {
      sum += (y - f) * (y - f);
      continue;
    }
    f = CLAMP(f, TINY_P, 1 - TINY_P);
    sum += 2 * s->n_trials[i] * (xlogy(y, y / f) + xlogy(1 - y, (1 - y) / (1 - f)));
  }
  return sum;
}

double aw_scoring_misfit(const AwScoring *s)
{
  return misfit_at(s, s->p);
}

/* Information matrix J'WJ and score J'W(y - f) at s->p. */
static void normal_equations(const AwScoring *s, gsl_matrix *a, gsl_vector *b)
{
  gsl_matrix_set_zero(a);
  gsl_vector_set_zero(b);
  for (gsize i = 0; i < s->n; i++) {
    double g[AW_MAX_SCORING_PARAMETERS], f = s->model(s->data, i, s->p, g);
    double c = CLAMP(f, TINY_P, 1 - TINY_P), weight = s->n_trials ? s->n_trials[i] / (c * (1 - c)) : 1;
    for (int j = 0; j < s->n_parameters; j++) {
      *gsl_vector_ptr(b, (size_t)j) += weight * g[j] * (s->fraction[i] - f);
      for (int k = 0; k < s->n_parameters; k++)
        *gsl_matrix_ptr(a, (size_t)j, (size_t)k) += weight * g[j] * g[k];
    }
  }
}

/* Tries one damped step; TRUE when the misfit fell, *gain tells by how much. */
static gboolean try_step(AwScoring *s, const gsl_matrix *a, const gsl_vector *b, double damping, double now,
                         double *gain)
{
  size_t m = (size_t)s->n_parameters;
  gsl_matrix *damped = gsl_matrix_alloc(m, m);
  gsl_vector *step = gsl_vector_alloc(m);
  double p[AW_MAX_SCORING_PARAMETERS];
  gsl_matrix_memcpy(damped, a);
  for (size_t j = 0; j < m; j++)
    *gsl_matrix_ptr(damped, j, j) += damping * gsl_matrix_get(a, j, j) + 1e-300;
  gboolean ok = gsl_linalg_cholesky_decomp1(damped) == 0 && gsl_linalg_cholesky_solve(damped, b, step) == 0;
  memcpy(p, s->p, sizeof p);
  for (size_t j = 0; ok && j < m; j++)
    p[j] += gsl_vector_get(step, j);
  gsl_matrix_free(damped);
  gsl_vector_free(step);
  *gain = ok ? now - misfit_at(s, p) : -1;
  if (!(*gain >= 0))
    return FALSE;
  memcpy(s->p, p, sizeof p);
  return TRUE;
}

/* Inverse of the information matrix; FALSE when it has none. */
static gboolean invert_information(AwScoring *s, gsl_matrix *a)
{
  if (gsl_linalg_cholesky_decomp1(a) != 0 || gsl_linalg_cholesky_invert(a) != 0)
    return FALSE;
  for (int j = 0; j < s->n_parameters; j++)
    for (int k = 0; k < s->n_parameters; k++)
      s->covariance[j][k] = gsl_matrix_get(a, (size_t)j, (size_t)k);
  return TRUE;
}

gboolean aw_scoring_fit(AwScoring *s)
{
  g_return_val_if_fail(s->n_parameters > 0 && s->n_parameters <= AW_MAX_SCORING_PARAMETERS, FALSE);
  aw_gsl_quiet();
  size_t m = (size_t)s->n_parameters;
  gsl_matrix *a = gsl_matrix_alloc(m, m);
  gsl_vector *b = gsl_vector_alloc(m);
  double damping = 1e-3, gain = 1;
  for (int step = 0; step < MAX_STEPS && damping < 1e12; step++) {
    double now = misfit_at(s, s->p);
    normal_equations(s, a, b);
    if (!try_step(s, a, b, damping, now, &gain)) {
      damping *= 10;
      continue;
    }
    damping = fmax(damping / 10, 1e-12);
    if (gain <= 1e-13 * now + 1e-18)
      break;
  }
  normal_equations(s, a, b);
  gboolean ok = isfinite(misfit_at(s, s->p)) && invert_information(s, a);
  gsl_matrix_free(a);
  gsl_vector_free(b);
  return ok;
}

double aw_scoring_p_value(const AwScoring *s, int *n_free)
{
  double chi2 = 0;
  *n_free = -s->n_parameters;
  for (gsize i = 0; s->n_trials && i < s->n; i++) {
    double f = s->model(s->data, i, s->p, NULL), m = s->n_trials[i], off = s->fraction[i] - f;
    if (m * f < 1 || m * (1 - f) < 1)
      continue;
    chi2 += m * off * off / (f * (1 - f));
    (*n_free)++;
  }
  *n_free = MAX(*n_free, 0);
  return *n_free > 0 ? gsl_cdf_chisq_Q(chi2, *n_free) : NAN;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "beam/edge.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_linalg.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/error.h"
#include "base/quiet.h"
#include "base/text.h"

#define MAX_STEPS 200
#define FWHM_OVER_SIGMA 2.3548200450309493
#define W1090_OVER_SIGMA 2.5631031310892007
#define W1684_OVER_SIGMA 1.9889157653063543
#define DISC_SIGMA_OVER_DIAMETER 0.25
#define TINY_P 1e-9

/* Parameters in the order of the vector: centre, log sigma, low, high. */
enum { CENTRE, LOG_SIGMA, LOW, HIGH, MAX_PARAMETERS };

/* A profile's share beyond the edge at u = (x - centre) / sigma, and its derivative. */
typedef struct {
  double (*share)(double u);
  double (*slope)(double u);
} Profile;

static double gauss_share(double u)
{
  return gsl_cdf_ugaussian_P(u);
}

static double gauss_slope(double u)
{
  return gsl_ran_ugaussian_pdf(u);
}

/* A uniform disc of diameter D has sigma D / 4, so its rim stands at u = 2. */
static double disc_share(double u)
{
  double v = CLAMP(u / 2, -1.0, 1.0);
  return 0.5 + (v * sqrt(1 - v * v) + asin(v)) / G_PI;
}

static double disc_slope(double u)
{
  double v = u / 2;
  return fabs(v) < 1 ? sqrt(1 - v * v) / G_PI : 0;
}

static const Profile gaussian = { gauss_share, gauss_slope }, disc = { disc_share, disc_slope };

/* One fit under way. */
typedef struct {
  const AwEdgePoint *points;
  gsize n;
  gboolean counts;
  int n_parameters;
  double sign; /* +1 when the fraction rises */
  const Profile *profile;
  double p[MAX_PARAMETERS];
  double covariance[MAX_PARAMETERS][MAX_PARAMETERS];
} Work;

static double predict(const Work *w, const double *p, double x)
{
  return p[LOW] + (p[HIGH] - p[LOW]) * w->profile->share(w->sign * (x - p[CENTRE]) / exp(p[LOG_SIGMA]));
}

static double xlogy(double x, double y)
{
  return x > 0 ? x * log(y) : 0;
}

/* Deviance for counts, residual sum of squares for fractions. */
static double misfit(const Work *w, const double *p)
{
  double sum = 0;
  for (gsize i = 0; i < w->n; i++) {
    const AwEdgePoint *point = &w->points[i];
    double f = predict(w, p, point->position_um);
    if (!w->counts) {
      sum += (point->fraction - f) * (point->fraction - f);
      continue;
    }
    f = CLAMP(f, TINY_P, 1 - TINY_P);
    sum += 2 * (xlogy(point->n_full, point->fraction / f) + xlogy(point->n_degraded, (1 - point->fraction) / (1 - f)));
  }
  return sum;
}

static void gradient(const Work *w, double x, double *g)
{
  double sigma = exp(w->p[LOG_SIGMA]), u = w->sign * (x - w->p[CENTRE]) / sigma;
  double height = w->p[HIGH] - w->p[LOW], slope = w->profile->slope(u), share = w->profile->share(u);
  g[CENTRE] = -height * slope * w->sign / sigma;
  g[LOG_SIGMA] = -height * slope * u;
  g[LOW] = 1 - share;
  g[HIGH] = share;
}

/* Information matrix J'WJ and score J'W(y - f) at w->p. */
static void normal_equations(const Work *w, gsl_matrix *a, gsl_vector *b)
{
  gsl_matrix_set_zero(a);
  gsl_vector_set_zero(b);
  for (gsize i = 0; i < w->n; i++) {
    const AwEdgePoint *point = &w->points[i];
    double g[MAX_PARAMETERS], f = predict(w, w->p, point->position_um);
    double c = CLAMP(f, TINY_P, 1 - TINY_P);
    double weight = w->counts ? (point->n_full + point->n_degraded) / (c * (1 - c)) : 1;
    gradient(w, point->position_um, g);
    for (int j = 0; j < w->n_parameters; j++) {
      *gsl_vector_ptr(b, (size_t)j) += weight * g[j] * (point->fraction - f);
      for (int k = 0; k < w->n_parameters; k++)
        *gsl_matrix_ptr(a, (size_t)j, (size_t)k) += weight * g[j] * g[k];
    }
  }
}

/* Tries one damped step; TRUE when the misfit fell, *gain tells by how much. */
static gboolean try_step(Work *w, const gsl_matrix *a, const gsl_vector *b, double damping, double now, double *gain)
{
  size_t m = (size_t)w->n_parameters;
  gsl_matrix *damped = gsl_matrix_alloc(m, m);
  gsl_vector *step = gsl_vector_alloc(m);
  double p[MAX_PARAMETERS];
  gsl_matrix_memcpy(damped, a);
  for (size_t j = 0; j < m; j++)
    *gsl_matrix_ptr(damped, j, j) += damping * gsl_matrix_get(a, j, j) + 1e-300;
  gboolean ok = gsl_linalg_cholesky_decomp1(damped) == 0 && gsl_linalg_cholesky_solve(damped, b, step) == 0;
  memcpy(p, w->p, sizeof p);
  for (size_t j = 0; ok && j < m; j++)
    p[j] += gsl_vector_get(step, j);
  gsl_matrix_free(damped);
  gsl_vector_free(step);
  *gain = ok ? now - misfit(w, p) : -1;
  if (!(*gain >= 0))
    return FALSE;
  memcpy(w->p, p, sizeof p);
  return TRUE;
}

/* Inverse of the information matrix; FALSE when it has none. */
static gboolean invert_information(Work *w, gsl_matrix *a)
{
  if (gsl_linalg_cholesky_decomp1(a) != 0 || gsl_linalg_cholesky_invert(a) != 0)
    return FALSE;
  for (int j = 0; j < w->n_parameters; j++)
    for (int k = 0; k < w->n_parameters; k++)
      w->covariance[j][k] = gsl_matrix_get(a, (size_t)j, (size_t)k);
  return TRUE;
}

/* Fisher scoring (Gauss-Newton for fractions) with Levenberg's damping. FALSE when no answer is found. */
static gboolean iterate(Work *w)
{
  size_t m = (size_t)w->n_parameters;
  gsl_matrix *a = gsl_matrix_alloc(m, m);
  gsl_vector *b = gsl_vector_alloc(m);
  double damping = 1e-3, gain = 1;
  for (int step = 0; step < MAX_STEPS && damping < 1e12; step++) {
    double now = misfit(w, w->p);
    normal_equations(w, a, b);
    if (!try_step(w, a, b, damping, now, &gain)) {
      damping *= 10;
      continue;
    }
    damping = fmax(damping / 10, 1e-12);
    if (gain <= 1e-13 * now + 1e-18)
      break;
  }
  normal_equations(w, a, b);
  gboolean ok = isfinite(misfit(w, w->p)) && invert_information(w, a);
  gsl_matrix_free(a);
  gsl_vector_free(b);
  return ok;
}

static int compare_points(const void *a, const void *b)
{
  double x = ((const AwEdgePoint *)a)->position_um, y = ((const AwEdgePoint *)b)->position_um;
  return (x > y) - (x < y);
}

static gboolean check_point(const AwEdgePoint *p, gsize number, gboolean counts, GError **error)
{
  const char *wrong = NULL;
  if (!isfinite(p->position_um))
    wrong = "its position is not a number";
  else if (counts && (!(p->n_full >= 0) || !(p->n_degraded >= 0)))
    wrong = "a count is negative";
  else if (counts && p->n_full + p->n_degraded <= 0)
    wrong = "no particle was counted";
  else if (!counts && !(p->fraction >= 0 && p->fraction <= 1))
    wrong = "its fraction is outside 0 to 1";
  if (!wrong)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "point %" G_GSIZE_FORMAT " of the edge scan: %s", number, wrong);
  return FALSE;
}

/* Sorted points with fractions filled in; notes on order and repeats. */
static AwEdgePoint *prepare(const AwEdgePoint *points, gsize n, gboolean counts, guint *notes, GError **error)
{
  g_autofree AwEdgePoint *sorted = g_memdup2(points, n * sizeof *points);
  gboolean rises = TRUE;
  for (gsize i = 0; i < n; i++) {
    if (!check_point(&points[i], i + 1, counts, error))
      return NULL;
    if (counts)
      sorted[i].fraction = points[i].n_full / (points[i].n_full + points[i].n_degraded);
    rises &= i == 0 || points[i].position_um >= points[i - 1].position_um;
  }
  qsort(sorted, n, sizeof *sorted, compare_points);
  for (gsize i = 1; i < n; i++)
    if (sorted[i].position_um == sorted[i - 1].position_um)
      *notes |= AW_EDGE_REPEATED;
  *notes |= rises ? 0 : AW_EDGE_REVERSED;
  return g_steal_pointer(&sorted);
}

/* Mean fraction of the `k` points from index i on. */
static double mean_of(const AwEdgePoint *p, gsize i, gsize k)
{
  double sum = 0;
  for (gsize j = i; j < i + k; j++)
    sum += p[j].fraction;
  return sum / (double)k;
}

/* Position where the fraction first passes `level` of the way from the left end to the right one. */
static double crossing(const AwEdgePoint *p, gsize n, double left, double right, double level)
{
  double wanted = left + level * (right - left), sign = right > left ? 1 : -1;
  for (gsize i = 1; i < n; i++) {
    double a = sign * (p[i - 1].fraction - wanted), b = sign * (p[i].fraction - wanted);
    if (a <= 0 && b > 0)
      return p[i - 1].position_um + (p[i].position_um - p[i - 1].position_um) * (a / (a - b));
  }
  return (p[0].position_um + p[n - 1].position_um) / 2;
}

/* A scan must show both sides of the edge: with fixed plateaus it reaches below 16 % and above 84 %. */
static gboolean check_sides(const AwEdgePoint *p, gsize n, gboolean fit_plateaus, GError **error)
{
  gsize k = MAX(1, n / 8);
  double left = mean_of(p, 0, k), right = mean_of(p, n - k, k);
  double low = fmin(left, right), high = fmax(left, right);
  g_autofree char *at_left = aw_text_from_double(left, 3), *at_right = aw_text_from_double(right, 3);
  if (high - low < (fit_plateaus ? 0.2 : 0.1)) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "the edge scan shows no edge: the fraction is %s at one end and %s at the other", at_left, at_right);
    return FALSE;
  }
  if (fit_plateaus || (low <= 0.16 && high >= 0.84))
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "the edge scan %s: at its ends the fraction is %s and %s, but it must come below 0.16 and above 0.84; "
              "scan farther, or fit the plateaus",
              high < 0.84 ? "stops short of the open side" : "stops short of the covered side", at_left, at_right);
  return FALSE;
}

static void set_start(Work *w, gboolean fit_plateaus)
{
  gsize k = MAX(1, w->n / 8);
  double left = mean_of(w->points, 0, k), right = mean_of(w->points, w->n - k, k);
  double range = w->points[w->n - 1].position_um - w->points[0].position_um;
  w->sign = right > left ? 1 : -1;
  double a = crossing(w->points, w->n, left, right, 0.16), b = crossing(w->points, w->n, left, right, 0.84);
  w->p[CENTRE] = crossing(w->points, w->n, left, right, 0.5);
  w->p[LOG_SIGMA] = log(fmax(fabs(b - a) / 2, range / (double)w->n / 4));
  w->p[LOW] = fit_plateaus ? fmin(left, right) : 0;
  w->p[HIGH] = fit_plateaus ? fmax(left, right) : 1;
}

static AwEstimate scaled(double value, double se, double factor)
{
  return (AwEstimate){ value * factor, se * factor };
}

static void fill_estimates(const Work *w, AwEdgeFit *fit)
{
  double scale = w->counts ? 1 : fit->n_free > 0 ? fit->misfit / fit->n_free : NAN;
  double sigma = exp(w->p[LOG_SIGMA]), sigma_se = sigma * sqrt(scale * w->covariance[LOG_SIGMA][LOG_SIGMA]);
  gboolean levels = w->n_parameters > LOW;
  fit->centre_um = (AwEstimate){ w->p[CENTRE], sqrt(scale * w->covariance[CENTRE][CENTRE]) };
  fit->sigma_um = (AwEstimate){ sigma, sigma_se };
  fit->fwhm_um = scaled(sigma, sigma_se, FWHM_OVER_SIGMA);
  fit->w1090_um = scaled(sigma, sigma_se, W1090_OVER_SIGMA);
  fit->w1684_um = scaled(sigma, sigma_se, W1684_OVER_SIGMA);
  fit->low = (AwEstimate){ w->p[LOW], levels ? sqrt(scale * w->covariance[LOW][LOW]) : 0 };
  fit->high = (AwEstimate){ w->p[HIGH], levels ? sqrt(scale * w->covariance[HIGH][HIGH]) : 0 };
}

static gsize n_on_slope(const Work *w)
{
  gsize n = 0;
  for (gsize i = 0; i < w->n; i++) {
    double share = (predict(w, w->p, w->points[i].position_um) - w->p[LOW]) / (w->p[HIGH] - w->p[LOW]);
    n += share > 0.1 && share < 0.9;
  }
  return n;
}

/* The disc is preferred when it fits better by more than chance allows; for fractions by the ratio of the sums. */
static void judge_shape(const Work *w, AwEdgeFit *fit)
{
  Work other = *w;
  other.profile = &disc;
  if (iterate(&other)) {
    fit->disc_diameter_um = exp(other.p[LOG_SIGMA]) / DISC_SIGMA_OVER_DIAMETER;
    fit->disc_misfit = misfit(&other, other.p);
    gboolean better = w->counts ? fit->disc_misfit < fit->misfit - 10 : fit->disc_misfit < 0.5 * fit->misfit;
    fit->notes |= better ? AW_EDGE_NOT_GAUSSIAN : 0;
  }
  if (w->counts && fit->p_value < 0.01)
    fit->notes |= AW_EDGE_POOR_FIT;
  if (n_on_slope(w) < 3)
    fit->notes |= AW_EDGE_COARSE;
}

gboolean aw_edge_fit(const AwEdgePoint *points, gsize n, const AwEdgeSettings *settings, AwEdgeFit *fit, GError **error)
{
  int n_parameters = settings->fit_plateaus ? 4 : 2;
  aw_gsl_quiet();
  *fit = (AwEdgeFit){ .p_value = NAN, .disc_diameter_um = NAN, .disc_misfit = NAN };
  if ((gsize)n_parameters + 2 > n) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "the edge scan has %" G_GSIZE_FORMAT " points; this fit needs at least %d", n, n_parameters + 2);
    return FALSE;
  }
  g_autofree AwEdgePoint *sorted = prepare(points, n, settings->counts, &fit->notes, error);
  if (!sorted || !check_sides(sorted, n, settings->fit_plateaus, error))
    return FALSE;
  Work w = { .points = sorted, .n = n, .counts = settings->counts, .n_parameters = n_parameters, .profile = &gaussian };
  set_start(&w, settings->fit_plateaus);
  if (!iterate(&w)) {
    g_set_error_literal(error, AW_ERROR, AW_ERROR_RANGE,
                        "the edge scan does not determine a width: too few points on the slope of the edge");
    return FALSE;
  }
  fit->rising = w.sign > 0;
  fit->misfit = misfit(&w, w.p);
  fit->n_free = (int)n - n_parameters;
  fit->p_value = settings->counts ? gsl_cdf_chisq_Q(fit->misfit, fit->n_free) : NAN;
  fill_estimates(&w, fit);
  judge_shape(&w, fit);
  return TRUE;
}

double aw_edge_predict(const AwEdgeFit *fit, double position_um, gboolean as_disc)
{
  double sigma = as_disc ? fit->disc_diameter_um * DISC_SIGMA_OVER_DIAMETER : fit->sigma_um.value;
  double u = (fit->rising ? 1 : -1) * (position_um - fit->centre_um.value) / sigma;
  return fit->low.value + (fit->high.value - fit->low.value) * (as_disc ? disc_share(u) : gauss_share(u));
}

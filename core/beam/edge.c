/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "beam/edge.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdlib.h>

#include "base/error.h"
#include "base/text.h"
#include "beam/scoring.h"

#define FWHM_OVER_SIGMA 2.3548200450309493
#define W1090_OVER_SIGMA 2.5631031310892007
#define W1684_OVER_SIGMA 1.9889157653063543
#define DISC_SIGMA_OVER_DIAMETER 0.25

/* Parameters in the order of the vector; the plateaus as angles (Fisher's arcsine transformation), which keeps them
 * within 0 and 1 and lets them reach either. */
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

/* What the model knows besides its parameters. */
typedef struct {
  const AwEdgePoint *points; /* sorted */
  double sign;               /* +1 when the fraction rises */
  const Profile *profile;
} Work;

static double from_angle(double angle)
{
  return sin(angle) * sin(angle);
}

static double to_angle(double fraction)
{
  return asin(sqrt(CLAMP(fraction, 1e-4, 1 - 1e-4)));
}

/* The model of aw_scoring_fit. */
static double model(const void *data, gsize i, const double *p, double *gradient)
{
  const Work *w = data;
  double sigma = exp(p[LOG_SIGMA]), u = w->sign * (w->points[i].position_um - p[CENTRE]) / sigma;
  double low = from_angle(p[LOW]), height = from_angle(p[HIGH]) - low, share = w->profile->share(u);
  if (gradient) {
    double slope = w->profile->slope(u);
    gradient[CENTRE] = -height * slope * w->sign / sigma;
    gradient[LOG_SIGMA] = -height * slope * u;
    gradient[LOW] = sin(2 * p[LOW]) * (1 - share);
    gradient[HIGH] = sin(2 * p[HIGH]) * share;
  }
  return low + height * share;
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

static void set_start(Work *w, AwScoring *s, gboolean fit_plateaus)
{
  gsize n = s->n, k = MAX(1, n / 8);
  double left = mean_of(w->points, 0, k), right = mean_of(w->points, n - k, k);
  double range = w->points[n - 1].position_um - w->points[0].position_um;
  w->sign = right > left ? 1 : -1;
  double a = crossing(w->points, n, left, right, 0.16), b = crossing(w->points, n, left, right, 0.84);
  s->p[CENTRE] = crossing(w->points, n, left, right, 0.5);
  s->p[LOG_SIGMA] = log(fmax(fabs(b - a) / 2, range / (double)n / 4));
  s->p[LOW] = fit_plateaus ? to_angle(fmin(left, right)) : 0;
  s->p[HIGH] = fit_plateaus ? to_angle(fmax(left, right)) : G_PI / 2;
}

static AwEstimate scaled(double value, double se, double factor)
{
  return (AwEstimate){ value * factor, se * factor };
}

static void fill_estimates(const AwScoring *s, AwEdgeFit *fit)
{
  double scale = s->n_trials ? 1 : fit->n_free > 0 ? fit->misfit / fit->n_free : NAN;
  double sigma = exp(s->p[LOG_SIGMA]), sigma_se = sigma * sqrt(scale * s->covariance[LOG_SIGMA][LOG_SIGMA]);
  gboolean levels = s->n_parameters > LOW;
  fit->centre_um = (AwEstimate){ s->p[CENTRE], sqrt(scale * s->covariance[CENTRE][CENTRE]) };
  fit->sigma_um = (AwEstimate){ sigma, sigma_se };
  fit->fwhm_um = scaled(sigma, sigma_se, FWHM_OVER_SIGMA);
  fit->w1090_um = scaled(sigma, sigma_se, W1090_OVER_SIGMA);
  fit->w1684_um = scaled(sigma, sigma_se, W1684_OVER_SIGMA);
  double low_se = levels ? fabs(sin(2 * s->p[LOW])) * sqrt(scale * s->covariance[LOW][LOW]) : 0;
  double high_se = levels ? fabs(sin(2 * s->p[HIGH])) * sqrt(scale * s->covariance[HIGH][HIGH]) : 0;
  fit->low = (AwEstimate){ from_angle(s->p[LOW]), low_se };
  fit->high = (AwEstimate){ from_angle(s->p[HIGH]), high_se };
}

static gsize n_on_slope(const AwScoring *s)
{
  gsize n = 0;
  for (gsize i = 0; i < s->n; i++) {
    double low = from_angle(s->p[LOW]), height = from_angle(s->p[HIGH]) - low;
    double share = (s->model(s->data, i, s->p, NULL) - low) / height;
    n += share > 0.1 && share < 0.9;
  }
  return n;
}

/* The disc is preferred when it fits better by more than chance allows; for fractions by the ratio of the sums. */
static void judge_shape(const AwScoring *s, const Work *w, AwEdgeFit *fit)
{
  Work as_disc = *w;
  AwScoring other = *s;
  as_disc.profile = &disc;
  other.data = &as_disc;
  if (aw_scoring_fit(&other)) {
    fit->disc_diameter_um = exp(other.p[LOG_SIGMA]) / DISC_SIGMA_OVER_DIAMETER;
    fit->disc_misfit = aw_scoring_misfit(&other);
    gboolean better = s->n_trials ? fit->disc_misfit < fit->misfit - 10 : fit->disc_misfit < 0.5 * fit->misfit;
    fit->notes |= better ? AW_EDGE_NOT_GAUSSIAN : 0;
  }
  if (fit->p_value < 0.01)
    fit->notes |= AW_EDGE_POOR_FIT;
  if (n_on_slope(s) < 3)
    fit->notes |= AW_EDGE_COARSE;
}

/* Fits the sorted points, whose sides have been checked. */
static gboolean fit_sorted(const AwEdgePoint *sorted, gsize n, const AwEdgeSettings *settings, AwEdgeFit *fit,
                           GError **error)
{
  g_autofree double *fraction = g_new(double, n), *n_trials = g_new(double, n);
  for (gsize i = 0; i < n; i++) {
    fraction[i] = sorted[i].fraction;
    n_trials[i] = sorted[i].n_full + sorted[i].n_degraded;
  }
  Work w = { .points = sorted, .profile = &gaussian };
  AwScoring s = { .n = n, .n_parameters = settings->fit_plateaus ? 4 : 2, .fraction = fraction, .model = model };
  s.n_trials = settings->counts ? n_trials : NULL;
  s.data = &w;
  set_start(&w, &s, settings->fit_plateaus);
  if (!aw_scoring_fit(&s)) {
    g_set_error_literal(error, AW_ERROR, AW_ERROR_RANGE,
                        "the edge scan does not determine a width: too few points on the slope of the edge");
    return FALSE;
  }
  fit->rising = w.sign > 0;
  fit->misfit = aw_scoring_misfit(&s);
  fit->n_free = (int)n - s.n_parameters;
  fit->p_value = aw_scoring_p_value(&s, &fit->n_judged_free);
  fill_estimates(&s, fit);
  judge_shape(&s, &w, fit);
  return TRUE;
}

gboolean aw_edge_fit(const AwEdgePoint *points, gsize n, const AwEdgeSettings *settings, AwEdgeFit *fit, GError **error)
{
  int n_parameters = settings->fit_plateaus ? 4 : 2;
  *fit = (AwEdgeFit){ .p_value = NAN, .disc_diameter_um = NAN, .disc_misfit = NAN };
  if ((gsize)n_parameters + 2 > n) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "the edge scan has %" G_GSIZE_FORMAT " points; this fit needs at least %d", n, n_parameters + 2);
    return FALSE;
  }
  g_autofree AwEdgePoint *sorted = prepare(points, n, settings->counts, &fit->notes, error);
  return sorted && check_sides(sorted, n, settings->fit_plateaus, error) && fit_sorted(sorted, n, settings, fit, error);
}

double aw_edge_predict(const AwEdgeFit *fit, double position_um, gboolean as_disc)
{
  double sigma = as_disc ? fit->disc_diameter_um * DISC_SIGMA_OVER_DIAMETER : fit->sigma_um.value;
  double u = (fit->rising ? 1 : -1) * (position_um - fit->centre_um.value) / sigma;
  return fit->low.value + (fit->high.value - fit->low.value) * (as_disc ? disc_share(u) : gauss_share(u));
}

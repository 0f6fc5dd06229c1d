/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "beam/bead.h"

#include <math.h>
#include <stdlib.h>

#include "base/error.h"
#include "base/text.h"
#include "beam/scoring.h"

/* A bead is there when the bump lowers the deviance by more than this: p below 1e-5 for four parameters. */
#define MIN_EVIDENCE 28.5

/* Parameters in the order of the vector; floor and peak as angles, sigmas as logarithms. */
enum { X, Y, FLOOR, PEAK, LOG_SX, LOG_SY, N_ELLIPTICAL };

/* A fraction from its angle and back: the information about the angle is the same everywhere (Fisher's arcsine
 * transformation), so that a floor of 0 or a peak of 1 does no harm. */
static double from_angle(double angle)
{
  return sin(angle) * sin(angle);
}

static double to_angle(double fraction)
{
  return asin(sqrt(CLAMP(fraction, 1e-3, 1 - 1e-3)));
}

/* The model of aw_scoring_fit for a circular bump (LOG_SY unused) and an elliptical one. */
static double predict(const AwBeadPoint *point, const double *p, gboolean elliptical, double *g)
{
  double sx = exp(p[LOG_SX]), sy = elliptical ? exp(p[LOG_SY]) : sx;
  double u = (point->stage.bx_um - p[X]) / sx, v = (point->stage.by_um - p[Y]) / sy;
  double bump = exp(-(u * u + v * v) / 2), low = from_angle(p[FLOOR]), high = from_angle(p[PEAK]);
  double height = (high - low) * bump;
  if (g) {
    g[X] = height * u / sx;
    g[Y] = height * v / sy;
    g[FLOOR] = sin(2 * p[FLOOR]) * (1 - bump);
    g[PEAK] = sin(2 * p[PEAK]) * bump;
    g[LOG_SX] = height * (elliptical ? u * u : u * u + v * v);
    if (elliptical)
      g[LOG_SY] = height * v * v;
  }
  return low + height;
}

static double circular(const void *points, gsize i, const double *p, double *gradient)
{
  return predict((const AwBeadPoint *)points + i, p, FALSE, gradient);
}

static double elliptic(const void *points, gsize i, const double *p, double *gradient)
{
  return predict((const AwBeadPoint *)points + i, p, TRUE, gradient);
}

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* The extent of the grid and its finest step along one axis. */
typedef struct {
  double min, max, step;
  gsize n_different;
} Extent;

static Extent extent_of(const AwBeadPoint *points, gsize n, gboolean along_y)
{
  g_autofree double *at = g_new(double, n);
  for (gsize i = 0; i < n; i++)
    at[i] = along_y ? points[i].stage.by_um : points[i].stage.bx_um;
  qsort(at, n, sizeof *at, compare_doubles);
  Extent e = { at[0], at[n - 1], 0, 1 };
  double same = 1e-6 * (e.max - e.min);
  for (gsize i = 1; i < n; i++)
    e.n_different += at[i] - at[i - 1] > same;
  e.step = (e.max - e.min) / (double)MAX(e.n_different - 1, 1);
  return e;
}

static gboolean check_points(const AwBeadPoint *points, gsize n, GError **error)
{
  for (gsize i = 0; i < n; i++) {
    const AwBeadPoint *p = &points[i];
    const char *wrong = NULL;
    if (!isfinite(p->stage.bx_um) || !isfinite(p->stage.by_um))
      wrong = "its position is not a number";
    else if (!(p->n_full >= 0) || !(p->n_degraded >= 0))
      wrong = "a count is negative";
    else if (p->n_full + p->n_degraded <= 0)
      wrong = "no particle was counted";
    if (wrong) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "point %" G_GSIZE_FORMAT " of the bead scan: %s", i + 1, wrong);
      return FALSE;
    }
  }
  return TRUE;
}

static gboolean check_grid(const Extent *x, const Extent *y, gsize n, gsize needed, GError **error)
{
  if (n < needed || x->n_different < 3 || y->n_different < 3) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "the bead scan has %" G_GSIZE_FORMAT " points at %" G_GSIZE_FORMAT
                " positions in x and %" G_GSIZE_FORMAT " in y; this fit needs at least %" G_GSIZE_FORMAT
                " points and 3 positions in each",
                n, x->n_different, y->n_different, needed);
    return FALSE;
  }
  return TRUE;
}

/* Floor from the lower quarter of the fractions, peak from the largest, the rest from moments of what stands above
 * half of the way between them. */
static void set_start(AwScoring *s, const AwBeadPoint *points, const Extent *x, const Extent *y)
{
  g_autofree double *sorted = g_memdup2(s->fraction, s->n * sizeof(double));
  qsort(sorted, s->n, sizeof *sorted, compare_doubles);
  double low = sorted[s->n / 4], high = sorted[s->n - 1], sum = 0, mx = 0, my = 0, squares = 0;
  for (gsize i = 0; i < s->n; i++) {
    double w = fmax(s->fraction[i] - (low + high) / 2, high > low ? 0 : 1);
    double dx = points[i].stage.bx_um - x->min, dy = points[i].stage.by_um - y->min;
    sum += w;
    mx += w * dx;
    my += w * dy;
    squares += w * (dx * dx + dy * dy);
  }
  double spread = (squares - (mx * mx + my * my) / sum) / sum / 2;
  s->p[X] = x->min + mx / sum;
  s->p[Y] = y->min + my / sum;
  s->p[FLOOR] = to_angle(low);
  s->p[PEAK] = to_angle(high);
  s->p[LOG_SX] = s->p[LOG_SY] = log(fmax(1.5 * sqrt(fmax(spread, 0)), fmin(x->step, y->step) / 2));
}

/* Deviance of one fraction for all points. */
static double flat_deviance(const AwScoring *s)
{
  double degraded = 0, all = 0, sum = 0;
  for (gsize i = 0; i < s->n; i++) {
    degraded += s->n_trials[i] * s->fraction[i];
    all += s->n_trials[i];
  }
  for (gsize i = 0; i < s->n; i++) {
    double y = s->fraction[i], f = degraded / all;
    sum += 2 * s->n_trials[i] * ((y > 0 ? y * log(y / f) : 0) + (y < 1 ? (1 - y) * log((1 - y) / (1 - f)) : 0));
  }
  return sum;
}

/* "(x, y)" to two places. Free with g_free. */
static char *place_text(double x, double y)
{
  g_autofree char *across = aw_text_from_double(x, 2), *up = aw_text_from_double(y, 2);
  return g_strdup_printf("(%s, %s)", across, up);
}

static gboolean judge(const AwScoring *s, gboolean found, const Extent *x, const Extent *y, GError **error)
{
  if (!found || from_angle(s->p[PEAK]) <= from_angle(s->p[FLOOR]) ||
      flat_deviance(s) - aw_scoring_misfit(s) < MIN_EVIDENCE) {
    g_set_error_literal(error, AW_ERROR, AW_ERROR_RANGE,
                        "the bead scan shows no bead: the degraded fraction is the same everywhere within its errors");
    return FALSE;
  }
  double sx = exp(s->p[LOG_SX]), sy = exp(s->p[s->n_parameters == N_ELLIPTICAL ? LOG_SY : LOG_SX]);
  double room_x = fmin(s->p[X] - x->min, x->max - s->p[X]), room_y = fmin(s->p[Y] - y->min, y->max - s->p[Y]);
  if (room_x >= sx && room_y >= sy)
    return TRUE;
  g_autofree char *at = place_text(s->p[X], s->p[Y]), *sigma = place_text(sx, sy);
  g_autofree char *from = place_text(x->min, y->min), *to = place_text(x->max, y->max);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "the bead lies at the edge of the grid: its centre %s um must stand at least one sigma %s um inside the "
              "grid from %s to %s um; scan round the bead",
              at, sigma, from, to);
  return FALSE;
}

static AwEstimate estimate(const AwScoring *s, int parameter, double value, double slope)
{
  return (AwEstimate){ value, slope * sqrt(s->covariance[parameter][parameter]) };
}

static void fill(const AwScoring *s, const Extent *x, const Extent *y, AwBeadFit *fit)
{
  int last = fit->elliptical ? LOG_SY : LOG_SX;
  double low = from_angle(s->p[FLOOR]), high = from_angle(s->p[PEAK]);
  fit->centre = (AwBeamPoint){ s->p[X], s->p[Y] };
  fit->covariance_um2 =
      (AwMatrix){ s->covariance[X][X], s->covariance[X][Y], s->covariance[Y][X], s->covariance[Y][Y] };
  fit->sigma_x = estimate(s, LOG_SX, exp(s->p[LOG_SX]), exp(s->p[LOG_SX]));
  fit->sigma_y = estimate(s, last, exp(s->p[last]), exp(s->p[last]));
  fit->floor = estimate(s, FLOOR, low, fabs(sin(2 * s->p[FLOOR])));
  fit->peak = estimate(s, PEAK, high, fabs(sin(2 * s->p[PEAK])));
  fit->deviance = aw_scoring_misfit(s);
  fit->p_value = aw_scoring_p_value(s, &fit->n_judged_free);
  fit->notes |= fit->p_value < 0.01 ? AW_BEAD_POOR_FIT : 0;
  fit->notes |= fit->sigma_x.value < x->step / 2 || fit->sigma_y.value < y->step / 2 ? AW_BEAD_COARSE : 0;
}

gboolean aw_bead_fit(const AwBeadPoint *points, gsize n, gboolean elliptical, AwBeadFit *fit, GError **error)
{
  *fit = (AwBeadFit){ .elliptical = elliptical };
  if (!check_points(points, n, error))
    return FALSE;
  Extent x = n > 0 ? extent_of(points, n, FALSE) : (Extent){ 0 }, y = n > 0 ? extent_of(points, n, TRUE) : x;
  AwScoring s = { .n = n, .n_parameters = elliptical ? N_ELLIPTICAL : LOG_SY, .data = points };
  if (!check_grid(&x, &y, n, (gsize)s.n_parameters + 2, error))
    return FALSE;
  g_autofree double *fraction = g_new(double, n), *n_trials = g_new(double, n);
  for (gsize i = 0; i < n; i++) {
    n_trials[i] = points[i].n_full + points[i].n_degraded;
    fraction[i] = points[i].n_degraded / n_trials[i];
  }
  s.fraction = fraction;
  s.n_trials = n_trials;
  s.model = elliptical ? elliptic : circular;
  set_start(&s, points, &x, &y);
  gboolean found = aw_scoring_fit(&s);
  if (!judge(&s, found, &x, &y, error))
    return FALSE;
  fill(&s, &x, &y, fit);
  return TRUE;
}

double aw_bead_predict(const AwBeadFit *fit, AwBeamPoint stage)
{
  double u = (stage.bx_um - fit->centre.bx_um) / fit->sigma_x.value;
  double v = (stage.by_um - fit->centre.by_um) / fit->sigma_y.value;
  return fit->floor.value + (fit->peak.value - fit->floor.value) * exp(-(u * u + v * v) / 2);
}

AwOffsetCheck aw_bead_offset(const AwBeadFit *fit, AwBeamPoint crosshair, double at_unix_s)
{
  return (AwOffsetCheck){ at_unix_s, fit->centre.bx_um - crosshair.bx_um, fit->centre.by_um - crosshair.by_um,
                          fit->covariance_um2 };
}

static int compare_checks(const void *a, const void *b)
{
  double x = ((const AwOffsetCheck *)a)->at_unix_s, y = ((const AwOffsetCheck *)b)->at_unix_s;
  return (x > y) - (x < y);
}

/* Steps of a random walk: the sum of squared steps less the variances of both ends, over the time they took. */
double aw_offset_drift(const AwOffsetCheck *checks, gsize n)
{
  if (n < 2)
    return NAN;
  g_autofree AwOffsetCheck *c = g_memdup2(checks, n * sizeof *checks);
  qsort(c, n, sizeof *c, compare_checks);
  double sum = 0, hours = (c[n - 1].at_unix_s - c[0].at_unix_s) / 3600;
  for (gsize i = 1; i < n; i++) {
    double dx = c[i].x_um - c[i - 1].x_um, dy = c[i].y_um - c[i - 1].y_um;
    const AwMatrix *a = &c[i].covariance_um2, *b = &c[i - 1].covariance_um2;
    sum += (dx * dx + dy * dy - a->xx - a->yy - b->xx - b->yy) / 2;
  }
  return hours > 0 ? fmax(sum, 0) / hours : NAN;
}

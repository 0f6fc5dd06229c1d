/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "beam/scoring.h"
#include "support/check.h"

#define NEAR(a, b, tol) g_assert_cmpfloat_with_epsilon((a), (b), (tol))

static const double at[6] = { 0, 1, 2, 3, 4, 5 };

/* A straight line p0 + p1 x. */
static double line(const void *data, gsize i, const double *p, double *gradient)
{
  const double *x = data;
  if (gradient) {
    gradient[0] = 1;
    gradient[1] = x[i];
  }
  return p[0] + p[1] * x[i];
}

/* Two parameters that only their sum matters of. */
static double twins(const void *data, gsize i, const double *p, double *gradient)
{
  (void)data;
  (void)i;
  if (gradient)
    gradient[0] = gradient[1] = 1;
  return p[0] + p[1];
}

/* Least squares of a line, by the sums of the closed form. */
static void test_least_squares(void)
{
  const double y[6] = { 0.21, 0.28, 0.38, 0.47, 0.56, 0.65 };
  AwScoring s = { .n = 6, .n_parameters = 2, .fraction = y, .model = line, .data = at };
  int n_free = -1;
  g_assert_true(aw_scoring_fit(&s));
  double sx = 15, sxx = 55, sy = 2.55, sxy = 0.28 + 0.76 + 1.41 + 2.24 + 3.25;
  double slope = (6 * sxy - sx * sy) / (6 * sxx - sx * sx);
  NEAR(s.p[1], slope, 1e-10);
  NEAR(s.p[0], (sy - slope * sx) / 6, 1e-10);
  NEAR(s.covariance[1][1], 6.0 / (6 * sxx - sx * sx), 1e-10);
  NEAR(s.covariance[0][1], -sx / (6 * sxx - sx * sx), 1e-10);
  g_assert_true(isnan(aw_scoring_p_value(&s, &n_free)));
  g_assert_cmpint(n_free, ==, 0);
}

/* One fraction for all points: its estimate is the pooled one, its variance f (1 - f) / N. */
static double constant(const void *data, gsize i, const double *p, double *gradient)
{
  (void)data;
  (void)i;
  if (gradient)
    gradient[0] = 1;
  return p[0];
}

static void test_counts(void)
{
  const double y[3] = { 0.2, 0.3, 0.35 }, n[3] = { 50, 100, 20 };
  AwScoring s = { .n = 3, .n_parameters = 1, .fraction = y, .n_trials = n, .model = constant, .p = { 0.5 } };
  int n_free;
  g_assert_true(aw_scoring_fit(&s));
  double f = 47.0 / 170;
  NEAR(s.p[0], f, 1e-9);
  NEAR(s.covariance[0][0], f * (1 - f) / 170, 1e-10);
  double chi2 = 0;
  for (int i = 0; i < 3; i++)
    chi2 += n[i] * (y[i] - f) * (y[i] - f) / (f * (1 - f));
  NEAR(aw_scoring_p_value(&s, &n_free), exp(-chi2 / 2), 1e-9); /* chi square with two degrees of freedom */
  g_assert_cmpint(n_free, ==, 2);
}

static void test_undetermined(void)
{
  const double y[6] = { 0.2, 0.2, 0.3, 0.3, 0.2, 0.2 };
  AwScoring s = { .n = 6, .n_parameters = 2, .fraction = y, .model = twins, .data = at };
  g_assert_false(aw_scoring_fit(&s));
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/beam/scoring/least-squares", test_least_squares);
  g_test_add_func("/beam/scoring/counts", test_counts);
  g_test_add_func("/beam/scoring/undetermined", test_undetermined);
  return g_test_run();
}

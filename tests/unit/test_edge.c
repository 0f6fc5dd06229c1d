/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <gsl/gsl_cdf.h>
#include <math.h>
#include <string.h>

#include "base/random.h"
#include "beam/edge.h"
#include "support/check.h"

#define NEAR(a, b, tol) g_assert_cmpfloat_with_epsilon((a), (b), (tol))

/* Published scan: "Laser Beam Profile", exercise 4, E. Behringer, PICUP; positions in inches, transmitted fraction. */
static const double inches[37] = { -0.0366, -0.0346, -0.0326, -0.0306, -0.0286, -0.0266, -0.0246, -0.0226,
                                   -0.0206, -0.0186, -0.0166, -0.0146, -0.0126, -0.0106, -0.0086, -0.0066,
                                   -0.0046, -0.0026, -0.0006, 0.0014,  0.0034,  0.0054,  0.0074,  0.0094,
                                   0.0114,  0.0134,  0.0154,  0.0174,  0.0194,  0.0214,  0.0234,  0.0254,
                                   0.0274,  0.0294,  0.0314,  0.0334,  0.0354 };
static const double fractions[37] = { 1.000, 1.000, 1.000, 0.999, 0.999, 0.998, 0.998, 0.998, 0.995, 0.992,
                                      0.983, 0.968, 0.947, 0.915, 0.870, 0.814, 0.738, 0.638, 0.532, 0.420,
                                      0.315, 0.229, 0.156, 0.105, 0.066, 0.040, 0.025, 0.016, 0.012, 0.010,
                                      0.008, 0.007, 0.007, 0.007, 0.006, 0.006, 0.005 };

/* Expected values: unweighted fits recomputed with SciPy 1.10, 0.5 %. */
static void test_published(void)
{
  AwEdgePoint points[37] = { 0 };
  AwEdgeFit fit;
  for (int i = 0; i < 37; i++)
    points[i] = (AwEdgePoint){ .position_um = inches[i] * 25400, .fraction = fractions[i] };
  AwEdgeSettings four = { .fit_plateaus = TRUE }, two = { 0 };
  g_assert_true(aw_edge_fit(points, 37, &four, &fit, NULL));
  NEAR(fit.sigma_um.value, 186.42, 0.93);
  NEAR(fit.centre_um.value, -2.68, 0.02);
  NEAR(fit.high.value - fit.low.value, 0.99058, 0.0005);
  NEAR(fit.low.value, 0.00685, 0.00005);
  NEAR(fit.misfit, 3.385e-4, 0.02e-4);
  g_assert_false(fit.rising);
  g_assert_cmpuint(fit.notes & AW_EDGE_NOT_GAUSSIAN, ==, 0);
  g_assert_true(aw_edge_fit(points, 37, &two, &fit, NULL));
  NEAR(fit.sigma_um.value, 190.09, 0.95);
  NEAR(fit.fwhm_um.value, 447.6, 2.2);
}

/* Width over sigma of a Gaussian: ISO 11146-1:2021 and ISO/TR 11146-3:2004 name the widths; 1e-5. */
static void test_widths(void)
{
  AwEdgePoint points[41] = { 0 };
  AwEdgeFit fit;
  AwEdgeSettings settings = { 0 };
  for (int i = 0; i < 41; i++)
    points[i] = (AwEdgePoint){ .position_um = i * 0.1, .fraction = gsl_cdf_ugaussian_P((i * 0.1 - 2) / 0.45) };
  g_assert_true(aw_edge_fit(points, 41, &settings, &fit, NULL));
  NEAR(fit.sigma_um.value, 0.45, 1e-8);
  NEAR(fit.fwhm_um.value / 0.45, 2.354820, 1e-5);
  NEAR(fit.w1090_um.value / 0.45, 2.563103, 1e-5);
  NEAR(fit.w1684_um.value / 0.45, 1.988916, 1e-5);
  g_assert_true(fit.rising);
  NEAR(aw_edge_predict(&fit, 2.45, FALSE), 0.841345, 1e-6);
  const struct {
    double level, width;
  } rows[] = { { 0.75, 1.348980 }, { 0.80, 1.683242 }, { 0.84, 1.988916 },
               { 0.841345, 2.0 },  { 0.88, 2.349974 }, { 0.90, 2.563103 } };
  for (gsize i = 0; i < G_N_ELEMENTS(rows); i++) {
    NEAR(aw_edge_predict(&fit, 2 + 0.45 * rows[i].width / 2, FALSE), rows[i].level, 1e-6);
    NEAR(aw_edge_predict(&fit, 2 - 0.45 * rows[i].width / 2, FALSE), 1 - rows[i].level, 1e-6);
  }
}

static double disc_fraction(double x, double diameter)
{
  double v = CLAMP(2 * x / diameter, -1.0, 1.0);
  return 0.5 + (v * sqrt(1 - v * v) + asin(v)) / G_PI;
}

/* The disc trap: a disc of diameter D has sigma D/4 and a 10-90 width 0.68705 D; it must be noticed. */
static void test_disc(void)
{
  AwEdgePoint points[61] = { 0 };
  AwEdgeFit fit;
  AwEdgeSettings settings = { 0 }, counts = { .counts = TRUE };
  AwRandom r = aw_random_stream(3, 0);
  for (int i = 0; i < 61; i++)
    points[i] = (AwEdgePoint){ .position_um = i * 0.1, .fraction = disc_fraction(i * 0.1 - 3, 4) };
  g_assert_true(aw_edge_fit(points, 61, &settings, &fit, NULL));
  NEAR(fit.disc_diameter_um, 4, 1e-4);
  g_assert_cmpuint(fit.notes & AW_EDGE_NOT_GAUSSIAN, !=, 0);
  NEAR(aw_edge_predict(&fit, 3 + 4 * 0.68705 / 2, TRUE), 0.9, 1e-5);
  NEAR(aw_edge_predict(&fit, 3 - 4 * 0.68705 / 2, TRUE), 0.1, 1e-5);
  NEAR(0.68705 / 2.563103, 0.26805, 1e-5); /* sigma over D that the Gaussian formula would give; D/4 is true */
  for (int i = 0; i < 61; i++) {
    unsigned full = 0;
    for (int k = 0; k < 400; k++)
      full += aw_random_unit(&r) < points[i].fraction;
    points[i].n_full = full;
    points[i].n_degraded = 400 - full;
  }
  g_assert_true(aw_edge_fit(points, 61, &counts, &fit, NULL));
  NEAR(fit.disc_diameter_um, 4, 0.1);
  g_assert_cmpuint(fit.notes & AW_EDGE_NOT_GAUSSIAN, !=, 0);
}

static void draw_scan(AwEdgePoint *points, int n, double centre, double sigma, int n_counts, AwRandom *r)
{
  for (int i = 0; i < n; i++) {
    double x = -4 + 8.0 * i / (n - 1);
    int full = 0;
    for (int k = 0; k < n_counts; k++)
      full += aw_random_unit(r) < gsl_cdf_ugaussian_P((x - centre) / sigma);
    points[i] = (AwEdgePoint){ .position_um = x, .n_full = full, .n_degraded = n_counts - full };
  }
}

/* Over 2000 simulated scans the true centre and sigma lie in the 95 % interval in 93.5 to 96.5 %. */
static void test_coverage(void)
{
  AwEdgePoint points[33];
  AwEdgeSettings settings = { .counts = TRUE };
  int n_centre = 0, n_sigma = 0, n_tenth[10] = { 0 }, n_poor = 0;
  for (int run = 0; run < 2000; run++) {
    AwRandom r = aw_random_stream(41, (guint64)run);
    AwEdgeFit fit;
    draw_scan(points, 33, 0.37, 0.8, 100, &r);
    g_assert_true(aw_edge_fit(points, 33, &settings, &fit, NULL));
    n_centre += fabs(fit.centre_um.value - 0.37) < 1.96 * fit.centre_um.se;
    n_sigma += fabs(log(fit.sigma_um.value / 0.8)) < 1.96 * fit.sigma_um.se / fit.sigma_um.value;
    n_tenth[(int)fmin(9, 10 * fit.p_value)]++;
    n_poor += (fit.notes & AW_EDGE_POOR_FIT) != 0;
  }
  g_test_message("centre %.2f %%, sigma %.2f %%, poor %d", n_centre / 20.0, n_sigma / 20.0, n_poor);
  g_assert_cmpint(n_centre, >=, 1870);
  g_assert_cmpint(n_centre, <=, 1930);
  g_assert_cmpint(n_sigma, >=, 1870);
  g_assert_cmpint(n_sigma, <=, 1930);
  g_assert_cmpint(n_poor, <=, 50);
  for (int i = 0; i < 10; i++) { /* the p-value of a good fit is uniform: 200 in every tenth */
    g_test_message("p from .%d: %d", i, n_tenth[i]);
    g_assert_cmpint(n_tenth[i], >=, 140);
    g_assert_cmpint(n_tenth[i], <=, 260);
  }
}

static void refuse(AwEdgePoint *points, gsize n, gboolean counts, const char *words)
{
  AwEdgeFit fit;
  AwEdgeSettings settings = { .counts = counts };
  GError *error = NULL;
  g_assert_false(aw_edge_fit(points, n, &settings, &fit, &error));
  aw_check_error(&error, AW_ERROR_RANGE, words);
}

static void test_refusals(void)
{
  AwEdgePoint points[33];
  AwRandom r = aw_random_stream(5, 1);
  draw_scan(points, 33, 0, 0.8, 100, &r);
  refuse(points, 3, TRUE, "3 points|at least 4");
  refuse(points, 17, TRUE, "stops short of the open side");
  refuse(points + 17, 16, TRUE, "stops short of the covered side");
  refuse(points, 8, TRUE, "no edge");
  points[4].n_degraded = -1;
  refuse(points, 33, TRUE, "point 5|negative");
  points[4].n_degraded = points[4].n_full = 0;
  refuse(points, 33, TRUE, "point 5|no particle");
  points[4].position_um = NAN;
  refuse(points, 33, TRUE, "point 5|not a number");
  for (int i = 0; i < 33; i++)
    points[i] = (AwEdgePoint){ .position_um = i, .fraction = gsl_cdf_ugaussian_P((i - 16) / 3.0) };
  points[20].fraction = 1.2;
  refuse(points, 33, FALSE, "point 21|outside 0 to 1");
}

static void test_order(void)
{
  AwEdgePoint points[33], back[33];
  AwRandom r = aw_random_stream(6, 1);
  AwEdgeFit a, b;
  AwEdgeSettings settings = { .counts = TRUE };
  draw_scan(points, 33, 0, 0.8, 100, &r);
  for (int i = 0; i < 33; i++)
    back[i] = points[32 - i];
  g_assert_true(aw_edge_fit(points, 33, &settings, &a, NULL));
  g_assert_true(aw_edge_fit(back, 33, &settings, &b, NULL));
  NEAR(a.sigma_um.value, b.sigma_um.value, 1e-9);
  g_assert_cmpuint(a.notes & AW_EDGE_REVERSED, ==, 0);
  g_assert_cmpuint(b.notes & AW_EDGE_REVERSED, !=, 0);
  points[16].position_um = points[15].position_um;
  g_assert_true(aw_edge_fit(points, 33, &settings, &a, NULL));
  g_assert_cmpuint(a.notes & AW_EDGE_REPEATED, !=, 0);
  AwEdgePoint step[9];
  for (int i = 0; i < 9; i++)
    step[i] = (AwEdgePoint){ .position_um = i,
                             .n_full = i < 4    ? 0
                                       : i == 4 ? 50
                                                : 100,
                             .n_degraded = i < 4    ? 100
                                           : i == 4 ? 50
                                                    : 0 };
  g_assert_true(aw_edge_fit(step, 9, &settings, &a, NULL));
  g_assert_cmpuint(a.notes & AW_EDGE_COARSE, !=, 0);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/beam/edge/published-scan", test_published);
  g_test_add_func("/beam/edge/widths", test_widths);
  g_test_add_func("/beam/edge/disc", test_disc);
  g_test_add_func("/beam/edge/coverage", test_coverage);
  g_test_add_func("/beam/edge/refusals", test_refusals);
  g_test_add_func("/beam/edge/order", test_order);
  return g_test_run();
}

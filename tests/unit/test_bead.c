/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/random.h"
#include "beam/bead.h"
#include "support/check.h"

#define NEAR(a, b, tol) g_assert_cmpfloat_with_epsilon((a), (b), (tol))
#define SIDE 11
#define N (SIDE * SIDE)

/* What a drawn scan is made from; lengths in um, steps of 1 um round (100, -40). */
typedef struct {
  double x, y, sx, sy, floor, peak;
  int n_counts;
} Truth;

static const Truth usual = { 100.3, -40.7, 2.1, 2.1, 0.02, 0.9, 100 };

static void draw_scan(AwBeadPoint *points, const Truth *t, guint64 item)
{
  AwRandom r = aw_random_stream(43, item);
  for (int i = 0; i < N; i++) {
    double x = 95 + i % SIDE, y = -45 + i / SIDE, u = (x - t->x) / t->sx, v = (y - t->y) / t->sy;
    double f = t->floor + (t->peak - t->floor) * exp(-(u * u + v * v) / 2);
    int degraded = 0;
    for (int k = 0; k < t->n_counts; k++)
      degraded += aw_random_unit(&r) < f;
    points[i] = (AwBeadPoint){ { x, y }, t->n_counts - degraded, degraded };
  }
}

/* Over 2000 simulated scans of 100 counts a point the true centre lies in the 95 % ellipse in 93.5 to 96.5 %. */
static void test_coverage(void)
{
  int n_centre = 0, n_sigma = 0, n_poor = 0;
  double mean_x = 0;
  for (guint64 run = 0; run < 2000; run++) {
    AwBeadPoint points[N];
    AwBeadFit fit;
    draw_scan(points, &usual, run);
    g_assert_true(aw_bead_fit(points, N, FALSE, &fit, NULL));
    double dx = fit.centre.bx_um - usual.x, dy = fit.centre.by_um - usual.y;
    AwMatrix inv = aw_matrix_inverse(fit.covariance_um2);
    n_centre += dx * dx * inv.xx + 2 * dx * dy * inv.xy + dy * dy * inv.yy < 5.991465;
    n_sigma += fabs(fit.sigma_x.value - usual.sx) < 1.959964 * fit.sigma_x.se;
    n_poor += (fit.notes & AW_BEAD_POOR_FIT) != 0;
    mean_x += dx / 2000;
  }
  g_test_message("centre %.2f %%, sigma %.2f %%, poor %d", n_centre / 20.0, n_sigma / 20.0, n_poor);
  g_assert_cmpint(n_centre, >=, 1870);
  g_assert_cmpint(n_centre, <=, 1930);
  g_assert_cmpint(n_sigma, >=, 1870);
  g_assert_cmpint(n_sigma, <=, 1930);
  g_assert_cmpint(n_poor, <=, 50);
  NEAR(mean_x, 0, 0.004);
}

static void test_elliptical(void)
{
  const Truth flat = { 99.2, -39.1, 1.3, 2.4, 0.1, 0.8, 4000 };
  AwBeadPoint points[N];
  AwBeadFit fit, round;
  draw_scan(points, &flat, 1);
  g_assert_true(aw_bead_fit(points, N, TRUE, &fit, NULL));
  NEAR(fit.sigma_x.value, 1.3, 4 * fit.sigma_x.se);
  NEAR(fit.sigma_y.value, 2.4, 4 * fit.sigma_y.se);
  NEAR(fit.floor.value, 0.1, 4 * fit.floor.se);
  NEAR(fit.peak.value, 0.8, 4 * fit.peak.se);
  g_assert_cmpfloat(fit.sigma_y.se, <, 0.03);
  g_assert_cmpuint(fit.notes, ==, 0);
  NEAR(aw_bead_predict(&fit, fit.centre), fit.peak.value, 1e-12);
  NEAR(aw_bead_predict(&fit, (AwBeamPoint){ 300, 0 }), fit.floor.value, 1e-12);
  g_assert_true(aw_bead_fit(points, N, FALSE, &round, NULL));
  g_assert_cmpuint(round.notes & AW_BEAD_POOR_FIT, !=, 0);
  NEAR(round.centre.bx_um, fit.centre.bx_um, 0.05);
  g_assert_cmpfloat(round.sigma_x.value, ==, round.sigma_y.value);
}

static void test_clean_floor(void)
{
  GError *error = NULL;
  const Truth clean = { 100, -40, 1.5, 1.5, 0, 1, 100 };
  AwBeadPoint points[N];
  AwBeadFit fit;
  draw_scan(points, &clean, 3);
  aw_bead_fit(points, N, FALSE, &fit, &error);
  g_assert_no_error(error);
  NEAR(fit.centre.bx_um, 100, 0.15);
  g_assert_cmpfloat(fit.floor.value, <, 0.01);
  g_assert_cmpfloat(fit.peak.value, >, 0.9);
  const Truth small = { 100.1, -40, 0.35, 0.35, 0.02, 0.95, 100 };
  draw_scan(points, &small, 3);
  g_assert_true(aw_bead_fit(points, N, FALSE, &fit, NULL));
  g_assert_cmpuint(fit.notes & AW_BEAD_COARSE, !=, 0);
}

static void test_offset(void)
{
  AwBeadPoint points[N];
  AwBeadFit fit;
  draw_scan(points, &usual, 5);
  g_assert_true(aw_bead_fit(points, N, FALSE, &fit, NULL));
  AwOffsetCheck o = aw_bead_offset(&fit, (AwBeamPoint){ 98, -42 }, 1000);
  NEAR(o.x_um, 2.3, 4 * sqrt(o.covariance_um2.xx));
  NEAR(o.y_um, 1.3, 4 * sqrt(o.covariance_um2.yy));
  g_assert_cmpfloat(o.at_unix_s, ==, 1000);
}

/* A walk of known variance per hour, looked at with a known error. */
static void test_drift(void)
{
  AwOffsetCheck checks[400];
  AwRandom r = aw_random_stream(8, 0);
  double x = 0, y = 0;
  for (int i = 0; i < 400; i++) {
    x += 0.5 * aw_random_normal(&r);
    y += 0.5 * aw_random_normal(&r);
    checks[399 - i] = (AwOffsetCheck){
      i * 7200.0, x + 0.3 * aw_random_normal(&r), y + 0.3 * aw_random_normal(&r), { 0.09, 0, 0, 0.09 }
    };
  }
  NEAR(aw_offset_drift(checks, 400), 0.125, 0.03);
  g_assert_true(isnan(aw_offset_drift(checks, 1)));
  checks[1] = checks[0];
  g_assert_true(isnan(aw_offset_drift(checks, 2)));
  checks[1].at_unix_s += 3600;
  g_assert_cmpfloat(aw_offset_drift(checks, 2), ==, 0);
}

static void refuse(const AwBeadPoint *points, gsize n, const char *words)
{
  AwBeadFit fit;
  GError *error = NULL;
  g_assert_false(aw_bead_fit(points, n, FALSE, &fit, &error));
  aw_check_error(&error, AW_ERROR_RANGE, words);
}

static void test_refusals(void)
{
  AwBeadPoint points[N];
  Truth truth = usual;
  draw_scan(points, &usual, 7);
  refuse(points, 0, "0 points");
  refuse(points, SIDE, "11 points at 11 positions in x and 1 in y");
  refuse(points + 3, 6, "at least 7 points");
  points[4].n_degraded = -1;
  refuse(points, N, "point 5|negative");
  points[4].n_full = points[4].n_degraded = 0;
  refuse(points, N, "point 5|no particle");
  points[4].stage.by_um = INFINITY;
  refuse(points, N, "point 5|not a number");
  truth.peak = truth.floor;
  draw_scan(points, &truth, 8);
  refuse(points, N, "no bead");
  truth = usual;
  truth.x = 94.2;
  draw_scan(points, &truth, 9);
  refuse(points, N, "edge of the grid|scan round the bead");
  truth.floor = 0.9; /* full and degraded exchanged: a hole */
  truth.peak = 0.1;
  truth.x = 100;
  draw_scan(points, &truth, 9);
  refuse(points, N, "no bead");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/beam/bead/coverage", test_coverage);
  g_test_add_func("/beam/bead/elliptical", test_elliptical);
  g_test_add_func("/beam/bead/clean-floor", test_clean_floor);
  g_test_add_func("/beam/bead/offset", test_offset);
  g_test_add_func("/beam/bead/drift", test_drift);
  g_test_add_func("/beam/bead/refusals", test_refusals);
  return g_test_run();
}

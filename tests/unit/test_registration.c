/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "base/error.h"
#include "base/random.h"
#include "geometry/registration.h"

#define NEAR(a, b, tol) g_assert_cmpfloat_with_epsilon((a), (b), (tol))

/* Umeyama 1991, IEEE Trans. Pattern Anal. Mach. Intell. 13:376, the worked example: a proper rotation is asked for. */
static void test_umeyama(void)
{
  const AwMarkPair pairs[] = { { { 0, 0 }, { 0, 0 } }, { { 1, 0 }, { -1, 0 } }, { { 0, 2 }, { 0, 2 } } };
  AwRegistration r;
  g_assert_true(aw_registration_fit(pairs, 3, AW_FIT_SIMILARITY, FALSE, 0, &r, NULL));
  NEAR(aw_registration_scale(&r), 0.721110, 1e-6);
  NEAR(r.m.xx / aw_registration_scale(&r), 0.832050, 1e-6);
  NEAR(r.m.xy / aw_registration_scale(&r), 0.554700, 1e-6);
  NEAR(r.m.yx / aw_registration_scale(&r), -0.554700, 1e-6);
  NEAR(r.tx_um, -0.8, 1e-6);
  NEAR(r.ty_um, 0.4, 1e-6);
  g_assert_false(r.mirrored);
  AwMarkCheck check;
  aw_registration_check(pairs, 3, AW_FIT_SIMILARITY, &r, &check);
  g_assert_true(check.mirror_fits_better);
  g_assert_true(aw_registration_fit(pairs, 3, AW_FIT_SIMILARITY, TRUE, 0, &r, NULL));
  NEAR(r.rss_um2, 0, 1e-12);
  NEAR(r.m.xx, -1, 1e-12);
  g_assert_true(r.mirrored);
}

/* An affine fit and a similarity of the same five marks, recomputed with SciPy 1.10 (least squares). */
static const AwMarkPair five[] = { { { 0, 0 }, { 100.3, -50.1 } },
                                   { { 1000, 0 }, { 532.812702, 200.4 } },
                                   { { 1000, 800 }, { 333.112702, 546.610162 } },
                                   { { 0, 800 }, { -100.4, 296.110162 } },
                                   { { 500, 400 }, { 216.706351, 248.005081 } } };

static void test_affine(void)
{
  AwRegistration r;
  g_assert_true(aw_registration_fit(five, 5, AW_FIT_AFFINE, FALSE, 0, &r, NULL));
  NEAR(r.tx_um, 100.1, 1e-6);
  NEAR(r.m.xx, 0.4330127, 1e-6);
  NEAR(r.m.xy, -0.25025, 1e-6);
  NEAR(r.ty_um, -50.15, 1e-6);
  NEAR(r.m.yx, 0.2505, 1e-6);
  NEAR(r.m.yy, 0.4327627, 1e-6);
  NEAR(r.rms_um, 0.264575, 1e-6);
  NEAR(r.rss_um2, 0.35, 1e-6);
  NEAR(r.localisation_um * r.localisation_um, 0.0875, 1e-6);
  const struct {
    AwScanPoint q;
    double ratio, se;
  } rows[] = { { { 500, 400 }, 0.200, 0.13229 }, { { 0, 0 }, 0.700, 0.24749 }, { { 1500, 400 }, 1.200, 0.32404 } };
  for (gsize i = 0; i < G_N_ELEMENTS(rows); i++) {
    NEAR(aw_registration_error_ratio(&r, rows[i].q), rows[i].ratio, 1e-6);
    NEAR(aw_registration_error_um(&r, rows[i].q), rows[i].se, 1e-5);
  }
}

static void test_similarity(void)
{
  AwRegistration r;
  g_assert_true(aw_registration_fit(five, 5, AW_FIT_SIMILARITY, FALSE, 0, &r, NULL));
  NEAR(aw_registration_scale(&r), 0.500116887, 1e-6);
  NEAR(aw_registration_angle_rad(&r) * 180 / G_PI, 30.045517, 1e-6);
  NEAR(r.tx_um, 100.20976, 1e-5);
  NEAR(r.ty_um, -50.16220, 1e-5);
  NEAR(r.rms_um, 0.282411, 1e-6);
}

/* Ratios after Fitzpatrick, West & Maurer 1998; the values were derived and checked by Monte Carlo outside. */
static void test_error_ratio(void)
{
  const AwMarkPair corners[] = {
    { { 0, 0 }, { 0, 0 } }, { { 100, 0 }, { 100, 0 } }, { { 100, 100 }, { 100, 100 } }, { { 0, 100 }, { 0, 100 } }
  };
  AwMarkPair grid[9];
  for (int i = 0; i < 9; i++)
    grid[i] = (AwMarkPair){ { i % 3 * 500.0, i / 3 * 500.0 }, { i % 3 * 500.0, i / 3 * 500.0 } };
  const double small[] = { 0.500, 0.750, 1.250 }, large[] = { 0.2778, 0.4444, 0.7778 };
  for (int kind = 0; kind < 3; kind++) {
    AwRegistration r;
    g_assert_true(aw_registration_fit(corners, 4, (AwFitKind)kind, FALSE, 1, &r, NULL));
    NEAR(aw_registration_error_ratio(&r, (AwScanPoint){ 150, 50 }), small[kind], 1e-9);
    g_assert_true(aw_registration_fit(grid, 9, (AwFitKind)kind, FALSE, 1, &r, NULL));
    NEAR(aw_registration_error_ratio(&r, (AwScanPoint){ 1500, 500 }), large[kind], 1e-4);
  }
}

/* Marks of a round dish with room for n, turned by 20 degrees. */
static AwMarkPair turned(double x, double y, double error_x, double error_y)
{
  double c = cos(0.35), s = sin(0.35);
  return (AwMarkPair){ { x, y }, { c * x - s * y + 300 + error_x, s * x + c * y - 40 + error_y } };
}

/* Expected target error against simulation, inside and outside the marks: 2 % as the method asks. */
static void test_simulated_error(void)
{
  static const double px[12] = { 0, 9000, 4000, 500, 8000, 2000, 6500, 9500, 300, 5000, 7000, 1500 };
  static const double py[12] = { 0, 500, 8000, 6000, 7000, 9000, 300, 4000, 3000, 4500, 9500, 1200 };
  static const int n_marks[] = { 3, 4, 6, 12 };
  const int n_runs = 20000;
  for (int kind = 0; kind < 3; kind++)
    for (gsize k = 0; k < G_N_ELEMENTS(n_marks); k++) {
      double sum[10] = { 0 };
      AwRegistration r;
      for (int run = 0; run < n_runs; run++) {
        AwRandom stream = aw_random_stream(7, (guint64)run * 100 + (guint64)kind * 10 + k);
        AwMarkPair pairs[12];
        for (int i = 0; i < n_marks[k]; i++) {
          double ex = 2 * aw_random_normal(&stream), ey = 2 * aw_random_normal(&stream);
          pairs[i] = turned(px[i], py[i], ex, ey);
        }
        g_assert_true(aw_registration_fit(pairs, (gsize)n_marks[k], (AwFitKind)kind, FALSE, 2, &r, NULL));
        for (int t = 0; t < 10; t++) {
          AwMarkPair truth = turned(-3000 + 1700 * t, 12000 - 1300 * t, 0, 0);
          AwBeamPoint e = aw_registration_residual(&r, &truth);
          sum[t] += e.bx_um * e.bx_um + e.by_um * e.by_um;
        }
      }
      for (int t = 0; t < 10; t++) {
        double expected = aw_registration_error_um(&r, (AwScanPoint){ -3000 + 1700 * t, 12000 - 1300 * t });
        double seen = sqrt(sum[t] / n_runs / 2);
        g_assert_cmpfloat(fabs(seen / expected - 1), <, 0.02);
      }
    }
}

/* Mean square residual over mean square localisation error: 1 - 3/(2N), 1 - 2/N, 1 - 3/N (Fitzpatrick et al. 1998). */
static void test_residual_ratio(void)
{
  const double lost[] = { 1.5, 2, 3 };
  for (int kind = 0; kind < 3; kind++) {
    double sum = 0;
    for (int run = 0; run < 20000; run++) {
      AwRandom stream = aw_random_stream(11, (guint64)run);
      AwMarkPair pairs[6];
      for (int i = 0; i < 6; i++) {
        double ex = aw_random_normal(&stream), ey = aw_random_normal(&stream);
        pairs[i] = turned(i % 2 * 5000, i / 2 * 4000, ex, ey);
      }
      AwRegistration r;
      g_assert_true(aw_registration_fit(pairs, 6, (AwFitKind)kind, FALSE, 0, &r, NULL));
      sum += r.rss_um2 / 12;
    }
    NEAR(sum / 20000, 1 - lost[kind] / 6, 0.01);
  }
}

/* The residuals of one registration tell nothing of its target error (Fitzpatrick, Proc. SPIE 7261, 2009). */
static void test_uncorrelated(void)
{
  double n = 20000, a = 0, b = 0, aa = 0, bb = 0, ab = 0;
  for (int run = 0; run < 20000; run++) {
    AwRandom stream = aw_random_stream(12, (guint64)run);
    AwMarkPair pairs[5];
    for (int i = 0; i < 5; i++) {
      double ex = aw_random_normal(&stream), ey = aw_random_normal(&stream);
      pairs[i] = turned(i % 2 * 5000 + 300 * i, i / 2 * 4000, ex, ey);
    }
    AwRegistration r;
    AwMarkPair truth = turned(7000, -2000, 0, 0);
    g_assert_true(aw_registration_fit(pairs, 5, AW_FIT_RIGID, FALSE, 0, &r, NULL));
    AwBeamPoint e = aw_registration_residual(&r, &truth);
    double x = r.rss_um2, y = e.bx_um * e.bx_um + e.by_um * e.by_um;
    a += x / n;
    b += y / n;
    aa += x * x / n;
    bb += y * y / n;
    ab += x * y / n;
  }
  NEAR((ab - a * b) / sqrt((aa - a * a) * (bb - b * b)), 0, 0.025);
}

static void test_suspects(void)
{
  AwMarkPair pairs[6];
  AwMarkCheck check;
  AwRegistration r;
  for (int i = 0; i < 6; i++)
    pairs[i] = turned(i % 2 * 5000 + 100 * i, i / 2 * 4000, 0.4 * (i % 3) - 0.4, 0.3 * (i % 2));
  g_assert_true(aw_registration_fit(pairs, 6, AW_FIT_RIGID, FALSE, 0, &r, NULL));
  aw_registration_check(pairs, 6, AW_FIT_RIGID, &r, &check);
  g_assert_cmpint(check.suspect, ==, -1);
  pairs[2].beam.bx_um += 40;
  g_assert_true(aw_registration_fit(pairs, 6, AW_FIT_RIGID, FALSE, 0, &r, NULL));
  aw_registration_check(pairs, 6, AW_FIT_RIGID, &r, &check);
  g_assert_cmpint(check.suspect, ==, 2);
  g_assert_cmpint(check.partner, ==, -1);
  pairs[2].beam.bx_um -= 40;
  AwBeamPoint kept = pairs[1].beam;
  pairs[1].beam = pairs[4].beam;
  pairs[4].beam = kept;
  g_assert_true(aw_registration_fit(pairs, 6, AW_FIT_RIGID, FALSE, 0, &r, NULL));
  aw_registration_check(pairs, 6, AW_FIT_RIGID, &r, &check);
  g_assert_cmpint(check.suspect, ==, 1);
  g_assert_cmpint(check.partner, ==, 4);
}

static void refused(const AwMarkPair *pairs, gsize n, AwFitKind kind, const char *words)
{
  AwRegistration r;
  GError *error = NULL;
  g_assert_false(aw_registration_fit(pairs, n, kind, FALSE, 0, &r, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_RANGE);
  g_assert_nonnull(strstr(error->message, words));
  g_error_free(error);
}

static void test_refusals(void)
{
  const AwMarkPair line[] = { { { 0, 0 }, { 0, 0 } }, { { 100, 100 }, { 100, 100 } }, { { 300, 300 }, { 300, 300 } } };
  const AwMarkPair spot[] = { { { 5, 5 }, { 0, 0 } }, { { 5, 5 }, { 0, 0 } }, { { 5, 5 }, { 0, 0 } } };
  refused(five, 2, AW_FIT_RIGID, "2 marks are too few");
  refused(line, 3, AW_FIT_RIGID, "one line");
  refused(spot, 3, AW_FIT_SIMILARITY, "one spot");
  refused(five, 3, AW_FIT_AFFINE, "exactly");
  AwFitKind kind;
  GError *error = NULL;
  g_assert_false(aw_fit_kind_parse("elastic", &kind, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_NOT_FOUND);
  g_error_free(error);
  g_assert_true(aw_fit_kind_parse("affine", &kind, NULL) && kind == AW_FIT_AFFINE);
}

/* Student's t over the normal quantile, three marks rigid: 3.18245 / 1.95996 (tables of t, 3 degrees of freedom). */
static void test_widening(void)
{
  const AwMarkPair three[] = { turned(0, 0, 0.1, 0), turned(5000, 0, 0, 0.2), turned(0, 7000, -0.1, 0) };
  AwRegistration r;
  g_assert_true(aw_registration_fit(three, 3, AW_FIT_RIGID, FALSE, 0, &r, NULL));
  NEAR(r.widening, 3.18245 / 1.95996, 1e-4);
  AwBeamPoint b = aw_registration_apply(&r, (AwScanPoint){ 1200, 900 });
  AwScanPoint q = aw_registration_invert(&r, b);
  NEAR(q.x_um, 1200, 1e-9);
  NEAR(q.y_um, 900, 1e-9);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/geometry/registration/umeyama", test_umeyama);
  g_test_add_func("/geometry/registration/affine", test_affine);
  g_test_add_func("/geometry/registration/similarity", test_similarity);
  g_test_add_func("/geometry/registration/error-ratio", test_error_ratio);
  g_test_add_func("/geometry/registration/simulated-error", test_simulated_error);
  g_test_add_func("/geometry/registration/residual-ratio", test_residual_ratio);
  g_test_add_func("/geometry/registration/uncorrelated", test_uncorrelated);
  g_test_add_func("/geometry/registration/suspects", test_suspects);
  g_test_add_func("/geometry/registration/refusals", test_refusals);
  g_test_add_func("/geometry/registration/widening", test_widening);
  return g_test_run();
}

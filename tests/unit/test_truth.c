/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/error.h"
#include "nuclei/population.h"
#include "nuclei/texture.h"

static AwTruth *form(double x, double y, double major, double minor, double angle, double bend)
{
  AwShape shape = { { x, y }, major, minor, angle, { 0 }, { 0 }, bend };
  AwScanPoint outline[AW_SHAPE_N_POINTS];
  aw_shape_outline(&shape, outline);
  return aw_truth_new(AW_TRUTH_INTERPHASE, outline, AW_SHAPE_N_POINTS);
}

static void ellipse(void)
{
  g_autoptr(AwTruth) t = form(41250.3, -28730.7, 18.0, 11.0, 0.7, 0.0);
  g_assert_cmpfloat_with_epsilon(t->area_um2, G_PI * 9.0 * 5.5, 0.2);
  g_assert_cmpfloat_with_epsilon(t->centroid.x_um, 41250.3, 1e-6);
  g_assert_cmpfloat_with_epsilon(t->centroid.y_um, -28730.7, 1e-6);
  g_assert_cmpfloat_with_epsilon(t->major_um, 18.0, 0.03);
  g_assert_cmpfloat_with_epsilon(t->minor_um, 11.0, 0.03);
  g_assert_cmpfloat_with_epsilon(t->angle_rad, 0.7, 1e-6);
  g_assert_cmpfloat_with_epsilon(t->reach_um, 9.0, 1e-6);
  g_assert_cmpstr(aw_truth_kind_name(t->kind), ==, "interphase");
}

/* A kidney's measures against a sum over a fine raster of points. */
static void kidney(void)
{
  g_autoptr(AwTruth) t = form(5.0, 3.0, 19.0, 10.0, -0.4, 1.2);
  double n = 0.0, x = 0.0, y = 0.0, step = 0.05;
  for (double v = -12.0; v < 18.0; v += step)
    for (double u = -12.0; u < 22.0; u += step)
      if (aw_truth_contains(t, (AwScanPoint){ u, v })) {
        n += 1.0;
        x += u;
        y += v;
      }
  g_assert_cmpfloat_with_epsilon(t->area_um2, n * step * step, 0.3);
  g_assert_cmpfloat_with_epsilon(t->centroid.x_um, x / n, 0.01);
  g_assert_cmpfloat_with_epsilon(t->centroid.y_um, y / n, 0.01);
  g_autoptr(AwTruth) straight = form(5.0, 3.0, 19.0, 10.0, -0.4, 0.0);
  g_assert_cmpfloat(t->major_um / t->minor_um, <, straight->major_um / straight->minor_um);
}

static void gaps(void)
{
  g_autoptr(GPtrArray) all = aw_truths_new();
  g_ptr_array_add(all, form(0.0, 0.0, 10.0, 10.0, 0.0, 0.0));
  g_ptr_array_add(all, form(13.5, 0.0, 10.0, 10.0, 0.3, 0.0));
  g_ptr_array_add(all, form(13.5, 20.0, 10.0, 8.0, 0.0, 0.0));
  g_ptr_array_add(all, form(100.0, 0.0, 10.0, 8.0, 0.0, 0.0));
  g_ptr_array_add(all, form(101.0, 1.0, 3.0, 3.0, 0.0, 0.0));
  aw_truths_measure_gaps(all, 30.0);
  const double want[] = { 3.5, 3.5, 11.0, 0.0, 0.0 };
  for (guint i = 0; i < all->len; i++)
    g_assert_cmpfloat_with_epsilon(((const AwTruth *)all->pdata[i])->gap_um, want[i], 0.01);
  g_assert_true(isinf(aw_truth_gap(all->pdata[0], all->pdata[3], 30.0)));
  aw_truths_measure_gaps(all, 2.0);
  g_assert_true(isinf(((const AwTruth *)all->pdata[0])->gap_um));
}

/* The texture has the spread it was asked for and is the same however often it is made. */
static void texture(void)
{
  g_autoptr(AwTruth) t = form(40.0, 50.0, 400.0, 300.0, 0.2, 0.0);
  t->kind = AW_TRUTH_MITOTIC;
  t->seed = 31;
  t->texture_frac = 0.2;
  g_autoptr(AwTexture) one = aw_texture_new(t);
  g_autoptr(AwTexture) two = aw_texture_new(t);
  double sum = 0.0, squares = 0.0, n = 0.0;
  for (double y = -100.0; y < 100.0; y += 0.7)
    for (double x = -100.0; x < 100.0; x += 0.7) {
      double value = log(aw_texture_at(one, x, y));
      g_assert_cmpfloat(aw_texture_at(two, x, y), ==, aw_texture_at(one, x, y));
      sum += value;
      squares += value * value;
      n += 1.0;
    }
  g_assert_cmpfloat_with_epsilon(sum / n, 0.0, 0.01);
  g_assert_cmpfloat_with_epsilon(sqrt(squares / n), 0.2, 0.01);
}

static void nucleoli(void)
{
  g_autoptr(AwTruth) t = form(0.0, 0.0, 16.0, 12.0, 0.2, 0.0);
  g_autoptr(AwTexture) smooth = aw_texture_new(t);
  double least = 1.0;
  for (double y = -6.0; y < 6.0; y += 0.2)
    for (double x = -8.0; x < 8.0; x += 0.2)
      least = MIN(least, aw_texture_at(smooth, x, y));
  g_assert_cmpfloat(least, <, 0.75);
  g_assert_cmpfloat(least, >, 0.05);
}

static const AwPopulationPlan plan = { .from = { -500.0, 2000.0 },
                                       .to = { 500.0, 2800.0 },
                                       .n_nuclei = 200,
                                       .mitotic_frac = 0.1,
                                       .debris_per_nucleus = 0.2,
                                       .gap_um = 4.0,
                                       .patchy_frac = 0.5,
                                       .light_e = 1e5,
                                       .seed = 5 };

static gboolean is_nucleus(const AwTruth *t)
{
  return t->kind == AW_TRUTH_INTERPHASE || t->kind == AW_TRUTH_MITOTIC;
}

static void population(void)
{
  g_autoptr(GPtrArray) all = aw_population_new(&plan, NULL);
  g_autoptr(GPtrArray) again = aw_population_new(&plan, NULL);
  g_assert_nonnull(all);
  g_assert_cmpuint(all->len, ==, again->len);
  guint n = 0, n_mitotic = 0;
  g_autoptr(GPtrArray) nuclei = g_ptr_array_new();
  for (guint i = 0; i < all->len; i++) {
    AwTruth *t = all->pdata[i];
    const AwTruth *same = again->pdata[i];
    g_assert_cmpmem(t->outline, t->n_outline * sizeof *t->outline, same->outline, same->n_outline * sizeof *t->outline);
    n_mitotic += t->kind == AW_TRUTH_MITOTIC;
    n += is_nucleus(t);
    if (is_nucleus(t))
      g_ptr_array_add(nuclei, t);
    if (t->kind == AW_TRUTH_INTERPHASE) {
      g_assert_true(t->major_um > 9.5 && t->major_um < 27.0);
      g_assert_true(t->light_e > 0.38e5 && t->light_e < 2.4e5);
    }
  }
  g_assert_cmpuint(n, ==, 200);
  g_assert_true(n_mitotic > 8 && n_mitotic < 45);
  g_assert_cmpuint(all->len, >, 215);
  aw_truths_measure_gaps(nuclei, 30.0);
  for (guint i = 0; i < nuclei->len; i++)
    g_assert_cmpfloat(((const AwTruth *)nuclei->pdata[i])->gap_um, >=, 4.0);
}

static void clumps(void)
{
  AwPopulationPlan crowded = plan;
  crowded.clump_frac = 0.5;
  crowded.debris_per_nucleus = 0.0;
  g_autoptr(GPtrArray) all = aw_population_new(&crowded, NULL);
  guint n_touching = 0;
  for (guint i = 0; i < all->len; i++)
    n_touching += ((const AwTruth *)all->pdata[i])->gap_um < 1.0;
  g_assert_true(n_touching > 100 && n_touching < 180);
}

/* Clumps lean on interphase nuclei only; while the dish has none, a nucleus of a clump lies alone. */
static void clumps_after_mitosis(void)
{
  AwPopulationPlan odd = plan;
  odd.clump_frac = 0.5;
  odd.mitotic_frac = 0.5;
  odd.n_nuclei = 60;
  guint n_mitotic_first = 0;
  for (odd.seed = 1; odd.seed <= 8; odd.seed++) {
    g_autoptr(GPtrArray) all = aw_population_new(&odd, NULL);
    g_assert_nonnull(all);
    n_mitotic_first += ((const AwTruth *)all->pdata[0])->kind == AW_TRUTH_MITOTIC;
  }
  g_assert_cmpuint(n_mitotic_first, ==, 8);
}

static void too_crowded(void)
{
  AwPopulationPlan full = plan;
  full.to = (AwScanPoint){ -400.0, 2100.0 };
  g_autoptr(GError) error = NULL;
  g_assert_null(aw_population_new(&full, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_RANGE);
  g_assert_nonnull(strstr(error->message, "of 200 nuclei found room in 100 x 100 um"));
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/truth/ellipse", ellipse);
  g_test_add_func("/nuclei/truth/kidney", kidney);
  g_test_add_func("/nuclei/truth/gaps", gaps);
  g_test_add_func("/nuclei/texture/field", texture);
  g_test_add_func("/nuclei/texture/nucleoli", nucleoli);
  g_test_add_func("/nuclei/population/laid", population);
  g_test_add_func("/nuclei/population/clumps", clumps);
  g_test_add_func("/nuclei/population/clumps_after_mitosis", clumps_after_mitosis);
  g_test_add_func("/nuclei/population/too_crowded", too_crowded);
  return g_test_run();
}

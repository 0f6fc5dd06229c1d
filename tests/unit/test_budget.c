/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "beam/budget.h"
#include "support/check.h"

#define NEAR(a, b, tol) g_assert_cmpfloat_with_epsilon((a), (b), (tol))

static const AwBudgetTarget place = { { 1200, -300 }, { 300, 400 } };

static AwBudgetInput nothing(void)
{
  return (AwBudgetInput){ .um_per_px = { 0.5, 0, 0, 0.5 },
                          .drift_um2_per_h = NAN,
                          .localisation_um = NAN,
                          .scan_age_s = NAN,
                          .check_age_s = NAN };
}

/* Nothing known: every term is assumed, none is zero, shares add up. */
static void test_assumed(void)
{
  AwBudgetInput in = nothing();
  AwBudget b;
  double sum = 0;
  aw_budget_for_target(&in, &place, &b);
  for (int i = 0; i < AW_N_TERMS; i++) {
    g_assert_cmpint(b.term[i].id, ==, i);
    g_assert_cmpint(b.term[i].origin, ==, AW_ORIGIN_ASSUMED);
    g_assert_cmpfloat(b.term[i].sx_um, >, 0);
    sum += b.term[i].share;
  }
  NEAR(sum, 1, 1e-12);
  NEAR(b.term[AW_TERM_SCALE].sx_um, 2 * 0.25, 1e-12); /* 2 um per mm at 500 px of 0.5 um */
  NEAR(b.term[AW_TERM_DRIFT].sy_um, 0.3 * 2, 1e-12);
  NEAR(b.sx_um, hypot(b.dish_sx_um, b.target_sx_um), 1e-12);
  g_assert_true(isnan(b.scan_age_s));
}

static void test_fitted(void)
{
  const AwMarkPair corners[] = {
    { { 0, 0 }, { 0, 0 } }, { { 100, 0 }, { 100, 0 } }, { { 100, 100 }, { 100, 100 } }, { { 0, 100 }, { 0, 100 } }
  };
  const AwMatrix map = { 4e-6, 1e-6, 1e-6, 9e-6 }, offset = { 0.04, 0.01, 0.01, 0.09 };
  AwRegistration r;
  AwBudgetInput in = nothing();
  AwBudget b;
  g_assert_true(aw_registration_fit(corners, 4, AW_FIT_SIMILARITY, FALSE, 0.7, &r, NULL));
  in.map_covariance = &map;
  in.offset_covariance = &offset;
  in.relocation = &r;
  in.drift_um2_per_h = 0.5;
  in.localisation_um = 0.11;
  in.check_age_s = 2 * 3600;
  in.scan_age_s = 9 * 3600;
  aw_budget_for_target(&in, &(AwBudgetTarget){ { 150, 50 }, { 300, 400 } }, &b);
  NEAR(b.term[AW_TERM_SCALE].sx_um, sqrt(4e-6 * 9e4 + 2e-6 * 12e4 + 9e-6 * 16e4), 1e-12);
  NEAR(b.term[AW_TERM_RELOCATION].sx_um, 0.7 * sqrt(0.75), 1e-12); /* check value of the corners of a 100 square */
  g_assert_cmpint(b.term[AW_TERM_RELOCATION].origin, ==, AW_ORIGIN_ENTERED);
  NEAR(b.term[AW_TERM_OFFSET].sx_um, 0.2, 1e-12);
  NEAR(b.term[AW_TERM_OFFSET].sy_um, 0.3, 1e-12);
  NEAR(b.term[AW_TERM_DRIFT].sx_um, 1, 1e-12);
  NEAR(b.term[AW_TERM_LOCALISATION].sx_um, 0.11, 1e-12);
  NEAR(b.term[AW_TERM_MOVEMENT].sx_um, 3, 1e-12);
  g_assert_cmpint(b.term[AW_TERM_MOVEMENT].origin, ==, AW_ORIGIN_ASSUMED);
  g_assert_cmpint(b.term[AW_TERM_DRIFT].origin, ==, AW_ORIGIN_FITTED);
  in.is_entered[AW_TERM_DRIFT] = TRUE;
  in.entered[AW_TERM_DRIFT] = 0.25;
  aw_budget_for_target(&in, &place, &b);
  NEAR(b.term[AW_TERM_DRIFT].sx_um, 0.25 * sqrt(2), 1e-12);
  g_assert_cmpint(b.term[AW_TERM_DRIFT].origin, ==, AW_ORIGIN_ENTERED);
}

/* The dish's budget is that of its median target. */
static void test_dish(void)
{
  AwBudgetInput in = nothing();
  AwBudgetTarget targets[5];
  AwBudget dish, one;
  for (int i = 0; i < 5; i++)
    targets[i] = (AwBudgetTarget){ { 0, 0 }, { 100 + 150 * ((i * 3) % 5), 0 } };
  aw_budget_for_dish(&in, targets, 5, &dish);
  aw_budget_for_target(&in, &(AwBudgetTarget){ { 0, 0 }, { 400, 0 } }, &one);
  NEAR(dish.sx_um, one.sx_um, 1e-12);
  aw_budget_for_dish(&in, NULL, 0, &dish);
  g_assert_cmpfloat(dish.term[AW_TERM_SCALE].sx_um, ==, 0);
}

static void test_names(void)
{
  for (int i = 0; i < AW_N_TERMS; i++) {
    AwTermId id = AW_N_TERMS;
    g_assert_true(aw_term_parse(aw_term_name((AwTermId)i), &id, NULL));
    g_assert_cmpint(id, ==, i);
    g_assert_cmpint(aw_term_kind(id), ==, i >= AW_TERM_LOCALISATION ? AW_TERM_TARGET : AW_TERM_DISH);
    g_assert_true(g_str_has_prefix(aw_term_unit(id), "um"));
  }
  AwTermId id;
  GError *error = NULL;
  g_assert_false(aw_term_parse("wind", &id, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "wind|pixel-scale, relocation");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/beam/budget/assumed", test_assumed);
  g_test_add_func("/beam/budget/fitted", test_fitted);
  g_test_add_func("/beam/budget/dish", test_dish);
  g_test_add_func("/beam/budget/names", test_names);
  return g_test_run();
}

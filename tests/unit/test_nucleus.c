/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/nucleus.h"

#include "support/check.h"

static void test_features(void)
{
  gsize n = 0;
  const AwFeature *all = aw_features(&n);
  g_assert_cmpuint(n, >, 10);
  AwNucleus nucleus = { .area = 12.5, .confidence = 0.25 };
  for (gsize i = 0; i < n; i++) {
    g_autofree char *um = aw_feature_name(&all[i], TRUE), *px = aw_feature_name(&all[i], FALSE);
    g_assert_true(aw_feature_find(um, NULL) == &all[i]);
    g_assert_true(aw_feature_find(px, NULL) == &all[i]);
    g_assert_true(aw_feature_find(all[i].stem, NULL) == &all[i]);
  }
  g_assert_cmpfloat(aw_feature_value(aw_feature_find("area_um2", NULL), &nucleus), ==, 12.5);
  g_assert_cmpfloat(aw_feature_value(aw_feature_find("area_px2", NULL), &nucleus), ==, 12.5);
  g_assert_cmpfloat(aw_feature_value(aw_feature_find("confidence", NULL), &nucleus), ==, 0.25);
}

static void test_unknown_feature(void)
{
  GError *error = NULL;
  g_assert_null(aw_feature_find("roundness", &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "roundness|area_um2|convexity|isolation_um");
}

static void test_flags(void)
{
  g_autofree char *none = aw_flags_text(0), *two = aw_flags_text(AW_FLAG_BORDER | AW_FLAG_TOUCHING);
  g_assert_cmpstr(none, ==, "");
  g_assert_cmpstr(two, ==, "border+touching");
}

static void test_copy(void)
{
  g_autoptr(GPtrArray) nuclei = aw_nuclei_new();
  AwNucleus *a = g_new0(AwNucleus, 1);
  a->id = 7;
  a->n_runs = 1;
  a->runs = g_new(AwRun, 1);
  a->runs[0] = (AwRun){ 1, 2, 3 };
  g_ptr_array_add(nuclei, a);
  g_autoptr(AwNucleus) b = aw_nucleus_copy(a);
  g_assert_cmpint(b->id, ==, 7);
  g_assert_true(b->runs != a->runs);
  g_assert_cmpint(b->runs[0].x1, ==, 3);
  g_assert_null(b->outline);
  aw_nucleus_free(NULL);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/nucleus/features", test_features);
  g_test_add_func("/nuclei/nucleus/unknown_feature", test_unknown_feature);
  g_test_add_func("/nuclei/nucleus/flags", test_flags);
  g_test_add_func("/nuclei/nucleus/copy", test_copy);
  return g_test_run();
}

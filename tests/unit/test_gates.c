/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/gates.h"

#include <math.h>
#include <string.h>

#include "../support/check.h"

static AwGate parse(const char *text)
{
  GError *error = NULL;
  AwGate gate = { 0 };
  g_assert_true(aw_gate_parse(text, &gate, &error));
  g_assert_no_error(error);
  return gate;
}

static void refuse(const char *text, AwErrorCode code, const char *parts)
{
  GError *error = NULL;
  AwGate gate = { 0 };
  g_assert_false(aw_gate_parse(text, &gate, &error));
  aw_check_error(&error, code, parts);
}

static void parsing(void)
{
  AwGate both = parse(" area_um2 = 50 .. 312.5 ");
  g_assert_cmpstr(both.feature->stem, ==, "area");
  g_assert_cmpfloat(both.min, ==, 50);
  g_assert_cmpfloat(both.max, ==, 312.5);
  AwGate low = parse("isolation=5..");
  g_assert_cmpfloat(low.min, ==, 5);
  g_assert_true(isinf(low.max) && low.max > 0);
  AwGate high = parse("convexity=..-0.5");
  g_assert_true(isinf(high.min) && high.min < 0);
  g_assert_cmpfloat(high.max, ==, -0.5);
  AwGate point = parse("convexity=1..1");
  g_assert_cmpfloat(point.min, ==, point.max);
}

static void text_for_people(void)
{
  static const char *const texts[][2] = { { "area=50..312.5", "50 <= area_um2 <= 312.5" },
                                          { "isolation_um=5..", "5 <= isolation_um" },
                                          { "convexity=..0.97", "convexity <= 0.97" } };
  for (gsize i = 0; i < G_N_ELEMENTS(texts); i++) {
    AwGate gate = parse(texts[i][0]);
    g_autofree char *text = aw_gate_text(&gate);
    g_assert_cmpstr(text, ==, texts[i][1]);
  }
  AwGate open = { parse("convexity=1..").feature, -INFINITY, INFINITY };
  g_autofree char *any = aw_gate_text(&open);
  g_assert_cmpstr(any, ==, "convexity any");
}

static void refused(void)
{
  refuse("area", AW_ERROR_FORMAT, "gate \"area\" is not of the form FEATURE=MIN..MAX");
  refuse("area=5", AW_ERROR_FORMAT, "gate \"area=5\" is not of the form");
  refuse("area..5", AW_ERROR_FORMAT, "is not of the form");
  refuse("area=..", AW_ERROR_FORMAT, "has neither a lower nor an upper end");
  refuse("area=9..5", AW_ERROR_RANGE, "gate \"area=9..5\": its lower end lies above its upper end");
  refuse("area=nan..5", AW_ERROR_FORMAT, "gate \"area=nan..5\": 'nan' is not a finite number");
  refuse("area=1..five", AW_ERROR_FORMAT, "'five' is not a finite number");
  refuse("area=1,5..9", AW_ERROR_FORMAT, "'1,5' has a decimal comma");
  refuse("weight=1..5", AW_ERROR_NOT_FOUND, "weight|area_um2|convexity");
  refuse("area_px2=1..5", AW_ERROR_RANGE, "gate \"area_px2=1..5\" names the wrong unit; write area_um2");
}

static void defaults(void)
{
  gsize n = 0;
  g_autofree AwGate *gates = aw_gates_default(&n);
  g_assert_cmpuint(n, >=, 3);
  for (gsize i = 0; i < n; i++) {
    g_assert_nonnull(gates[i].feature);
    g_assert_cmpfloat(gates[i].min, <, gates[i].max);
  }
}

/* Whoever adds a feature tells so in docs/formats.md. */
static void features_are_documented(void)
{
  gsize n = 0;
  const AwFeature *features = aw_features(&n);
  g_autofree char *page = NULL;
  g_assert_true(g_file_get_contents("docs/formats.md", &page, NULL, NULL));
  for (gsize i = 0; i < n; i++) {
    g_autofree char *name = aw_feature_name(&features[i], TRUE);
    g_autofree char *quoted = g_strdup_printf("`%s`", name);
    if (!strstr(page, quoted))
      g_error("docs/formats.md does not tell of %s", quoted);
  }
}

static void add(GPtrArray *nuclei, double area, double convexity, guint flags)
{
  AwNucleus *nucleus = g_new0(AwNucleus, 1);
  nucleus->area = area;
  nucleus->convexity = convexity;
  nucleus->flags = flags;
  g_ptr_array_add(nuclei, nucleus);
}

static void applying(void)
{
  g_autoptr(GPtrArray) nuclei = aw_nuclei_new();
  add(nuclei, 100, 0.95, AW_FLAG_TOUCHING);
  add(nuclei, 49.9, 0.95, 0);
  add(nuclei, 50, 0.9, 0);
  add(nuclei, 301, 0.5, AW_FLAG_BORDER);
  add(nuclei, NAN, 0.95, 0);
  add(nuclei, 120, 0.5, AW_FLAG_BORDER | AW_FLAG_DEFOCUSED);
  add(nuclei, INFINITY, 0.89, 0);
  const AwGate gates[] = { parse("area=50..300"), parse("convexity=0.9..") };
  static const gboolean expected[] = { 1, 0, 1, 0, 0, 0, 0 };
  gboolean inside[G_N_ELEMENTS(expected)];
  AwGateCount counts[3];
  g_assert_cmpuint(aw_gates_apply(gates, 2, AW_GATES_DEFAULT_REFUSED, nuclei, counts, inside), ==, 2);
  for (guint i = 0; i < nuclei->len; i++) {
    g_assert_cmpint(inside[i], ==, expected[i]);
    g_assert_cmpint(aw_gates_pass(gates, 2, AW_GATES_DEFAULT_REFUSED, nuclei->pdata[i]), ==, expected[i]);
  }
  static const AwGateCount want[] = { { 2, 2 }, { 4, 3 }, { 3, 0 } };
  g_assert_cmpmem(counts, sizeof counts, want, sizeof want);
}

static void in_turn(void)
{
  g_autoptr(GPtrArray) nuclei = aw_nuclei_new();
  add(nuclei, 10, 0.5, 0);
  add(nuclei, 100, 0.5, AW_FLAG_SATURATED);
  add(nuclei, 100, 0.5, 0);
  const AwGate gates[] = { parse("convexity=0.9.."), parse("area=50..300") };
  AwGateCount counts[3];
  gboolean inside[3];
  g_assert_cmpuint(aw_gates_apply(gates, 2, AW_FLAG_SATURATED, nuclei, counts, inside), ==, 0);
  static const AwGateCount want[] = { { 1, 1 }, { 3, 2 }, { 1, 0 } };
  g_assert_cmpmem(counts, sizeof counts, want, sizeof want);
}

static void applying_nothing(void)
{
  g_autoptr(GPtrArray) nuclei = aw_nuclei_new();
  AwGateCount count = { 7, 7 };
  gboolean inside = FALSE;
  g_assert_cmpuint(aw_gates_apply(NULL, 0, AW_GATES_DEFAULT_REFUSED, nuclei, &count, NULL), ==, 0);
  g_assert_cmpuint(count.alone + count.first, ==, 0);
  add(nuclei, 1, 1, AW_FLAG_BORDER);
  g_assert_cmpuint(aw_gates_apply(NULL, 0, 0, nuclei, &count, &inside), ==, 1);
  g_assert_true(inside);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/plan/gates/parsing", parsing);
  aw_check_add("/plan/gates/text_for_people", text_for_people);
  aw_check_add("/plan/gates/refused", refused);
  aw_check_add("/plan/gates/defaults", defaults);
  aw_check_add("/plan/gates/features_are_documented", features_are_documented);
  aw_check_add("/plan/gates/applying", applying);
  aw_check_add("/plan/gates/in_turn", in_turn);
  aw_check_add("/plan/gates/applying_nothing", applying_nothing);
  return g_test_run();
}

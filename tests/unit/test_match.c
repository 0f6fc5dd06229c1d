/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/match.h"
#include "support/check.h"
#include "support/pattern.h"

#define SCAN(p) ((AwMatchPattern){ (p).xy_um, (p).n, "the scan" })
#define FOLLOW_UP(p) ((AwMatchPattern){ (p).xy_um, (p).n, "the follow-up" })

static gboolean find(const AwTestPattern *a, const AwTestPattern *b, AwMatch *match)
{
  AwMatchSettings settings;
  aw_match_settings_init(&settings);
  g_autoptr(GError) error = NULL;
  gboolean ok = aw_match_find(SCAN(*a), FOLLOW_UP(*b), &settings, match, &error);
  g_assert_no_error(error);
  return ok;
}

/* What must hold of any result: both lists tell the same pairs, confidences are probabilities. */
static void check_lists(const AwMatch *match)
{
  gsize n = 0;
  for (gsize i = 0; i < match->n_a; i++) {
    const AwMatchPoint *p = &match->of_a[i];
    g_assert_true(p->confidence >= 0 && p->confidence <= 1);
    if (p->partner < 0)
      continue;
    n++;
    g_assert_cmpint(match->of_b[p->partner].partner, ==, (int)i);
    g_assert_cmpfloat_with_epsilon(match->of_b[p->partner].confidence, p->confidence, 1e-12);
  }
  g_assert_cmpuint(n, ==, match->n_matched);
  for (gsize j = 0; j < match->n_b; j++)
    n -= match->of_b[j].partner >= 0;
  g_assert_cmpuint(n, ==, 0);
  g_assert_nonnull(match->note);
}

static void check_found(const AwMatch *match, const AwTestPattern *a, const AwTestPattern *b,
                        const AwTestChange *change)
{
  AwTestScore score = { 0 };
  check_lists(match);
  g_assert_true(match->sure);
  g_assert_true(match->mirrored == change->mirrored);
  g_assert_cmpfloat(aw_test_map_error(match, a, change), <, 3);
  aw_test_score(match, b, &score);
  g_assert_cmpuint(score.n_found * 100, >=, score.n_true * 98);
  g_assert_cmpuint(score.n_wrong * 100, <=, score.n_found * 2);
  g_assert_cmpfloat(fabs(match->movement_um - change->movement_um), <, 4 * match->movement_se_um);
}

static void test_any_turn(void)
{
  for (guint k = 0; k < 6; k++) {
    AwRandom random = aw_random_stream(11, k);
    g_auto(AwTestPattern) a = aw_test_dish(&random, 200, 100, 20);
    AwTestChange change = aw_test_change(&random, 20);
    change.mirrored = k % 2 == 1;
    g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
    g_auto(AwMatch) match = { 0 };
    g_assert_true(find(&a, &b, &match));
    check_found(&match, &a, &b, &change);
    g_assert_cmpfloat(match.log10_chance, <, -20);
  }
}

/* Nothing lost: the follow-up has more points than the scan, which makes the scan the pattern that is looked for. */
static void test_more_than_before(void)
{
  AwRandom random = aw_random_stream(12, 0);
  g_auto(AwTestPattern) a = aw_test_dish(&random, 150, 60, 15);
  AwTestChange change = aw_test_change(&random, 15);
  change.lost_frac = 0;
  g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
  g_auto(AwMatch) match = { 0 };
  g_assert_cmpuint(b.n, >, a.n);
  g_assert_true(find(&a, &b, &match));
  check_found(&match, &a, &b, &change);
}

/* A corner of the dish alone was imaged again: what lies outside is neither matched nor counted as shared. */
static void test_part(void)
{
  AwRandom random = aw_random_stream(13, 0);
  g_auto(AwTestPattern) a = aw_test_dish(&random, 900, 60, 15);
  AwTestChange change = aw_test_change(&random, 15);
  g_auto(AwTestPattern) whole = aw_test_changed(&random, &a, &change);
  g_auto(AwTestPattern) b = { g_new0(double, 2 * whole.n), 0, g_new0(gssize, whole.n) };
  for (gsize j = 0; j < whole.n; j++)
    if (whole.truth[j] >= 0 && a.xy_um[2 * whole.truth[j]] < 1700 && a.xy_um[2 * whole.truth[j] + 1] < -2300) {
      b.xy_um[2 * b.n] = whole.xy_um[2 * j];
      b.xy_um[2 * b.n + 1] = whole.xy_um[2 * j + 1];
      b.truth[b.n++] = whole.truth[j];
    }
  g_auto(AwMatch) match = { 0 };
  g_assert_true(find(&a, &b, &match));
  g_assert_true(match.sure);
  AwTestScore score = { 0 };
  aw_test_score(&match, &b, &score);
  g_assert_cmpuint(score.n_found, >=, b.n - 3);
  g_assert_cmpuint(match.n_shared_a, <, 200);
  g_assert_cmpuint(match.n_shared_a, >, 80);
}

/* The same points again, moved by nothing: an exact map and every point certain. */
static void test_same(void)
{
  AwRandom random = aw_random_stream(14, 0);
  g_auto(AwTestPattern) a = aw_test_dish(&random, 100, 50, 15);
  g_auto(AwMatch) match = { 0 };
  g_assert_true(find(&a, &a, &match));
  check_lists(&match);
  g_assert_true(match.sure);
  g_assert_cmpuint(match.n_matched, ==, 100);
  for (gsize i = 0; i < a.n; i++) {
    g_assert_cmpint(match.of_a[i].partner, ==, (int)i);
    g_assert_cmpfloat(match.of_a[i].confidence, >, 0.999);
  }
  g_assert_cmpfloat_with_epsilon(match.m.xx, 1, 1e-9);
  g_assert_cmpfloat_with_epsilon(match.shift_x_um, 0, 1e-4);
  g_assert_cmpfloat(match.movement_um, <, 0.01);
}

/* One nucleus divides: a daughter is its partner, and the confidence tells that it might be the other one. */
static void test_divided(void)
{
  AwRandom random = aw_random_stream(21, 0);
  g_auto(AwTestPattern) a = aw_test_dish(&random, 200, 80, 20);
  AwTestChange change = { 0, 0, 3, 20, 1, 0.5, 100, 200, FALSE };
  g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
  gsize j = 17, mother = (gsize)b.truth[j];
  b.xy_um = g_renew(double, b.xy_um, 2 * (b.n + 1));
  b.xy_um[2 * b.n] = b.xy_um[2 * j] + 5;
  b.xy_um[2 * b.n + 1] = b.xy_um[2 * j + 1] + 1;
  b.n++;
  g_auto(AwMatch) match = { 0 };
  g_assert_true(find(&a, &b, &match));
  check_lists(&match);
  const AwMatchPoint *of = &match.of_a[mother];
  g_assert_true(of->partner == (gssize)j || of->partner == (gssize)b.n - 1);
  g_assert_cmpfloat(of->confidence, <, 0.95);
  g_assert_cmpfloat(of->confidence, >, 0.3);
}

static void test_unrelated(void)
{
  for (guint k = 0; k < 3; k++) {
    AwRandom random = aw_random_stream(15, k);
    g_auto(AwTestPattern) a = aw_test_dish(&random, 80, 60, 15);
    g_auto(AwTestPattern) b = aw_test_dish(&random, 80, 60, 15);
    g_auto(AwMatch) match = { 0 };
    g_assert_true(find(&a, &b, &match));
    check_lists(&match);
    g_assert_false(match.sure);
    g_assert_nonnull(strstr(match.note, "Not sure"));
  }
}

/* A lattice lies on itself in many ways; each is far beyond chance and none may be called sure. */
static void test_regular(void)
{
  g_auto(AwTestPattern) a = { g_new0(double, 2 * 400), 400, NULL };
  for (gsize i = 0; i < a.n; i++) {
    a.xy_um[2 * i] = 50 * (double)(i % 20);
    a.xy_um[2 * i + 1] = 50 * (double)(i / 20);
  }
  g_auto(AwMatch) match = { 0 };
  g_assert_true(find(&a, &a, &match));
  g_assert_cmpfloat(match.log10_chance, <, -20);
  g_assert_false(match.sure);
  g_assert_nonnull(strstr(match.note, "regular"));
}

static void test_mirror_not_allowed(void)
{
  AwRandom random = aw_random_stream(16, 0);
  g_auto(AwTestPattern) a = aw_test_dish(&random, 100, 60, 15);
  AwTestChange change = aw_test_change(&random, 15);
  change.mirrored = TRUE;
  g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
  AwMatchSettings settings;
  aw_match_settings_init(&settings);
  settings.allow_mirror = FALSE;
  g_auto(AwMatch) match = { 0 };
  g_assert_true(aw_match_find(SCAN(a), FOLLOW_UP(b), &settings, &match, NULL));
  g_assert_false(match.sure);
}

static void test_twice(void)
{
  AwRandom random = aw_random_stream(17, 0);
  g_auto(AwTestPattern) a = aw_test_dish(&random, 300, 40, 12);
  AwTestChange change = aw_test_change(&random, 12);
  g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
  g_auto(AwMatch) once = { 0 }, again = { 0 };
  g_assert_true(find(&a, &b, &once) && find(&a, &b, &again));
  g_assert_cmpmem(&once.m, sizeof once.m, &again.m, sizeof again.m);
  g_assert_cmpmem(once.of_b, b.n * sizeof *once.of_b, again.of_b, b.n * sizeof *again.of_b);
}

static void test_refused(void)
{
  AwRandom random = aw_random_stream(18, 0);
  g_auto(AwTestPattern) good = aw_test_dish(&random, 20, 60, 15), bad = aw_test_dish(&random, 20, 60, 15);
  AwMatchSettings settings;
  aw_match_settings_init(&settings);
  g_auto(AwMatch) match = { 0 };
  GError *error = NULL;
  bad.n = 5;
  g_assert_false(aw_match_find(SCAN(good), FOLLOW_UP(bad), &settings, &match, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "the follow-up|5 points|at least 8");
  bad.n = 20;
  bad.xy_um[13] = NAN;
  g_assert_false(aw_match_find(SCAN(bad), FOLLOW_UP(good), &settings, &match, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "the scan|Point 7|not a number");
  for (gsize i = 0; i < bad.n; i++)
    bad.xy_um[2 * i + 1] = 3 * bad.xy_um[2 * i] + 5;
  g_assert_false(aw_match_find(SCAN(good), FOLLOW_UP(bad), &settings, &match, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "the follow-up|one line");
  for (gsize i = 0; i < 2 * bad.n; i++)
    bad.xy_um[i] = 7;
  g_assert_false(aw_match_find(SCAN(good), FOLLOW_UP(bad), &settings, &match, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "the follow-up|one spot");
  bad.xy_um[0] = 100;
  bad.xy_um[3] = 100;
  g_assert_false(aw_match_find(SCAN(bad), FOLLOW_UP(good), &settings, &match, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "the scan|one spot");
  bad = (aw_test_pattern_clear(&bad), aw_test_dish(&random, 20, 60, 15));
  bad.xy_um[0] = bad.xy_um[3] = 5e8;
  g_assert_false(aw_match_find(SCAN(bad), FOLLOW_UP(good), &settings, &match, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "the scan|mm|units");
  settings.scale_min = 1.1;
  g_assert_false(aw_match_find(SCAN(good), FOLLOW_UP(good), &settings, &match, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "1.100|scale");
}

static void test_cancelled(void)
{
  AwRandom random = aw_random_stream(19, 0);
  g_auto(AwTestPattern) a = aw_test_dish(&random, 60, 60, 15);
  AwProgress progress = { .cancelled = 1 };
  AwMatchSettings settings;
  aw_match_settings_init(&settings);
  settings.progress = &progress;
  g_auto(AwMatch) match = { 0 };
  GError *error = NULL;
  g_assert_false(aw_match_find(SCAN(a), FOLLOW_UP(a), &settings, &match, &error));
  aw_check_error(&error, AW_ERROR_CANCELLED, "");
  g_assert_null(match.of_a);
}

/* Movement given beforehand and an affine map: shear of the follow-up comes back. */
static void test_affine(void)
{
  AwRandom random = aw_random_stream(20, 0);
  g_auto(AwTestPattern) a = aw_test_dish(&random, 400, 80, 20);
  AwTestChange change = aw_test_change(&random, 20);
  change.mirrored = FALSE;
  change.angle_rad = 0;
  change.scale = 1;
  g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
  for (gsize j = 0; j < b.n; j++)
    b.xy_um[2 * j] += 0.01 * b.xy_um[2 * j + 1];
  AwMatchSettings settings;
  aw_match_settings_init(&settings);
  settings.kind = AW_FIT_AFFINE;
  settings.movement_um = 3;
  g_auto(AwMatch) match = { 0 };
  g_assert_true(aw_match_find(SCAN(a), FOLLOW_UP(b), &settings, &match, NULL));
  g_assert_true(match.sure);
  g_assert_cmpfloat_with_epsilon(match.m.xy, 0.01, 0.002);
  g_assert_cmpfloat_with_epsilon(match.m.yx, 0, 0.002);
  g_assert_cmpfloat(fabs(match.movement_um - 3), <, 4 * match.movement_se_um);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/geometry/match/any-turn", test_any_turn);
  g_test_add_func("/geometry/match/more-than-before", test_more_than_before);
  g_test_add_func("/geometry/match/part", test_part);
  g_test_add_func("/geometry/match/same", test_same);
  g_test_add_func("/geometry/match/divided", test_divided);
  g_test_add_func("/geometry/match/unrelated", test_unrelated);
  g_test_add_func("/geometry/match/regular", test_regular);
  g_test_add_func("/geometry/match/mirror-not-allowed", test_mirror_not_allowed);
  g_test_add_func("/geometry/match/twice", test_twice);
  aw_check_add("/geometry/match/refused", test_refused);
  g_test_add_func("/geometry/match/cancelled", test_cancelled);
  g_test_add_func("/geometry/match/affine", test_affine);
  return g_test_run();
}

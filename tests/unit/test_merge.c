/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/scan_parts.h"

#include "base/random.h"
#include "geometry/outline.h"

/* A view of an ellipse with full axes `wide` and `high` at (x, y). */
static void add(GArray *views, gsize source, double x, double y, double wide, double high)
{
  AwNucleus *a = g_new0(AwNucleus, 1);
  a->centroid = (AwScanPoint){ x, y };
  a->n_views = 1;
  a->n_outline = 40;
  a->outline = g_new(AwScanPoint, 40);
  for (int i = 0; i < 40; i++)
    a->outline[i] = (AwScanPoint){ x + wide / 2 * cos(i * G_PI / 20), y + high / 2 * sin(i * G_PI / 20) };
  a->area = aw_outline_area(a->outline, 40);
  AwScanView view = { a, source, AW_VIEW_FREE, 0.8 };
  g_array_append_val(views, view);
}

static void set_last(GArray *views, AwViewEdge edge, double quality)
{
  g_array_index(views, AwScanView, views->len - 1).edge = edge;
  g_array_index(views, AwScanView, views->len - 1).quality = quality;
}

static GArray *empty(void)
{
  return g_array_new(FALSE, FALSE, sizeof(AwScanView));
}

static const AwNucleus *nucleus(GArray *views, guint i)
{
  return g_array_index(views, AwScanView, i).nucleus;
}

/* One nucleus in two frames, 1 um apart, and one seen once. */
static void test_pair(void)
{
  g_autoptr(GArray) views = empty();
  AwMergeTally tally = { 0 };
  add(views, 0, 100, 50, 12, 10);
  add(views, 0, 130, 50, 12, 10);
  add(views, 1, 101, 50, 12, 10);
  set_last(views, AW_VIEW_FREE, 0.9);
  GArray *kept = aw_scan_merge(views, &tally);
  g_assert_cmpuint(kept->len, ==, 2);
  g_assert_cmpfloat(nucleus(kept, 0)->centroid.x_um, ==, 130);
  const AwNucleus *a = nucleus(kept, 1);
  g_assert_cmpfloat(a->centroid.x_um, ==, 101);
  g_assert_cmpint(a->n_views, ==, 2);
  g_assert_cmpfloat_with_epsilon(a->spread_um, 0.5, 1e-12);
  g_assert_cmpuint(tally.n_pairs, ==, 1);
  g_assert_cmpfloat_with_epsilon(tally.sum_square, 1, 1e-12);
  g_assert_cmpuint(tally.n_cut_dropped, ==, 0);
  aw_scan_views_free(kept);
}

/* A cut view loses to the whole one however good it is; cut in both frames, one of them stays. */
static void test_cut(void)
{
  g_autoptr(GArray) views = empty();
  AwMergeTally tally = { 0 };
  add(views, 0, 100, 50, 5, 10);
  set_last(views, AW_VIEW_CUT, 1);
  add(views, 1, 103, 50, 12, 10);
  set_last(views, AW_VIEW_FREE, 0.2);
  add(views, 0, 200, 50, 8, 10);
  set_last(views, AW_VIEW_CUT, 0.5);
  add(views, 1, 201, 50, 8, 10);
  set_last(views, AW_VIEW_CUT, 0.6);
  GArray *kept = aw_scan_merge(views, &tally);
  g_assert_cmpuint(kept->len, ==, 2);
  g_assert_cmpfloat(nucleus(kept, 0)->centroid.x_um, ==, 103);
  g_assert_cmpfloat(nucleus(kept, 1)->centroid.x_um, ==, 201);
  g_assert_cmpuint(tally.n_cut_dropped, ==, 1);
  g_assert_cmpuint(tally.n_pairs, ==, 0);
  g_assert_cmpfloat(nucleus(kept, 0)->spread_um, ==, 0);
  g_assert_cmpint(nucleus(kept, 0)->n_views, ==, 2);
  aw_scan_views_free(kept);
}

/* Frame 0 sees two nuclei where frame 1 sees one: both or the one, never a mixture. */
static void check_split(double quality_one, guint n_expected)
{
  g_autoptr(GArray) views = empty();
  AwMergeTally tally = { 0 };
  add(views, 0, 100, 50, 11, 10);
  set_last(views, AW_VIEW_FREE, 0.9);
  add(views, 0, 111, 50, 9, 10);
  set_last(views, AW_VIEW_FREE, 0.7);
  add(views, 1, 105, 50, 21, 10);
  set_last(views, AW_VIEW_FREE, quality_one);
  GArray *kept = aw_scan_merge(views, &tally);
  g_assert_cmpuint(kept->len, ==, n_expected);
  aw_scan_views_free(kept);
}

static void test_split(void)
{
  check_split(0.75, 2); /* below the mean of the two, though above one of them */
  check_split(0.85, 1);
}

/* The reading that needs a cut view loses: frame 0 sees one nucleus and a cut one, frame 1 both in one, whole. */
static void test_split_at_edge(void)
{
  g_autoptr(GArray) views = empty();
  AwMergeTally tally = { 0 };
  add(views, 0, 100, 50, 11, 10);
  add(views, 0, 108, 50, 4, 8);
  set_last(views, AW_VIEW_CUT, 0.9);
  add(views, 1, 105, 50, 21, 10);
  set_last(views, AW_VIEW_FREE, 0.3);
  GArray *kept = aw_scan_merge(views, &tally);
  g_assert_cmpuint(kept->len, ==, 1);
  g_assert_cmpfloat(nucleus(kept, 0)->centroid.x_um, ==, 105);
  aw_scan_views_free(kept);
}

/* Four frames at a corner, touching neighbours, one giant: every true nucleus once, whatever the order. */
static void test_corner(void)
{
  g_autoptr(GArray) views = empty();
  AwMergeTally tally = { 0 };
  AwRandom r = aw_random_stream(2, 0);
  for (gsize source = 0; source < 4; source++) {
    for (int k = 0; k < 60; k++)
      add(views, source, 20 * (k % 10) + 0.8 * aw_random_normal(&r), 30 * (k / 10) + 0.8 * aw_random_normal(&r), 20,
          14);
    if (source != 2)
      add(views, source, 400, 60, 300, 20);
  }
  GArray *kept = aw_scan_merge(views, &tally);
  g_assert_cmpuint(kept->len, ==, 61);
  for (guint i = 0; i < kept->len; i++)
    g_assert_cmpint(nucleus(kept, i)->n_views, ==, nucleus(kept, i)->area > 1000 ? 3 : 4);
  g_assert_cmpuint(views->len, ==, 0);
  g_assert_cmpuint(tally.n_pairs, ==, 60 * 3 + 2);
  aw_scan_views_free(kept);
}

static void test_none(void)
{
  g_autoptr(GArray) views = empty();
  AwMergeTally tally = { 0 };
  g_autoptr(GArray) kept = aw_scan_merge(views, &tally);
  g_assert_cmpuint(kept->len, ==, 0);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/merge/pair", test_pair);
  g_test_add_func("/nuclei/merge/cut", test_cut);
  g_test_add_func("/nuclei/merge/split", test_split);
  g_test_add_func("/nuclei/merge/split_at_edge", test_split_at_edge);
  g_test_add_func("/nuclei/merge/corner", test_corner);
  g_test_add_func("/nuclei/merge/none", test_none);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/random.h"
#include "support/fake_dish.h"
#include "view/hit.h"

static FakeDish *dish_of(gsize n)
{
  FakeDishSettings s = fake_dish_defaults();
  s.overview_px = 0;
  s.n_nuclei = n;
  return fake_dish_new(&s);
}

static AwScanPoint somewhere(AwRandom *r)
{
  return (AwScanPoint){ 11500 + 2600 * aw_random_unit(r), -4500 + 2600 * aw_random_unit(r) };
}

/* What the index must find, by asking every nucleus. */
static int at_by_hand(const FakeDish *dish, AwScanPoint q, double slack_um)
{
  int inside = -1, near = -1;
  double area = INFINITY, least = slack_um;
  for (guint i = 0; i < dish->nuclei->len; i++) {
    const AwNucleus *n = dish->nuclei->pdata[i];
    double d = hypot(n->centroid.x_um - q.x_um, n->centroid.y_um - q.y_um);
    if (aw_polygon_contains(n->outline, n->n_outline, q) && n->area < area)
      area = n->area, inside = (int)i;
    if (d < least)
      least = d, near = (int)i;
  }
  return inside >= 0 ? inside : near;
}

static void picks_like_a_full_search(void)
{
  g_autoptr(FakeDish) dish = dish_of(700);
  g_autoptr(AwHitIndex) index = aw_hit_index_new(dish->nuclei);
  AwRandom r = aw_random_stream(5, 0);
  int n_found = 0;
  for (int i = 0; i < 4000; i++) {
    AwScanPoint q = somewhere(&r);
    double slack = i % 3 * 9.7;
    int expected = at_by_hand(dish, q, slack);
    g_assert_cmpint(aw_hit_at(index, q, slack), ==, expected);
    n_found += expected >= 0;
  }
  g_assert_cmpint(n_found, >, 200);
  g_assert_cmpint(n_found, <, 3800);
}

/* A small nucleus drawn inside a large one must stay within reach of the pointer. */
static void smallest_wins(void)
{
  g_autoptr(FakeDish) dish = dish_of(0);
  fake_dish_add(dish, (AwScanPoint){ 10, 10 }, 40, 40, 0);
  fake_dish_add(dish, (AwScanPoint){ 12, 11 }, 8, 6, 0.3);
  fake_dish_add(dish, (AwScanPoint){ 100, 10 }, 8, 8, 0);
  g_autoptr(AwHitIndex) index = aw_hit_index_new(dish->nuclei);
  g_assert_cmpint(aw_hit_at(index, (AwScanPoint){ 12, 11 }, 0), ==, 1);
  g_assert_cmpint(aw_hit_at(index, (AwScanPoint){ 0, 10 }, 0), ==, 0);
  g_assert_cmpint(aw_hit_at(index, (AwScanPoint){ 110, 10 }, 0), ==, -1);
  g_assert_cmpint(aw_hit_at(index, (AwScanPoint){ 110, 10 }, 10.5), ==, 2);
  g_assert_cmpint(aw_hit_at(index, (AwScanPoint){ NAN, 10 }, 10.5), ==, -1);
}

static void rectangle(void)
{
  g_autoptr(FakeDish) dish = dish_of(700);
  g_autoptr(AwHitIndex) index = aw_hit_index_new(dish->nuclei);
  AwScanPoint a = { 12700, -3600 }, b = { 12300, -2900 };
  g_autoptr(GArray) found = aw_hit_in_rectangle(index, a, b);
  guint k = 0;
  for (guint i = 0; i < dish->nuclei->len; i++) {
    const AwNucleus *n = dish->nuclei->pdata[i];
    gboolean left = TRUE, right = TRUE, above = TRUE, below = TRUE;
    for (gsize p = 0; p < n->n_outline; p++) {
      left = left && n->outline[p].x_um < 12300;
      right = right && n->outline[p].x_um > 12700;
      above = above && n->outline[p].y_um < -3600;
      below = below && n->outline[p].y_um > -2900;
    }
    if (!left && !right && !above && !below)
      g_assert_cmpuint(g_array_index(found, guint, k++), ==, i);
  }
  g_assert_cmpuint(k, ==, found->len);
  g_assert_cmpuint(k, >, 30);
  g_autoptr(GArray) none = aw_hit_in_rectangle(index, (AwScanPoint){ 1e6, 0 }, (AwScanPoint){ 2e6, 9 });
  g_assert_cmpuint(none->len, ==, 0);
}

static void add_dot(FakeDish *dish, double x, double y)
{
  fake_dish_add(dish, (AwScanPoint){ x, y }, 2, 2, 0);
}

/* A hand that runs round twice and crosses its own line: a five-pointed star's middle belongs to the loop. */
static void loop(void)
{
  g_autoptr(FakeDish) dish = dish_of(0);
  AwScanPoint star[5];
  for (int i = 0; i < 5; i++)
    star[i] = (AwScanPoint){ 50 * cos(i * 4 * G_PI / 5), 50 * sin(i * 4 * G_PI / 5) };
  add_dot(dish, 0, 0);   /* middle */
  add_dot(dish, 35, 0);  /* in a point */
  add_dot(dish, -35, 0); /* in a notch */
  add_dot(dish, 500, 0); /* far away */
  g_autoptr(AwHitIndex) index = aw_hit_index_new(dish->nuclei);
  g_autoptr(GArray) found = aw_hit_in_loop(index, star, 5);
  g_assert_cmpuint(found->len, ==, 2);
  g_assert_cmpuint(g_array_index(found, guint, 0), ==, 0);
  g_assert_cmpuint(g_array_index(found, guint, 1), ==, 1);
  g_autoptr(GArray) line = aw_hit_in_loop(index, star, 2);
  g_assert_cmpuint(line->len, ==, 0);
  star[2].x_um = NAN;
  star[3].y_um = INFINITY;
  g_autoptr(GArray) mad = aw_hit_in_loop(index, star, 5);
  g_assert_cmpuint(mad->len, ==, 0);
}

static void useless_nuclei(void)
{
  g_autoptr(FakeDish) dish = dish_of(0);
  g_autoptr(AwHitIndex) empty = aw_hit_index_new(dish->nuclei);
  g_assert_cmpint(aw_hit_at(empty, (AwScanPoint){ 0, 0 }, 1e9), ==, -1);
  add_dot(dish, NAN, 0);
  add_dot(dish, 0, 1e300);
  add_dot(dish, 3, 4);
  fake_dish_add(dish, (AwScanPoint){ 9, 9 }, 2, 2, 0)->outline[1].x_um = -INFINITY;
  AwNucleus *bare = fake_dish_add(dish, (AwScanPoint){ 20, 20 }, 2, 2, 0);
  bare->n_outline = 0;
  g_autoptr(AwHitIndex) index = aw_hit_index_new(dish->nuclei);
  g_assert_cmpint(aw_hit_at(index, (AwScanPoint){ 3, 4 }, 0), ==, 2);
  g_assert_cmpint(aw_hit_at(index, (AwScanPoint){ 9, 9 }, 3), ==, -1);
  g_assert_cmpint(aw_hit_at(index, (AwScanPoint){ 21, 20 }, 3), ==, 4);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/view/hit/picks_like_a_full_search", picks_like_a_full_search);
  g_test_add_func("/view/hit/smallest_wins", smallest_wins);
  g_test_add_func("/view/hit/rectangle", rectangle);
  g_test_add_func("/view/hit/loop", loop);
  g_test_add_func("/view/hit/useless_nuclei", useless_nuclei);
  return g_test_run();
}

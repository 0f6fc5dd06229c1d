/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/random.h"

#include <math.h>

#include "../support/check.h"

/* First outputs for state 1234567, recomputed from the paper's three lines with Python integers. */
static void splitmix64(void)
{
  AwRandom r = { 1234567 };
  g_assert_cmpuint(aw_random_bits(&r), ==, G_GUINT64_CONSTANT(6457827717110365317));
  g_assert_cmpuint(aw_random_bits(&r), ==, G_GUINT64_CONSTANT(3203168211198807973));
  g_assert_cmpuint(aw_random_bits(&r), ==, G_GUINT64_CONSTANT(9817491932198370423));
}

static void streams_differ(void)
{
  g_autoptr(GHashTable) seen = g_hash_table_new_full(g_int64_hash, g_int64_equal, g_free, NULL);
  for (guint64 seed = 0; seed < 40; seed++)
    for (guint64 item = 0; item < 250; item++) {
      AwRandom r = aw_random_stream(seed, item), again = aw_random_stream(seed, item);
      guint64 *bits = g_new(guint64, 1);
      *bits = aw_random_bits(&r);
      g_assert_cmpuint(*bits, ==, aw_random_bits(&again));
      g_assert_true(g_hash_table_add(seen, bits));
    }
}

/* Mean and variance of many draws, each within five standard errors of its law. */
static void unit_and_below(void)
{
  AwRandom r = aw_random_stream(7, 0);
  const int n = 200000;
  double sum = 0, squares = 0, counts[10] = { 0 };
  for (int i = 0; i < n; i++) {
    double u = aw_random_unit(&r);
    g_assert_true(u >= 0 && u < 1);
    sum += u;
    squares += u * u;
    guint32 k = aw_random_below(&r, 10);
    g_assert_cmpuint(k, <, 10);
    counts[k]++;
  }
  g_assert_cmpfloat_with_epsilon(sum / n, 0.5, 5 * sqrt(1.0 / 12 / n));
  g_assert_cmpfloat_with_epsilon(squares / n, 1.0 / 3, 5 * sqrt(4.0 / 45 / n));
  for (int k = 0; k < 10; k++)
    g_assert_cmpfloat_with_epsilon(counts[k] / n, 0.1, 5 * sqrt(0.09 / n));
  g_assert_cmpuint(aw_random_below(&r, 1), ==, 0);
}

static void normal(void)
{
  AwRandom r = aw_random_stream(11, 3);
  const int n = 200000;
  double sum = 0, squares = 0, fourth = 0;
  for (int i = 0; i < n; i++) {
    double z = aw_random_normal(&r);
    sum += z;
    squares += z * z;
    fourth += z * z * z * z;
  }
  g_assert_cmpfloat_with_epsilon(sum / n, 0, 5 * sqrt(1.0 / n));
  g_assert_cmpfloat_with_epsilon(squares / n, 1, 5 * sqrt(2.0 / n));
  g_assert_cmpfloat_with_epsilon(fourth / n, 3, 5 * sqrt(96.0 / n));
}

static void assert_poisson(double mean)
{
  AwRandom r = aw_random_stream(13, 1);
  const int n = 100000;
  double sum = 0, squares = 0;
  for (int i = 0; i < n; i++) {
    double k = aw_random_poisson(&r, mean);
    sum += k;
    squares += (k - mean) * (k - mean);
  }
  g_assert_cmpfloat_with_epsilon(sum / n, mean, 5 * sqrt(mean / n) + 1e-12);
  g_assert_cmpfloat_with_epsilon(squares / n, mean, 5 * sqrt((mean + 2 * mean * mean) / n) + 1e-12);
}

static void poisson(void)
{
  assert_poisson(0);
  assert_poisson(0.37);
  assert_poisson(4.5);
  assert_poisson(30);
  assert_poisson(73.25); /* split into parts */
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/base/random/splitmix64", splitmix64);
  g_test_add_func("/base/random/streams_differ", streams_differ);
  g_test_add_func("/base/random/unit_and_below", unit_and_below);
  g_test_add_func("/base/random/normal", normal);
  g_test_add_func("/base/random/poisson", poisson);
  return g_test_run();
}

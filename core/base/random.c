/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/random.h"

#include <math.h>

AwRandom aw_random_stream(guint64 seed, guint64 item)
{
  AwRandom a = { seed };
  AwRandom b = { item ^ aw_random_bits(&a) };
  return (AwRandom){ aw_random_bits(&b) ^ aw_random_bits(&a) };
}

double aw_random_normal(AwRandom *r)
{
  double u = 1.0 - aw_random_unit(r);
  double v = aw_random_unit(r);
  return sqrt(-2.0 * log(u)) * cos(2.0 * G_PI * v);
}

/* Small means by counting down the distribution; large ones are split, since a sum of Poisson deviates is one. */
unsigned aw_random_poisson(AwRandom *r, double mean)
{
  unsigned total = 0;
  while (mean > 30.0) {
    total += aw_random_poisson(r, 30.0);
    mean -= 30.0;
  }
  double floor_p = exp(-mean);
  double product = aw_random_unit(r);
  while (product > floor_p) {
    total++;
    product *= aw_random_unit(r);
  }
  return total;
}

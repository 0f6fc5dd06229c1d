/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/rank.h"

#include <math.h>
#include <stdlib.h>

static inline float median3(float a, float b, float c)
{
  return a < b ? (b < c ? b : MAX(a, c)) : (a < c ? a : MAX(b, c));
}

/* Hoare, Algorithm 65: Find, Commun. ACM 4:321, 1961; the pivot is the median of three. */
float aw_quantile(float *value, gsize n, double q)
{
  g_return_val_if_fail(n > 0, NAN);
  gssize lo = 0, hi = (gssize)n - 1, k = (gssize)(q * (double)(n - 1));
  while (lo < hi) {
    float pivot = median3(value[lo], value[lo + (hi - lo) / 2], value[hi]);
    gssize i = lo, j = hi;
    while (i <= j) {
      while (value[i] < pivot)
        i++;
      while (pivot < value[j])
        j--;
      if (i > j)
        break;
      float t = value[i];
      value[i++] = value[j];
      value[j--] = t;
    }
    if (k <= j)
      hi = j;
    else if (k >= i)
      lo = i;
    else
      break;
  }
  return value[k];
}

typedef struct {
  double value, weight;
} Weighted;

static int by_value(const void *a, const void *b)
{
  double u = ((const Weighted *)a)->value, v = ((const Weighted *)b)->value;
  return (u > v) - (u < v);
}

double aw_weighted_median(const double *value, const double *weight, gsize n)
{
  if (n == 0)
    return NAN;
  g_autofree Weighted *w = g_new(Weighted, n);
  double total = 0, sum = 0;
  for (gsize i = 0; i < n; i++) {
    w[i] = (Weighted){ value[i], weight[i] };
    total += weight[i];
  }
  qsort(w, n, sizeof *w, by_value);
  for (gsize i = 0; i < n; i++)
    if ((sum += w[i].weight) >= total / 2)
      return w[i].value;
  return w[n - 1].value;
}

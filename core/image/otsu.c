/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/otsu.h"

#define N_BINS 256

static int best_cut(const double *count, double n)
{
  double total = 0, below = 0, sum = 0, best = -1;
  int cut = 0;
  for (int i = 0; i < N_BINS; i++)
    total += i * count[i];
  for (int i = 0; i < N_BINS - 1; i++) {
    below += count[i];
    sum += i * count[i];
    if (below <= 0 || below >= n)
      continue;
    double gap = sum / below - (total - sum) / (n - below), between = below * (n - below) * gap * gap;
    if (between > best) {
      best = between;
      cut = i;
    }
  }
  return cut;
}

double aw_otsu(const float *value, gsize n)
{
  g_return_val_if_fail(n > 0, 0);
  float lo = value[0], hi = value[0];
  for (gsize i = 1; i < n; i++) {
    lo = MIN(lo, value[i]);
    hi = MAX(hi, value[i]);
  }
  if (!(hi > lo))
    return (double)lo;
  double count[N_BINS] = { 0 };
  float scale = (float)N_BINS / (hi - lo);
  for (gsize i = 0; i < n; i++)
    count[MIN((int)((value[i] - lo) * scale), N_BINS - 1)]++;
  return (double)lo + (best_cut(count, (double)n) + 1) * ((double)hi - (double)lo) / N_BINS;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/tour_search.h"

/* A handful of stops is solved outright: the cheapest way to have visited a set of stops and to stand at one of them
 * follows from the sets with that stop left out (Bellman, J. ACM 9:61, 1962; Held & Karp, J. SIAM 10:196, 1962). */

#define MAX_SETS (1u << AW_TOUR_MAX_EXACT)

typedef struct {
  double best[MAX_SETS][AW_TOUR_MAX_EXACT];
  guint8 before[MAX_SETS][AW_TOUR_MAX_EXACT];
  double cost[AW_TOUR_MAX_EXACT][AW_TOUR_MAX_EXACT];
} Table;

static double move_cost(const AwTourSettings *set, const AwStop *a, const AwStop *b)
{
  return set->cost ? set->cost(a, b, set->cost_data)
                   : aw_tour_distance(a, b, set->unit, set->unit > 0 ? 1 / set->unit : 0);
}

static double begin_cost(const AwStop *stops, guint i, const AwTourSettings *set)
{
  if (set->closed ? i != 0 : set->first >= 0 && (gint64)i != set->first)
    return INFINITY;
  return set->from ? move_cost(set, set->from, &stops[i]) : 0;
}

static double end_cost(const AwStop *stops, guint i, const AwTourSettings *set)
{
  if (!set->closed && set->last >= 0 && (gint64)i != set->last)
    return INFINITY;
  return set->closed ? move_cost(set, &stops[i], &stops[0]) : set->to ? move_cost(set, &stops[i], set->to) : 0;
}

static void extend_set(Table *t, guint n, guint set)
{
  for (guint j = 0; j < n; j++) {
    guint rest = set & ~(1u << j);
    if (rest == set || rest == 0)
      continue;
    t->best[set][j] = INFINITY;
    for (guint i = 0; i < n; i++) {
      double c = rest >> i & 1 ? t->best[rest][i] + t->cost[i][j] : INFINITY;
      if (c < t->best[set][j]) {
        t->best[set][j] = c;
        t->before[set][j] = (guint8)i;
      }
    }
  }
}

void aw_tour_exact(const AwStop *stops, guint n, const AwTourSettings *set, guint32 *order)
{
  g_return_if_fail(n >= 1 && n <= AW_TOUR_MAX_EXACT);
  g_autofree Table *t = g_new0(Table, 1);
  for (guint i = 0; i < n; i++) {
    for (guint j = 0; j < n; j++)
      t->cost[i][j] = move_cost(set, &stops[i], &stops[j]);
    t->best[1u << i][i] = begin_cost(stops, i, set);
  }
  for (guint s = 1; s < 1u << n; s++)
    extend_set(t, n, s);
  guint all = (1u << n) - 1, last = 0;
  double least = INFINITY;
  for (guint i = 0; i < n; i++) {
    double c = t->best[all][i] + end_cost(stops, i, set);
    if (c < least) {
      least = c;
      last = i;
    }
  }
  for (guint k = n; k-- > 0;) {
    order[k] = last;
    guint before = t->before[all][last];
    all &= ~(1u << last);
    last = before;
  }
}

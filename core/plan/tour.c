/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/tour.h"

#include "base/error.h"
#include "base/limits.h"
#include "plan/tour_search.h"

/* The stages in a row: nearest neighbour and 2-opt, which are reported; Or-opt from there and from greedy edges; the
 * deep search and its chain of kicks from the better of the two. A handful of stops is solved outright instead. */

#define MAX_BUDGET_S 1e6

void aw_tour_free(AwTour *tour)
{
  if (!tour)
    return;
  g_free(tour->order);
  g_free(tour);
}

static double move_cost(const AwTourSettings *set, const AwStop *a, const AwStop *b)
{
  return set->cost ? set->cost(a, b, set->cost_data)
                   : aw_tour_distance(a, b, set->unit, set->unit > 0 ? 1 / set->unit : 0);
}

double aw_tour_cost(const AwStop *stops, gsize n, const guint32 *order, const AwTourSettings *set)
{
  g_return_val_if_fail(stops && order && set && n >= 1, 0);
  double sum = 0;
  for (gsize i = 0; i + 1 < n; i++)
    sum += move_cost(set, &stops[order[i]], &stops[order[i + 1]]);
  if (set->closed)
    return n > 1 ? sum + move_cost(set, &stops[order[n - 1]], &stops[order[0]]) : sum;
  if (set->from)
    sum += move_cost(set, set->from, &stops[order[0]]);
  if (set->to)
    sum += move_cost(set, &stops[order[n - 1]], set->to);
  return sum;
}

static gboolean check_place(const AwStop *stop, const char *what, gsize number, GError **error)
{
  if (fabs(stop->x) <= AW_MAX_COORDINATE_UM && fabs(stop->y) <= AW_MAX_COORDINATE_UM)
    return TRUE;
  g_autofree char *name = number ? g_strdup_printf("%s %" G_GSIZE_FORMAT, what, number) : g_strdup(what);
  char x[G_ASCII_DTOSTR_BUF_SIZE], y[G_ASCII_DTOSTR_BUF_SIZE];
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s of the tour is at (%s, %s) um; the limit is +-%d um", name,
              g_ascii_dtostr(x, sizeof x, stop->x), g_ascii_dtostr(y, sizeof y, stop->y), (int)AW_MAX_COORDINATE_UM);
  return FALSE;
}

static gboolean check_end(const char *what, gint64 index, gsize n, GError **error)
{
  if (index >= -1 && index < (gint64)n)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "the %s stop has index %" G_GINT64_FORMAT ", but the tour has %" G_GSIZE_FORMAT " stops, from 0", what,
              index, n);
  return FALSE;
}

static gboolean check_ends(gsize n, const AwTourSettings *set, GError **error)
{
  if (!check_end("first", set->first, n, error) || !check_end("last", set->last, n, error))
    return FALSE;
  const char *clash = NULL;
  if (set->closed && (set->first >= 0 || set->last >= 0 || set->from || set->to))
    clash = "a closed tour has no ends to fix";
  else if (set->first >= 0 && set->from)
    clash = "a tour begins at a fixed stop or at a place outside the list, not at both";
  else if (set->last >= 0 && set->to)
    clash = "a tour ends at a fixed stop or at a place outside the list, not at both";
  else if (n > 1 && set->first >= 0 && set->first == set->last)
    clash = "a tour of several stops cannot begin and end at the same stop";
  if (clash)
    g_set_error_literal(error, AW_ERROR, AW_ERROR_STATE, clash);
  return !clash;
}

static gboolean check(const AwStop *stops, gsize n, const AwTourSettings *set, GError **error)
{
  if (n == 0) {
    g_set_error_literal(error, AW_ERROR, AW_ERROR_EMPTY, "there is no stop to order");
    return FALSE;
  }
  if (n > AW_MAX_NUCLEI) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "the tour has %" G_GSIZE_FORMAT " stops; the limit is %d", n,
                AW_MAX_NUCLEI);
    return FALSE;
  }
  for (gsize i = 0; i < n; i++)
    if (!check_place(&stops[i], "stop", i + 1, error))
      return FALSE;
  if ((set->from && !check_place(set->from, "the place before the first stop", 0, error)) ||
      (set->to && !check_place(set->to, "the place after the last stop", 0, error)))
    return FALSE;
  return check_ends(n, set, error);
}

/* The cost of the stops as given; a cost function that fails is found here, before any search. */
static gboolean measure_unsorted(const AwStop *stops, AwTour *tour, const AwTourSettings *set, GError **error)
{
  for (gsize i = 0; i < tour->n; i++)
    tour->order[i] = (guint32)i;
  tour->unsorted = aw_tour_cost(stops, tour->n, tour->order, set);
  if (isfinite(tour->unsorted) && tour->unsorted >= 0)
    return TRUE;
  g_set_error_literal(error, AW_ERROR, AW_ERROR_RANGE, "the cost of a move is not a number of at least 0");
  return FALSE;
}

/* Or-opt from the 2-opt tour and from greedy edges; *array becomes the shorter. */
static gboolean start_well(const AwTourProblem *p, AwTourArray **array, AwProgress *progress, GError **error)
{
  gboolean backwards;
  guint32 *order = aw_tour_start_greedy(p, progress, error);
  g_autoptr(AwTourArray) greedy = order ? aw_tour_array_new(order, p->n, error) : NULL;
  if (!greedy || !aw_tour_or_opt(p, *array, progress, error) || !aw_tour_or_opt(p, greedy, progress, error))
    return FALSE;
  if (aw_tour_problem_total(p, greedy->order, &backwards) >= aw_tour_problem_total(p, (*array)->order, &backwards))
    return TRUE;
  aw_tour_array_free(*array);
  *array = g_steal_pointer(&greedy);
  return TRUE;
}

/* Notes the tour's order and cost if it is better than any before; returns the best cost. */
static double keep_better(const AwTourProblem *p, const AwTourArray *array, AwTour *tour)
{
  gboolean backwards;
  double total = aw_tour_problem_total(p, array->order, &backwards);
  if (total < tour->final) {
    tour->final = total;
    aw_tour_problem_read(p, array->order, tour->order);
  }
  return tour->final;
}

static gboolean search(const AwTourProblem *p, AwTour *tour, AwTourArray **array, AwTourChainLimits *limits,
                       AwProgress *progress, GError **error)
{
  tour->nearest = keep_better(p, *array, tour);
  aw_progress_report(progress, "tour", 0.1);
  if (!aw_tour_two_opt(p, *array, progress, error))
    return FALSE;
  tour->two_opt = keep_better(p, *array, tour);
  aw_progress_report(progress, "tour", 0.2);
  if (p->n > AW_TOUR_MAX_EXACT &&
      (!start_well(p, array, progress, error) || !aw_tour_chain(p, *array, limits, progress, error)))
    return FALSE;
  tour->n_steps_used = limits->n_used;
  keep_better(p, *array, tour);
  return TRUE;
}

static gboolean find(const AwStop *stops, AwTour *tour, const AwTourSettings *set, AwTourChainLimits *limits,
                     AwProgress *progress, GError **error)
{
  gboolean backwards;
  g_autoptr(AwTourProblem) p = aw_tour_problem_new(stops, (guint32)tour->n, set, error);
  guint32 *start = p ? aw_tour_start_nearest(p, progress, error) : NULL;
  if (!start)
    return FALSE;
  p->least_gain = aw_tour_problem_total(p, start, &backwards) * (1e-9 / p->n + 1e-14);
  g_autoptr(AwTourArray) array = aw_tour_array_new(start, p->n, error);
  tour->final = INFINITY;
  return array && search(p, tour, &array, limits, progress, error);
}

AwTour *aw_tour_find(const AwStop *stops, gsize n, const AwTourSettings *set, AwProgress *progress, GError **error)
{
  g_return_val_if_fail((stops || n == 0) && set, NULL);
  if (!check(stops, n, set, error))
    return NULL;
  AwTourChainLimits limits = { .seed = set->seed, .n_steps = set->n_steps };
  if (set->n_steps < 0)
    limits.n_steps = aw_tour_default_steps(n);
  if (set->budget_s > 0)
    limits.until_us = g_get_monotonic_time() + (gint64)(1e6 * MIN(set->budget_s, MAX_BUDGET_S));
  limits.speed = set->budget_s > 0 ? 0 : set->speed_um_per_s;
  g_autoptr(AwTour) tour = g_new0(AwTour, 1);
  tour->n = n;
  tour->order = aw_try_alloc(n, sizeof *tour->order, "a tour", error);
  if (!tour->order || !measure_unsorted(stops, tour, set, error) || !find(stops, tour, set, &limits, progress, error))
    return NULL;
  if (n <= AW_TOUR_MAX_EXACT)
    aw_tour_exact(stops, (guint)n, set, tour->order);
  tour->final = aw_tour_cost(stops, n, tour->order, set);
  aw_progress_report(progress, "tour", 1);
  return g_steal_pointer(&tour);
}

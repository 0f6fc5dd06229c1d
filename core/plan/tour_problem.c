/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/tour_problem.h"

#include "base/limits.h"

/* Stops at one place share a node, since visiting them in a row costs least and their neighbour lists would name
 * nothing but each other. Fixed ends keep nodes of their own. Equal places are found by hashing. */

static guint64 place_hash(const AwStop *s)
{
  union {
    double d;
    guint64 bits;
  } x = { s->x + 0.0 }, y = { s->y + 0.0 }; /* + 0.0 makes one zero of two */
  guint64 h = (x.bits ^ (y.bits << 31 | y.bits >> 33)) * G_GUINT64_CONSTANT(0x9e3779b97f4a7c15);
  return h ^ h >> 29;
}

/* Lists one stop per place in `firsts` and chains the others to it; returns the number of places. */
static guint32 gather_places(AwTourProblem *p, const AwStop *stops, const AwTourSettings *set, guint32 *firsts,
                             guint32 *slots, gsize n_slots)
{
  guint32 n = 0;
  for (guint32 i = 0; i < p->n_stops; i++) {
    p->same[i] = AW_TOUR_NONE;
    gsize h = place_hash(&stops[i]) & (n_slots - 1);
    gboolean fixed = (gint64)i == set->first || (gint64)i == set->last;
    while (!fixed && slots[h] && (stops[slots[h] - 1].x != stops[i].x || stops[slots[h] - 1].y != stops[i].y))
      h = (h + 1) & (n_slots - 1);
    if (!fixed && slots[h]) {
      p->same[i] = p->same[slots[h] - 1];
      p->same[slots[h] - 1] = i;
      p->inside += p->cost ? p->cost(&stops[i], &stops[i], p->cost_data) : 0;
      continue;
    }
    firsts[n++] = i;
    if (!fixed)
      slots[h] = i + 1;
  }
  return n;
}

/* The points of the tree: one stop of each place, then the places outside the list. */
static gboolean plant(AwTourProblem *p, const AwStop *stops, const AwTourSettings *set, GError **error)
{
  gsize n_slots = 4;
  while (n_slots < 2 * (gsize)p->n_stops)
    n_slots *= 2;
  g_autofree guint32 *slots = aw_try_alloc(n_slots, sizeof *slots, "the places of a tour", error);
  g_autofree guint32 *firsts = aw_try_alloc(p->n_stops, sizeof *firsts, "the places of a tour", error);
  g_autofree AwStop *points = aw_try_alloc((gsize)p->n_stops + 2, sizeof *points, "the places of a tour", error);
  p->same = aw_try_alloc(p->n_stops, sizeof *p->same, "the places of a tour", error);
  if (!slots || !firsts || !points || !p->same)
    return FALSE;
  guint32 n_places = gather_places(p, stops, set, firsts, slots, n_slots), n = n_places;
  for (guint32 i = 0; i < n_places; i++)
    points[i] = stops[firsts[i]];
  if (set->from)
    points[n++] = *set->from;
  if (set->to)
    points[n++] = *set->to;
  if (!(p->tree = aw_tour_tree_new(points, n, error)))
    return FALSE;
  for (guint32 v = 0; v < n; v++)
    p->tree->id[v] = p->tree->id[v] < n_places ? firsts[p->tree->id[v]] : p->tree->id[v] - n_places + p->n_stops;
  return TRUE;
}

static void name_nodes(AwTourProblem *p, const AwStop *stops, const AwTourSettings *set)
{
  for (guint32 v = 0; v < p->n_points; v++) {
    guint32 id = p->tree->id[v];
    gboolean is_from = set->from && id == p->n_stops, is_to = id >= p->n_stops && !is_from;
    p->at[v] = p->tree->at[v];
    p->origin[v] = is_from ? set->from : is_to ? set->to : &stops[id];
    p->stop[v] = id < p->n_stops ? id : AW_TOUR_NONE;
    if (is_from || (id < p->n_stops && (gint64)id == set->first))
      p->head = v;
    if (is_to || (id < p->n_stops && (gint64)id == set->last))
      p->tail = v;
  }
  if (p->dummy != AW_TOUR_NONE)
    p->stop[p->dummy] = AW_TOUR_NONE;
}

AwTourProblem *aw_tour_problem_new(const AwStop *stops, guint32 n_stops, const AwTourSettings *set, GError **error)
{
  g_autoptr(AwTourProblem) p = g_new0(AwTourProblem, 1);
  p->n_stops = n_stops;
  p->cost = set->cost;
  p->cost_data = set->cost_data;
  p->asymmetric = set->cost && set->asymmetric;
  p->unit = set->unit;
  p->per_unit = set->unit > 0 ? 1 / set->unit : 0;
  if (!plant(p, stops, set, error))
    return NULL;
  p->n_points = p->tree->n;
  p->n = p->n_points + !set->closed;
  p->dummy = set->closed ? AW_TOUR_NONE : p->n_points;
  p->head = p->tail = AW_TOUR_NONE;
  if (!(p->at = aw_try_alloc(p->n, sizeof *p->at, "the nodes of a tour", error)) ||
      !(p->origin = aw_try_alloc(p->n, sizeof *p->origin, "the nodes of a tour", error)) ||
      !(p->stop = aw_try_alloc(p->n, sizeof *p->stop, "the nodes of a tour", error)))
    return NULL;
  name_nodes(p, stops, set);
  return aw_tour_problem_find_near(p, error) ? g_steal_pointer(&p) : NULL;
}

void aw_tour_problem_free(AwTourProblem *p)
{
  if (!p)
    return;
  aw_tour_tree_free(p->tree);
  g_free(p->at);
  g_free(p->origin);
  g_free(p->stop);
  g_free(p->same);
  g_free(p->near);
  g_free(p->near_cost);
  g_free(p);
}

double aw_tour_problem_called_cost(const AwTourProblem *p, guint32 a, guint32 b)
{
  double there = p->cost(p->origin[a], p->origin[b], p->cost_data);
  return p->asymmetric ? 0.5 * (there + p->cost(p->origin[b], p->origin[a], p->cost_data)) : there;
}

double aw_tour_problem_skew(const AwTourProblem *p, guint32 a, guint32 b)
{
  if (!p->asymmetric || a == p->dummy || b == p->dummy)
    return 0;
  return 0.5 * (p->cost(p->origin[a], p->origin[b], p->cost_data) - p->cost(p->origin[b], p->origin[a], p->cost_data));
}

/* TRUE when the order runs from the tail to the head, so that only the way back keeps the fixed ends. */
static gboolean runs_backwards(const AwTourProblem *p, const guint32 *order)
{
  for (guint32 i = 0; i < p->n && p->dummy != AW_TOUR_NONE; i++)
    if (order[i] == p->dummy) {
      guint32 next = order[i + 1 < p->n ? i + 1 : 0], before = order[i ? i - 1 : p->n - 1];
      return p->n > 2 && (p->head != AW_TOUR_NONE ? next != p->head : p->tail != AW_TOUR_NONE && before != p->tail);
    }
  return FALSE;
}

double aw_tour_problem_total(const AwTourProblem *p, const guint32 *order, gboolean *backwards)
{
  double even = 0, skew = 0;
  for (guint32 i = 0; i < p->n; i++) {
    guint32 a = order[i], b = order[i + 1 < p->n ? i + 1 : 0];
    if (a == p->dummy || b == p->dummy || a == b)
      continue;
    even += aw_tour_problem_cost(p, a, b);
    skew += aw_tour_problem_skew(p, a, b);
  }
  gboolean tied = p->head != AW_TOUR_NONE || p->tail != AW_TOUR_NONE;
  *backwards = tied ? runs_backwards(p, order) : skew > 0;
  return p->inside + even + (*backwards ? -skew : skew);
}

/* A free tour has two directions of equal cost, a closed one n beginnings: take those that the stops' numbers say. */
void aw_tour_problem_read(const AwTourProblem *p, const guint32 *order, guint32 *stops)
{
  gboolean backwards;
  aw_tour_problem_total(p, order, &backwards);
  guint32 begin = 0;
  while (p->dummy != AW_TOUR_NONE ? order[begin] != p->dummy : p->stop[order[begin]] != 0)
    begin++;
  guint32 n = 0;
  for (guint32 i = 0; i < p->n; i++) {
    guint32 v = order[backwards ? (begin + p->n - i) % p->n : (begin + i) % p->n];
    for (guint32 s = p->stop[v]; s != AW_TOUR_NONE; s = p->same[s])
      stops[n++] = s;
  }
  gboolean tied = p->head != AW_TOUR_NONE || p->tail != AW_TOUR_NONE;
  guint32 kept = p->dummy == AW_TOUR_NONE; /* a closed tour keeps its first stop */
  if (tied || p->asymmetric || n < 2 || stops[kept] < stops[n - 1])
    return;
  for (guint32 i = kept, j = n - 1; i < j; i++, j--) {
    guint32 t = stops[i];
    stops[i] = stops[j];
    stops[j] = t;
  }
}

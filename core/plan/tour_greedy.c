/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "base/limits.h"
#include "plan/tour_search.h"

/* Greedy edges (Bentley 1992): of all edges of the neighbour lists the cheapest first, each taken when both its nodes
 * still want one and it closes no ring. What is left are paths; rounds of the same over the ends of the paths, with
 * neighbour lists of their own, join them until one is left. */

#define ROUND_NEAR 6 /* neighbours of an end in a joining round */

typedef struct {
  guint32 a, b;
  float cost; /* enough to sort by */
} Edge;

typedef struct {
  const AwTourProblem *p;
  guint32 *link;  /* two per node; AW_TOUR_NONE where an edge is wanted */
  guint32 *other; /* by the end of a path: its other end */
  Edge *edges, *spare;
  gsize n_edges;
  guint32 n_paths;
} Greedy;

static gboolean is_end(const Greedy *g, guint32 v)
{
  return g->link[2 * (gsize)v + 1] == AW_TOUR_NONE;
}

static void attach(Greedy *g, guint32 v, guint32 w)
{
  guint32 *l = g->link + 2 * (gsize)v;
  l[l[0] != AW_TOUR_NONE] = w;
}

static void join(Greedy *g, guint32 a, guint32 b)
{
  guint32 a_end = g->other[a], b_end = g->other[b];
  attach(g, a, b);
  attach(g, b, a);
  g->other[a_end] = b_end;
  g->other[b_end] = a_end;
  g->n_paths--;
}

/* Sorts the edges by cost, ties in the given order: radix sort of the bits of floats that are at least 0. */
static void sort_edges(Greedy *g)
{
  for (guint shift = 0; shift < 32; shift += 11) {
    gsize count[2049] = { 0 };
    for (gsize i = 0; i < g->n_edges; i++) {
      guint32 bits;
      memcpy(&bits, &g->edges[i].cost, sizeof bits);
      count[(bits >> shift & 2047) + 1]++;
    }
    for (guint b = 1; b < 2048; b++)
      count[b] += count[b - 1];
    for (gsize i = 0; i < g->n_edges; i++) {
      guint32 bits;
      memcpy(&bits, &g->edges[i].cost, sizeof bits);
      g->spare[count[bits >> shift & 2047]++] = g->edges[i];
    }
    Edge *t = g->edges;
    g->edges = g->spare;
    g->spare = t;
  }
}

static void take_edges(Greedy *g)
{
  sort_edges(g);
  for (gsize i = 0; i < g->n_edges && g->n_paths > 1; i++) {
    guint32 a = g->edges[i].a, b = g->edges[i].b;
    if (is_end(g, a) && is_end(g, b) && g->other[a] != b)
      join(g, a, b);
  }
  g->n_edges = 0;
}

static void list_edges(Greedy *g)
{
  const AwTourProblem *p = g->p;
  guint width = MIN(p->n_near, ROUND_NEAR);
  for (guint32 v = 0; v < p->n_points; v++)
    for (guint i = 0; i < width; i++) {
      guint32 w = p->near[(gsize)v * p->n_near + i];
      g->edges[g->n_edges++] = (Edge){ v, w, (float)p->near_cost[(gsize)v * p->n_near + i] };
    }
}

/* One round over the ends of the paths: each lists the nearest ends of other paths. */
static gboolean join_round(Greedy *g, GError **error)
{
  const AwTourProblem *p = g->p;
  guint32 n = 0;
  g_autofree guint32 *ends = aw_try_alloc(2 * (gsize)g->n_paths, sizeof *ends, "a tour", error);
  g_autofree AwStop *at = aw_try_alloc(2 * (gsize)g->n_paths, sizeof *at, "a tour", error);
  g_autofree guint32 *slot_of = aw_try_alloc(p->n_points, sizeof *slot_of, "a tour", error);
  if (!ends || !at || !slot_of)
    return FALSE;
  for (guint32 v = 0; v < p->n_points; v++)
    if (is_end(g, v)) {
      at[n] = p->tree->at[v];
      ends[n++] = v;
    }
  g_autoptr(AwTourTree) tree = aw_tour_tree_new(at, n, error);
  if (!tree)
    return FALSE;
  for (guint32 s = 0; s < n; s++)
    slot_of[ends[tree->id[s]]] = s;
  for (guint32 s = 0; s < n; s++) {
    guint32 slots[ROUND_NEAR], v = ends[tree->id[s]];
    guint32 other = g->other[v] < p->n_points ? slot_of[g->other[v]] : s;
    guint found = aw_tour_tree_nearest(tree, s, other, ROUND_NEAR, slots);
    for (guint i = 0; i < found; i++) {
      guint32 w = ends[tree->id[slots[i]]];
      g->edges[g->n_edges++] = (Edge){ v, w, (float)aw_tour_problem_cost(p, v, w) };
    }
  }
  take_edges(g);
  return TRUE;
}

/* Walks along the one path from the dummy, or from node 0 of a closed tour. */
static guint32 *read_path(const Greedy *g, GError **error)
{
  const AwTourProblem *p = g->p;
  guint32 *order = aw_try_alloc(p->n, sizeof *order, "a tour", error);
  if (!order)
    return NULL;
  guint32 v = p->dummy != AW_TOUR_NONE ? p->dummy : 0, before = AW_TOUR_NONE;
  for (guint32 i = 0; i < p->n; i++) {
    order[i] = v;
    const guint32 *l = g->link + 2 * (gsize)v;
    guint32 next = l[0] == before ? l[1] : l[0];
    before = v;
    v = next;
  }
  return order;
}

/* The last path becomes a ring, through the dummy when that is not yet part of it. */
static void close_ring(Greedy *g)
{
  guint32 a = 0, dummy = g->p->dummy;
  while (!is_end(g, a) || a == dummy)
    a++;
  guint32 b = g->other[a];
  if (dummy != AW_TOUR_NONE && g->link[2 * (gsize)dummy] == AW_TOUR_NONE) {
    attach(g, a, dummy);
    attach(g, dummy, a);
    a = dummy;
  }
  attach(g, a, b);
  attach(g, b, a);
}

static gboolean grow(Greedy *g, AwProgress *progress, GError **error)
{
  const AwTourProblem *p = g->p;
  for (guint32 v = 0; v < p->n; v++) {
    g->link[2 * (gsize)v] = g->link[2 * (gsize)v + 1] = AW_TOUR_NONE;
    g->other[v] = v;
  }
  g->n_paths = p->n_points;
  if (p->head != AW_TOUR_NONE || p->tail != AW_TOUR_NONE)
    g->n_paths++; /* the dummy takes part as a node of its own */
  if (p->head != AW_TOUR_NONE)
    join(g, p->dummy, p->head);
  if (p->tail != AW_TOUR_NONE)
    join(g, p->dummy, p->tail);
  list_edges(g);
  take_edges(g);
  while (g->n_paths > 1)
    if (aw_progress_stopped(progress, error) || !join_round(g, error))
      return FALSE;
  close_ring(g);
  return TRUE;
}

guint32 *aw_tour_start_greedy(const AwTourProblem *p, AwProgress *progress, GError **error)
{
  Greedy g = { .p = p };
  gsize n = (gsize)p->n_points * ROUND_NEAR;
  guint32 *order = NULL;
  if ((g.link = aw_try_alloc(p->n, 2 * sizeof *g.link, "a tour", error)) &&
      (g.other = aw_try_alloc(p->n, sizeof *g.other, "a tour", error)) &&
      (g.edges = aw_try_alloc(n, sizeof *g.edges, "the edges of a tour", error)) &&
      (g.spare = aw_try_alloc(n, sizeof *g.spare, "the edges of a tour", error)) && grow(&g, progress, error))
    order = read_path(&g, error);
  g_free(g.link);
  g_free(g.other);
  g_free(g.edges);
  g_free(g.spare);
  return order;
}

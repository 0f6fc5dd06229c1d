/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_TOUR_ARRAY_H
#define AW_PLAN_TOUR_ARRAY_H

#include "plan/tour_problem.h"

#define AW_TOUR_MAX_CUTS 6

/**
 * AwTourArray: a closed tour of nodes as an array and its inverse, and the exchanges that change it (internal to the
 * tour engine).
 */
typedef struct {
  guint32 n;
  guint32 *order;    /* node at each position */
  guint32 *pos;      /* position of each node */
  guint32 *scratch;  /* n, for rewriting */
  guint32 max_write; /* exchanges that rewrite more positions are refused */
  GArray *journal;   /* guint32: old contents, then begin and count, of each rewriting; NULL keeps none */
} AwTourArray;

/* Takes `order`, a permutation of n nodes, over. */
AwTourArray *aw_tour_array_new(guint32 *order, guint32 n, GError **error);
void aw_tour_array_free(AwTourArray *array);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTourArray, aw_tour_array_free)

static inline guint32 aw_tour_array_next(const AwTourArray *a, guint32 v)
{
  guint32 i = a->pos[v] + 1;
  return a->order[i == a->n ? 0 : i];
}

static inline guint32 aw_tour_array_before(const AwTourArray *a, guint32 v)
{
  guint32 i = a->pos[v];
  return a->order[i ? i - 1 : a->n - 1];
}

/**
 * AwTourExchange: k edges taken away and k put in. Edge i joined the nodes t[2i] and t[2i+1], which were neighbours;
 * link[j] tells which end the end j is joined to afterwards.
 */
typedef struct {
  guint k;
  guint32 t[2 * AW_TOUR_MAX_CUTS];
  guint8 link[2 * AW_TOUR_MAX_CUTS];
} AwTourExchange;

/* The sequential exchange of Lin & Kernighan: t[1] to t[2], t[3] to t[4] ..., t[2k-1] to t[0]. */
void aw_tour_exchange_chain(AwTourExchange *x);

/**
 * Makes the exchange if it leaves one closed tour and is not refused for its length; FALSE changes nothing.
 */
gboolean aw_tour_array_exchange(AwTourArray *a, const AwTourExchange *x);

/* Takes back every exchange made since the journal was empty. */
void aw_tour_array_undo(AwTourArray *array);

#endif

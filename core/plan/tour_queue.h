/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_TOUR_QUEUE_H
#define AW_PLAN_TOUR_QUEUE_H

#include "base/limits.h"
#include "plan/tour_problem.h"

/**
 * AwTourQueue: the nodes a search has yet to look at, first come first served, each once (internal to the tour
 * engine). It does the work of don't-look bits: a node comes in when one of its edges changes.
 */
typedef struct {
  guint32 size, first, n;
  guint32 *ring; /* size nodes */
  guint8 *in;    /* 1 when the node waits */
} AwTourQueue;

static inline gboolean aw_tour_queue_init(AwTourQueue *q, guint32 size, GError **error)
{
  *q = (AwTourQueue){ .size = size };
  q->ring = aw_try_alloc(size, sizeof *q->ring, "the queue of a tour", error);
  q->in = q->ring ? aw_try_alloc(size, 1, "the queue of a tour", error) : NULL;
  return q->in != NULL;
}

static inline void aw_tour_queue_clear(AwTourQueue *q)
{
  g_free(q->ring);
  g_free(q->in);
  *q = (AwTourQueue){ 0 };
}

static inline void aw_tour_queue_push(AwTourQueue *q, guint32 v)
{
  if (q->in[v])
    return;
  q->in[v] = 1;
  guint64 at = (guint64)q->first + q->n++;
  q->ring[at >= q->size ? at - q->size : at] = v;
}

static inline guint32 aw_tour_queue_pop(AwTourQueue *q)
{
  guint32 v = q->ring[q->first];
  q->first = q->first + 1 == q->size ? 0 : q->first + 1;
  q->n--;
  q->in[v] = 0;
  return v;
}

#endif

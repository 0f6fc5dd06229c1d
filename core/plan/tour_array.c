/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/tour_array.h"

#include <string.h>

#include "base/limits.h"

/* An exchange cuts the tour into k pieces and joins them anew, some of them turned round. The longest piece stays
 * where it is; the others are written into the room between its ends. Pieces that keep both place and direction at
 * either side of that room are left alone, so that a local exchange costs a local write. */

#define MAX_WRITE 50000 /* longer ones save too little for their time (Johnson & McGeoch 1997) */

typedef struct {
  guint32 begin, count; /* positions, cyclic */
} Piece;

typedef struct {
  guint k;
  Piece pieces[AW_TOUR_MAX_CUTS];      /* piece i ends at cut i */
  guint8 joined[2 * AW_TOUR_MAX_CUTS]; /* end of a piece -> end of a piece; end 2i is the last of piece i, */
} Cuts;                                /* end 2i + 1 the first of piece i + 1 */

AwTourArray *aw_tour_array_new(guint32 *order, guint32 n, GError **error)
{
  g_autoptr(AwTourArray) a = g_new0(AwTourArray, 1);
  a->n = n;
  a->order = order;
  a->max_write = MIN(n, MAX_WRITE);
  if (!(a->pos = aw_try_alloc(n, sizeof *a->pos, "a tour", error)) ||
      !(a->scratch = aw_try_alloc(n, sizeof *a->scratch, "a tour", error)))
    return NULL;
  for (guint32 i = 0; i < n; i++)
    a->pos[order[i]] = i;
  return g_steal_pointer(&a);
}

void aw_tour_array_free(AwTourArray *a)
{
  if (!a)
    return;
  g_free(a->order);
  g_free(a->pos);
  g_free(a->scratch);
  if (a->journal)
    g_array_unref(a->journal);
  g_free(a);
}

void aw_tour_exchange_chain(AwTourExchange *x)
{
  guint n = 2 * x->k;
  for (guint j = 0; j < n; j++)
    x->link[j] = (guint8)(j % 2 ? (j + 1) % n : (j + n - 1) % n);
}

/* Sorts the cuts along the tour and translates the links from ends as the exchange numbers them. */
static void find_cuts(const AwTourArray *a, const AwTourExchange *x, Cuts *c)
{
  guint32 at[AW_TOUR_MAX_CUTS] = { 0 };
  guint8 edge[AW_TOUR_MAX_CUTS] = { 0 }, turned[AW_TOUR_MAX_CUTS] = { 0 }, end[2 * AW_TOUR_MAX_CUTS] = { 0 };
  c->k = x->k;
  for (guint i = 0; i < x->k; i++) {
    guint32 p = a->pos[x->t[2 * i]], q = a->pos[x->t[2 * i + 1]];
    guint8 back = q + 1 == p || (p == 0 && q + 1 == a->n && a->n > 2);
    guint j = i;
    for (; j > 0 && at[j - 1] > (back ? q : p); j--) {
      at[j] = at[j - 1];
      edge[j] = edge[j - 1];
      turned[j] = turned[j - 1];
    }
    at[j] = back ? q : p;
    edge[j] = (guint8)i;
    turned[j] = back;
  }
  for (guint j = 0; j < x->k; j++) {
    end[2 * edge[j] + turned[j]] = (guint8)(2 * j);
    end[2 * edge[j] + !turned[j]] = (guint8)(2 * j + 1);
    guint32 from = at[j ? j - 1 : x->k - 1];
    c->pieces[j].begin = from + 1 == a->n ? 0 : from + 1;
    c->pieces[j].count = at[j] > from ? at[j] - from : at[j] + a->n - from;
  }
  for (guint i = 0; i < 2 * x->k; i++)
    c->joined[end[i]] = end[x->link[i]];
}

/* Walks the joined pieces from the end of piece `base`; FALSE when the walk closes before it has seen them all. */
static gboolean walk(const Cuts *c, guint base, guint8 *piece, guint8 *turned)
{
  guint end = 2 * base, n = 0;
  for (;;) {
    guint to = c->joined[end];
    guint8 back = to % 2 == 0;
    guint i = back ? to / 2 : to / 2 + 1 == c->k ? 0 : to / 2 + 1;
    if (i == base)
      return n == c->k - 1 && !back;
    if (n == c->k - 1)
      return FALSE;
    piece[n] = (guint8)i;
    turned[n++] = back;
    end = back ? 2 * (i ? i - 1 : c->k - 1) + 1 : 2 * i;
  }
}

static guint32 *copy_piece(const AwTourArray *a, const Piece *piece, gboolean turned, guint32 *out)
{
  guint32 i = piece->begin, n = piece->count;
  if (!turned) {
    for (guint32 j = 0; j < n; j++) {
      out[j] = a->order[i];
      i = i + 1 == a->n ? 0 : i + 1;
    }
  } else {
    for (guint32 j = n; j-- > 0;) {
      out[j] = a->order[i];
      i = i + 1 == a->n ? 0 : i + 1;
    }
  }
  return out + n;
}

static void note(AwTourArray *a, guint32 begin, guint32 n)
{
  guint32 first = MIN(n, a->n - begin);
  g_array_append_vals(a->journal, a->order + begin, first);
  g_array_append_vals(a->journal, a->order, n - first);
  g_array_append_val(a->journal, begin);
  g_array_append_val(a->journal, n);
}

static void write_nodes(AwTourArray *a, guint32 begin, const guint32 *nodes, guint32 n)
{
  guint32 i = begin;
  for (guint32 j = 0; j < n; j++) {
    a->order[i] = nodes[j];
    a->pos[nodes[j]] = i;
    i = i + 1 == a->n ? 0 : i + 1;
  }
}

gboolean aw_tour_array_exchange(AwTourArray *a, const AwTourExchange *x)
{
  Cuts c;
  const guint k = x->k;
  guint8 piece[AW_TOUR_MAX_CUTS] = { 0 }, turned[AW_TOUR_MAX_CUTS] = { 0 };
  g_return_val_if_fail(k >= 2 && k <= AW_TOUR_MAX_CUTS, FALSE);
  find_cuts(a, x, &c);
  guint base = 0;
  for (guint i = 1; i < k; i++)
    if (c.pieces[i].count > c.pieces[base].count)
      base = i;
  if (!walk(&c, base, piece, turned))
    return FALSE;
  guint lo = 0, hi = k - 1;
  while (lo < hi && piece[lo] == (base + 1 + lo) % k && !turned[lo])
    lo++;
  while (hi > lo && piece[hi - 1] == (base + hi) % k && !turned[hi - 1])
    hi--;
  guint32 n_write = 0;
  for (guint i = lo; i < hi; i++)
    n_write += c.pieces[piece[i]].count;
  if (n_write > a->max_write)
    return FALSE;
  guint32 begin = c.pieces[(base + 1 + lo) % k].begin, *out = a->scratch;
  for (guint i = lo; i < hi; i++)
    out = copy_piece(a, &c.pieces[piece[i]], turned[i], out);
  if (a->journal)
    note(a, begin, n_write);
  write_nodes(a, begin, a->scratch, n_write);
  return TRUE;
}

void aw_tour_array_undo(AwTourArray *a)
{
  while (a->journal->len) {
    const guint32 *end = (const guint32 *)(gpointer)a->journal->data + a->journal->len;
    guint32 n = end[-1], begin = end[-2];
    write_nodes(a, begin, end - 2 - n, n);
    g_array_set_size(a->journal, a->journal->len - n - 2);
  }
}

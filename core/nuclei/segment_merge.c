/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <math.h>
#include <string.h>

#include "nuclei/segment_pieces.h"

static void add_run(AwPiece *p, GArray *corners, int y, int x0, int x1)
{
  AwRect *b = &p->box;
  *b = p->moments.n == 0 ? (AwRect){ x0, y, x1, y + 1 } : (AwRect){ MIN(b->x0, x0), b->y0, MAX(b->x1, x1), y + 1 };
  aw_moments_add_run(&p->moments, y, x0, x1);
  AwCorner ends[2] = { { x0, y }, { x1 - 1, y } };
  g_array_append_vals(corners, ends, x1 - x0 > 1 ? 2 : 1);
}

static void add_pixels(AwPiece *p, const AwCluster *c, gsize at, int n)
{
  float scale = (float)AW_SHADES / MAX(c->top, FLT_MIN);
  for (int i = 0; i < n; i++) {
    gsize j = at + (gsize)i;
    p->shades.count[MIN((int)(c->clear[j] * scale), AW_SHADES - 1)]++;
    p->distance_peak = MAX(p->distance_peak, c->distance[j]);
    p->blob_peak = MAX(p->blob_peak, c->blob[j]);
    p->land_peak = MAX(p->land_peak, c->land[j]);
  }
}

/* What follows from a piece's sums. */
static void settle(AwPiece *p, float top)
{
  p->convexity = aw_hull_convexity(p->hull, p->n_hull, p->moments.n);
  p->ellipse = aw_moments_ellipse(&p->moments);
  p->plateau = aw_shades_plateau(&p->shades, (double)top);
}

static void gather(AwPieces *p, const AwCluster *c, GArray **corners)
{
  for (int y = 0; y < c->height; y++) {
    const guint32 *row = c->label + (gsize)y * (gsize)c->width;
    for (int x = 0; x < c->width;) {
      int end = x + 1;
      while (end < c->width && row[end] == row[x])
        end++;
      if (row[x]) {
        add_run(&p->piece[row[x]], corners[row[x]], y, x, end);
        add_pixels(&p->piece[row[x]], c, (gsize)y * (gsize)c->width + (gsize)x, end - x);
      }
      x = end;
    }
  }
}

static AwLink *link_of(AwPieces *p, guint32 a, guint32 b, guint *last)
{
  if (a > b) {
    guint32 t = a;
    a = b;
    b = t;
  }
  for (guint k = 0; k < p->links->len; k++) {
    guint i = (*last + k) % p->links->len;
    AwLink *l = &g_array_index(p->links, AwLink, i);
    if (l->a == a && l->b == b) {
      *last = i;
      return l;
    }
  }
  AwLink fresh = { .a = a, .b = b, .blob_saddle = -FLT_MAX, .land_saddle = -FLT_MAX };
  *last = p->links->len;
  g_array_append_val(p->links, fresh);
  return &g_array_index(p->links, AwLink, *last);
}

static void cross(AwPieces *p, const AwCluster *c, gsize i, gsize j, double length, guint *last)
{
  guint32 a = c->label[i], b = c->label[j];
  if (!a || !b || a == b)
    return;
  AwLink *l = link_of(p, a, b, last);
  float low = MIN(c->clear[i], c->clear[j]);
  l->length += length;
  l->n++;
  l->sum += (double)low;
  l->clear_saddle = MAX(l->clear_saddle, low);
  l->distance_saddle = MAX(l->distance_saddle, MIN(c->distance[i], c->distance[j]));
  l->blob_saddle = MAX(l->blob_saddle, MIN(c->blob[i], c->blob[j]));
  l->land_saddle = MAX(l->land_saddle, MIN(c->land[i], c->land[j]));
}

static void find_links(AwPieces *p, const AwCluster *c)
{
  gsize w = (gsize)c->width;
  double straight = G_PI / 8, slanting = straight / sqrt(2);
  guint last = 0;
  for (int y = 0; y < c->height; y++)
    for (int x = 0; x < c->width; x++) {
      gsize i = (gsize)y * w + (gsize)x;
      if (!c->label[i])
        continue;
      gboolean right = x + 1 < c->width, below = y + 1 < c->height;
      if (right)
        cross(p, c, i, i + 1, straight, &last);
      if (below)
        cross(p, c, i, i + w, straight, &last);
      if (right && below)
        cross(p, c, i, i + w + 1, slanting, &last);
      if (x > 0 && below)
        cross(p, c, i, i + w - 1, slanting, &last);
    }
}

void aw_pieces_build(AwPieces *p, const AwCluster *c)
{
  *p = (AwPieces){ g_new0(AwPiece, c->n_labels + 1), c->n_labels, g_array_new(FALSE, FALSE, sizeof(AwLink)), c->top };
  g_autofree GArray **corners = g_new(GArray *, p->n + 1);
  for (guint32 k = 1; k <= p->n; k++) {
    p->piece[k].parent = k;
    p->piece[k].merge_odds = 8;
    p->piece[k].blob_peak = p->piece[k].land_peak = -FLT_MAX;
    corners[k] = g_array_new(FALSE, FALSE, sizeof(AwCorner));
  }
  gather(p, c, corners);
  for (guint32 k = 1; k <= p->n; k++) {
    AwPiece *q = &p->piece[k];
    gsize n = corners[k]->len;
    q->hull = (AwCorner *)(void *)g_array_free(corners[k], FALSE);
    q->n_hull = aw_hull(q->hull, n);
    settle(q, p->top);
  }
  if (p->n > 1)
    find_links(p, c);
}

void aw_pieces_clear(AwPieces *p)
{
  for (guint32 k = 1; k <= p->n; k++)
    g_free(p->piece[k].hull);
  g_free(p->piece);
  g_array_free(p->links, TRUE);
}

/* The union of two pieces as a piece of its own; the caller frees its hull. */
static AwPiece unite(const AwPiece *a, const AwPiece *b, float top)
{
  AwPiece u = { .box = { MIN(a->box.x0, b->box.x0), MIN(a->box.y0, b->box.y0), MAX(a->box.x1, b->box.x1),
                         MAX(a->box.y1, b->box.y1) },
                .moments = aw_moments_sum(&a->moments, &b->moments),
                .distance_peak = MAX(a->distance_peak, b->distance_peak),
                .blob_peak = MAX(a->blob_peak, b->blob_peak),
                .land_peak = MAX(a->land_peak, b->land_peak),
                .merge_odds = MIN(a->merge_odds, b->merge_odds),
                .home = a->moments.n >= b->moments.n ? a->home : b->home };
  u.hull = g_new(AwCorner, a->n_hull + b->n_hull);
  memcpy(u.hull, a->hull, a->n_hull * sizeof *u.hull);
  memcpy(u.hull + a->n_hull, b->hull, b->n_hull * sizeof *u.hull);
  u.n_hull = aw_hull(u.hull, a->n_hull + b->n_hull);
  for (int i = 0; i < AW_SHADES; i++)
    u.shades.count[i] = a->shades.count[i] + b->shades.count[i];
  settle(&u, top);
  return u;
}

void aw_pair_features(const AwPieces *p, const AwLink *link, double radius_px, double f[AW_N_PAIR_FEATURES])
{
  const AwPiece *a = &p->piece[link->a], *b = &p->piece[link->b];
  AwPiece u = unite(a, b, p->top);
  double na = a->moments.n, nb = b->moments.n, n = na + nb, disc = G_PI * radius_px * radius_px;
  double low = MAX(MIN(a->plateau, b->plateau), 1e-30), high = MAX(MAX(a->plateau, b->plateau), 1e-30);
  f[0] = u.convexity;
  f[1] = u.convexity - (na * a->convexity + nb * b->convexity) / n;
  f[2] = u.ellipse;
  f[3] = u.ellipse - (na * a->ellipse + nb * b->ellipse) / n;
  f[4] = (double)link->clear_saddle / low;
  f[5] = link->sum / link->n / low;
  f[6] = low / high;
  f[7] = log(n / disc);
  f[8] = log(MIN(na, nb) / disc);
  f[9] = (double)link->distance_saddle / MAX((double)MIN(a->distance_peak, b->distance_peak), 1);
  f[10] = link->length / sqrt(MIN(na, nb));
  f[11] = (double)(MIN(a->land_peak, b->land_peak) - link->land_saddle);
  f[12] = (double)(MIN(a->blob_peak, b->blob_peak) - link->blob_saddle);
  f[13] = log(aw_moments_elongation(&u.moments));
  g_free(u.hull);
}

static void judge(AwPieces *p, AwLink *l, const AwSegmentWork *w)
{
  double f[AW_N_PAIR_FEATURES];
  aw_pair_features(p, l, w->scale.radius_px, f);
  const AwSegmentProbe *probe = w->probe;
  guint32 ha = p->piece[l->a].home, hb = p->piece[l->b].home;
  if (probe && probe->pair && (ha || hb))
    probe->pair(f, ha == hb, MIN(p->piece[l->a].moments.n, p->piece[l->b].moments.n), probe->data);
  l->merge_odds = probe && probe->follow_truth
                      ? (ha == hb ? 1 : -1)
                      : aw_pair_merge_odds(f) + w->rules->merge_bias - 4 * w->settings->splitting;
}

static void add_link(AwLink *to, const AwLink *from)
{
  to->length += from->length;
  to->n += from->n;
  to->sum += from->sum;
  to->clear_saddle = MAX(to->clear_saddle, from->clear_saddle);
  to->distance_saddle = MAX(to->distance_saddle, from->distance_saddle);
  to->blob_saddle = MAX(to->blob_saddle, from->blob_saddle);
  to->land_saddle = MAX(to->land_saddle, from->land_saddle);
}

/* Piece b becomes part of a: its links move over, double ones are added up, touched ones judged again. */
static void merge(AwPieces *p, guint32 a, guint32 b, double odds, const AwSegmentWork *w)
{
  AwPiece u = unite(&p->piece[a], &p->piece[b], p->top);
  u.parent = a;
  u.merge_odds = MIN(u.merge_odds, odds);
  g_free(p->piece[a].hull);
  p->piece[a] = u;
  p->piece[b].parent = a;
  for (guint i = 0; i < p->links->len; i++) {
    AwLink *l = &g_array_index(p->links, AwLink, i);
    if (l->a == b)
      l->a = a;
    if (l->b == b)
      l->b = a;
    if (l->a > l->b) {
      guint32 t = l->a;
      l->a = l->b;
      l->b = t;
    }
  }
  for (guint i = 0; i < p->links->len; i++) {
    AwLink *l = &g_array_index(p->links, AwLink, i);
    if (l->a == l->b || (l->a != a && l->b != a))
      continue;
    for (guint j = i + 1; j < p->links->len; j++) {
      AwLink *m = &g_array_index(p->links, AwLink, j);
      if (m->a == l->a && m->b == l->b) {
        add_link(l, m);
        m->a = m->b = 0;
      }
    }
    judge(p, l, w);
  }
}

void aw_pieces_merge(AwPieces *p, const AwSegmentWork *w)
{
  for (guint i = 0; i < p->links->len; i++)
    judge(p, &g_array_index(p->links, AwLink, i), w);
  for (;;) {
    const AwLink *best = NULL;
    for (guint i = 0; i < p->links->len; i++) {
      const AwLink *l = &g_array_index(p->links, AwLink, i);
      if (l->a != l->b && l->merge_odds > 0 && (!best || l->merge_odds > best->merge_odds))
        best = l;
    }
    if (!best)
      return;
    merge(p, best->a, best->b, best->merge_odds, w);
  }
}

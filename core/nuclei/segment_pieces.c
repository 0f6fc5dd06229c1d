/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/segment_pieces.h"

#include <math.h>
#include <string.h>

#include "image/distance.h"
#include "image/smooth.h"
#include "image/watershed.h"

static void take_runs(AwCluster *c, const AwMaskRuns *runs, const gsize *first, gsize n)
{
  for (gsize i = 0; i < n; i++) {
    const AwMaskRun *r = &runs->run[first[i]];
    memset(c->mask + (gsize)(r->y - c->box.y0) * (gsize)c->width + (r->x0 - c->box.x0), 1, (gsize)(r->x1 - r->x0));
  }
}

static void take_values(AwCluster *c, const AwSegmentWork *w)
{
  for (int y = 0; y < c->height; y++) {
    gsize at = (gsize)y * (gsize)c->width;
    const float *g = aw_plane_row(w->smooth, c->box.y0 + y) + c->box.x0;
    aw_plane_expand_row(w->ground, w->factor, c->box.y0 + y, c->box.x0, c->width, c->clear + at);
    aw_plane_expand_row(w->blob, w->factor, c->box.y0 + y, c->box.x0, c->width, c->blob + at);
    for (int x = 0; x < c->width; x++) {
      c->clear[at + (gsize)x] = MAX(g[x] - c->clear[at + (gsize)x], 0);
      if (c->mask[at + (gsize)x])
        c->top = MAX(c->top, c->clear[at + (gsize)x]);
    }
  }
}

/* Landscape of the pieces: smoothed distance in radii, plus the blob filter. */
static gboolean take_landscape(AwCluster *c, const AwSegmentWork *w, GError **error)
{
  gsize n = (gsize)c->width * (gsize)c->height;
  double r = w->scale.radius_px;
  aw_distance_inside(c->mask, c->width, c->height, (float)(2 * r), c->distance);
  AwPlane d = { c->width, c->height, c->distance };
  g_autoptr(AwPlane) soft = aw_smooth_plane(&d, MAX(w->rules->piece_blur * r, 0.5), error);
  if (!soft)
    return FALSE;
  for (gsize i = 0; i < n; i++)
    c->land[i] = soft->value[i] / (float)r + (float)w->rules->blob_weight * CLAMP(c->blob[i], -1.f, 1.f);
  return TRUE;
}

static void free_cluster(AwCluster *c)
{
  g_free(c->mask);
  g_free(c->clear);
  g_free(c->label);
}

static gboolean fill_cluster(AwCluster *c, const AwSegmentWork *w, const AwMaskRuns *runs, const gsize *first,
                             gsize n_runs, AwRect box, GError **error)
{
  *c = (AwCluster){ .box = { MAX(box.x0 - 1, 0), MAX(box.y0 - 1, 0), MIN(box.x1 + 1, w->width_px),
                             MIN(box.y1 + 1, w->height_px) } };
  c->width = c->box.x1 - c->box.x0;
  c->height = c->box.y1 - c->box.y0;
  gsize n = (gsize)c->width * (gsize)c->height;
  c->mask = g_new0(guint8, n);
  c->clear = g_new(float, 4 * n);
  c->distance = c->clear + n;
  c->blob = c->clear + 2 * n;
  c->land = c->clear + 3 * n;
  c->label = g_new(guint32, n);
  take_runs(c, runs, first, n_runs);
  take_values(c, w);
  if (!take_landscape(c, w, error))
    return FALSE;
  c->n_labels = aw_watershed(c->land, c->mask, c->width, c->height, w->rules->piece_saddle, c->label);
  return TRUE;
}

/* True label of most pixels of every piece, for fitting. */
static void find_homes(AwPieces *p, const AwCluster *c, const AwSegmentWork *w)
{
  const guint32 *truth = w->probe->truth;
  for (guint32 k = 1; k <= p->n; k++) {
    g_autoptr(GHashTable) votes = g_hash_table_new(NULL, NULL);
    guint best = 0;
    for (int y = 0; y < c->height; y++)
      for (int x = 0; x < c->width; x++) {
        if (c->label[(gsize)y * (gsize)c->width + (gsize)x] != k)
          continue;
        guint32 t = truth[(gsize)(c->box.y0 + y) * (gsize)w->width_px + (gsize)(c->box.x0 + x)];
        guint n = GPOINTER_TO_UINT(g_hash_table_lookup(votes, GUINT_TO_POINTER(t))) + 1;
        g_hash_table_insert(votes, GUINT_TO_POINTER(t), GUINT_TO_POINTER(n));
        if (n > best) {
          best = n;
          p->piece[k].home = t;
        }
      }
  }
}

/* What the pieces say of the objects they became. */
static void note_links(AwSegmentWork *w, const AwPieces *p, const guint32 *number)
{
  for (guint i = 0; i < p->links->len; i++) {
    const AwLink *l = &g_array_index(p->links, AwLink, i);
    if (l->a == l->b)
      continue;
    double neck = (double)l->clear_saddle / MAX(MIN(p->piece[l->a].plateau, p->piece[l->b].plateau), 1e-30);
    guint32 ends[2] = { l->a, l->b };
    for (int e = 0; e < 2; e++) {
      AwObject *o = aw_segment_object(w, number[ends[e]]);
      o->neck = MAX(o->neck, neck);
      o->split_odds = MAX(o->split_odds, l->merge_odds);
    }
  }
}

static void write_objects(AwSegmentWork *w, const AwCluster *c, const AwPieces *p)
{
  g_autofree guint32 *number = g_new0(guint32, p->n + 1);
  int band = p->n > 1 ? (int)lround(w->rules->line_band * w->scale.radius_px) : 0;
  for (guint32 k = 1; k <= p->n; k++)
    if (p->piece[k].parent == k) {
      number[k] = ++w->labels->n_labels;
      AwRect b = p->piece[k].box;
      AwObject o = { .box = { MAX(b.x0 + c->box.x0 - band, 0), MAX(b.y0 + c->box.y0 - band, 0),
                              MIN(b.x1 + c->box.x0 + band, w->width_px), MIN(b.y1 + c->box.y0 + band, w->height_px) },
                     .n_px = p->piece[k].moments.n,
                     .split_odds = -8,
                     .merge_odds = p->piece[k].merge_odds };
      g_array_append_val(w->objects, o);
    }
  note_links(w, p, number);
  for (guint32 k = 1; k <= p->n; k++)
    number[k] = number[aw_pieces_root(p, k)];
  for (int y = 0; y < c->height; y++) {
    const guint32 *from = c->label + (gsize)y * (gsize)c->width;
    guint32 *to = w->labels->label + (gsize)(c->box.y0 + y) * (gsize)w->width_px + c->box.x0;
    for (int x = 0; x < c->width; x++)
      if (from[x])
        to[x] = number[from[x]];
  }
}

/* Draws the lines between the objects again where they are sharpest: pixels near a line are given out anew. */
static void redraw_lines(AwCluster *c, const AwPieces *p, const AwSegmentWork *w)
{
  int n_rounds = (int)lround(w->rules->line_band * w->scale.radius_px), cw = c->width, ch = c->height;
  gsize n = (gsize)cw * (gsize)ch;
  for (gsize i = 0; i < n; i++)
    if (c->label[i])
      c->label[i] = aw_pieces_root(p, c->label[i]);
  gboolean parted = FALSE;
  for (guint i = 0; i < p->links->len && !parted; i++)
    parted = g_array_index(p->links, AwLink, i).a != g_array_index(p->links, AwLink, i).b;
  if (n_rounds < 1 || !parted)
    return;
  g_autofree guint32 *old = g_new(guint32, n);
  g_autofree guint8 *near = g_new0(guint8, n);
  g_autofree guint8 *next = g_new0(guint8, n);
  for (int y = 0; y < ch; y++)
    for (int x = 0; x < cw; x++) {
      gsize i = (gsize)y * (gsize)cw + (gsize)x;
      guint32 k = c->label[i];
      near[i] = k && ((x > 0 && c->label[i - 1] && c->label[i - 1] != k) ||
                      (x + 1 < cw && c->label[i + 1] && c->label[i + 1] != k) ||
                      (y > 0 && c->label[i - (gsize)cw] && c->label[i - (gsize)cw] != k) ||
                      (y + 1 < ch && c->label[i + (gsize)cw] && c->label[i + (gsize)cw] != k));
    }
  for (int round = 1; round < n_rounds; round++) {
    memcpy(next, near, n);
    for (int y = 0; y < ch; y++)
      for (int x = 0; x < cw; x++) {
        gsize i = (gsize)y * (gsize)cw + (gsize)x;
        if (near[i] || !c->label[i])
          continue;
        next[i] = (x > 0 && near[i - 1]) || (x + 1 < cw && near[i + 1]) || (y > 0 && near[i - (gsize)cw]) ||
                  (y + 1 < ch && near[i + (gsize)cw]);
      }
    memcpy(near, next, n);
  }
  memcpy(old, c->label, n * sizeof *old);
  for (gsize i = 0; i < n; i++)
    if (near[i])
      c->label[i] = 0;
  for (gsize i = 0; i < n; i++)
    c->land[i] = c->distance[i] / (float)w->scale.radius_px * (float)w->rules->line_distance +
                 c->clear[i] / (float)w->scale.height;
  aw_flood_gaps(c->land, c->mask, cw, ch, c->label);
  for (gsize i = 0; i < n; i++)
    if (!c->label[i])
      c->label[i] = old[i];
}

static gboolean work_cluster(AwSegmentWork *w, const AwMaskRuns *runs, const gsize *first, gsize n_runs, AwRect box,
                             GError **error)
{
  AwCluster c;
  gboolean ok = fill_cluster(&c, w, runs, first, n_runs, box, error);
  if (ok) {
    AwPieces p;
    aw_pieces_build(&p, &c);
    if (w->probe && w->probe->truth)
      find_homes(&p, &c, w);
    aw_pieces_merge(&p, w);
    redraw_lines(&c, &p, w);
    write_objects(w, &c, &p);
    aw_pieces_clear(&p);
  }
  free_cluster(&c);
  return ok;
}

/* A component so close to an ellipse of ordinary size that nothing in it can be parted. */
static gboolean is_plain(const AwSegmentWork *w, const AwMaskRuns *runs, const gsize *first, gsize n_runs, double n_px)
{
  double r = w->scale.radius_px;
  if (n_px > w->rules->plain_area * G_PI * r * r)
    return FALSE;
  AwMoments m = { 0 };
  for (gsize i = 0; i < n_runs; i++) {
    const AwMaskRun *run = &runs->run[first[i]];
    aw_moments_add_run(&m, run->y, run->x0, run->x1);
  }
  return aw_moments_ellipse(&m) >= w->rules->plain_ellipse;
}

static void write_plain(AwSegmentWork *w, const AwMaskRuns *runs, const gsize *first, gsize n_runs)
{
  const AwMaskPart *part = &runs->part[runs->run[first[0]].part];
  AwObject o = { .box = part->box, .n_px = (double)part->n_px, .split_odds = -8, .merge_odds = 8 };
  guint32 k = ++w->labels->n_labels;
  g_array_append_val(w->objects, o);
  for (gsize i = 0; i < n_runs; i++) {
    const AwMaskRun *run = &runs->run[first[i]];
    guint32 *row = w->labels->label + (gsize)run->y * (gsize)w->width_px;
    for (int x = run->x0; x < run->x1; x++)
      row[x] = k;
  }
}

gboolean aw_segment_pieces(AwSegmentWork *w, GError **error)
{
  g_autoptr(AwMaskRuns) runs = aw_mask_runs(w->mask, w->width_px, w->height_px, 1, TRUE);
  double r = w->scale.radius_px, least = w->rules->smallest_area * G_PI * r * r;
  g_autofree gsize *start = g_new0(gsize, (gsize)runs->n_parts + 2);
  g_autofree gsize *order = g_new(gsize, runs->n_runs + 1);
  for (gsize i = 0; i < runs->n_runs; i++)
    start[runs->run[i].part + 2]++;
  for (guint32 k = 2; k < runs->n_parts + 1; k++)
    start[k] += start[k - 1];
  for (gsize i = 0; i < runs->n_runs; i++)
    order[start[runs->run[i].part + 1]++] = i;
  for (guint32 k = 0; k < runs->n_parts; k++) {
    const AwMaskPart *part = &runs->part[k];
    if ((double)part->n_px < least)
      continue;
    if (is_plain(w, runs, order + start[k], start[k + 1] - start[k], (double)part->n_px)) {
      write_plain(w, runs, order + start[k], start[k + 1] - start[k]);
      continue;
    }
    if (!work_cluster(w, runs, order + start[k], start[k + 1] - start[k], part->box, error))
      return FALSE;
  }
  return TRUE;
}

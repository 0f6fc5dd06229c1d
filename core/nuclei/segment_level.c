/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <math.h>
#include <string.h>

#include "base/limits.h"
#include "image/rank.h"
#include "nuclei/segment_spread.h"

static gsize n_coarse(const AwSegmentWork *w)
{
  return (gsize)w->coarse->width_px * (gsize)w->coarse->height_px;
}

/* The label at every coarse pixel: that of the middle full-grid pixel. */
static void reduce_labels(const AwSegmentWork *w, guint32 *out)
{
  int cw = w->coarse->width_px, half = w->factor / 2;
  for (int j = 0; j < w->coarse->height_px; j++) {
    int y = MIN(j * w->factor + half, w->height_px - 1);
    const guint32 *row = w->labels->label + (gsize)y * (gsize)w->width_px;
    for (int i = 0; i < cw; i++)
      out[(gsize)j * (gsize)cw + (gsize)i] = row[MIN(i * w->factor + half, w->width_px - 1)];
  }
}

/*
 * Labels spread over the background one pixel per round, by turns to four and to eight neighbours (an octagon); where
 * two meet, the one that came first stays, the lower brightness decides nothing. `ring` collects what was reached.
 */
static void spread(guint32 *label, int width, int height, int n_rounds, GArray *reached, GArray *rounds)
{
  gsize from = 0;
  for (int round = 0; round < n_rounds; round++) {
    gsize to = reached->len;
    g_array_append_val(rounds, to);
    for (gsize k = from; k < to; k++) {
      AwSpot s = g_array_index(reached, AwSpot, k);
      int x = (int)(s.at % (guint32)width), y = (int)(s.at / (guint32)width);
      for (int dy = -1; dy <= 1; dy++)
        for (int dx = -1; dx <= 1; dx++) {
          int i = x + dx, j = y + dy;
          if ((round % 2 == 0 && dx && dy) || i < 0 || j < 0 || i >= width || j >= height)
            continue;
          gsize at = (gsize)j * (gsize)width + (gsize)i;
          if (label[at])
            continue;
          label[at] = s.label;
          AwSpot n = { (guint32)at, s.label };
          g_array_append_val(reached, n);
        }
    }
    from = to;
  }
  gsize end = reached->len;
  g_array_append_val(rounds, end);
}

/* Values grouped by label: start[k] ... start[k + 1] - 1 in `value` belong to label k. */
static void group(const AwSpot *spot, gsize n, const AwPlane *plane, guint32 n_labels, gsize *start, float *value)
{
  memset(start, 0, ((gsize)n_labels + 2) * sizeof *start);
  for (gsize i = 0; i < n; i++)
    start[spot[i].label + 1]++;
  for (guint32 k = 1; k <= n_labels + 1; k++)
    start[k] += start[k - 1];
  g_autofree gsize *next = g_memdup2(start, ((gsize)n_labels + 2) * sizeof *start);
  for (gsize i = 0; i < n; i++)
    value[next[spot[i].label]++] = plane->value[spot[i].at];
}

static void ring_backgrounds(const AwSegmentWork *w, guint32 *coarse, AwObject *object)
{
  int cw = w->coarse->width_px, ch = w->coarse->height_px;
  double r = w->scale.radius_px / w->factor;
  int first = MAX((int)lround(w->rules->ring_from * r), 1), last = MAX((int)lround(w->rules->ring_to * r), first + 1);
  g_autoptr(GArray) reached = g_array_new(FALSE, FALSE, sizeof(AwSpot));
  g_autoptr(GArray) rounds = g_array_new(FALSE, FALSE, sizeof(gsize));
  aw_label_edges(coarse, cw, ch, reached);
  spread(coarse, cw, ch, last, reached, rounds);
  gsize from = g_array_index(rounds, gsize, first), n = reached->len - from;
  guint32 n_labels = w->labels->n_labels;
  g_autofree gsize *start = g_new(gsize, (gsize)n_labels + 2);
  g_autofree float *value = g_new(float, n + 1);
  group(&g_array_index(reached, AwSpot, from), n, w->coarse, n_labels, start, value);
  for (guint32 k = 1; k <= n_labels; k++) {
    gsize count = start[k + 1] - start[k];
    object[k].n_ring = (double)count * w->factor * w->factor;
    object[k].background = NAN;
    if (count >= 8) {
      object[k].ring_spread =
          (double)(aw_quantile(value + start[k], count, 0.9) - aw_quantile(value + start[k], count, 0.1));
      object[k].background = (double)aw_quantile(value + start[k], count, w->rules->ring_quantile);
    }
  }
}

/* Plateaus over the ring background; where there was no ring, over the lowest ground under the label. */
static void plateaus(const AwSegmentWork *w, const guint32 *coarse, AwObject *object)
{
  guint32 n = w->labels->n_labels;
  g_autofree AwShades *shades = g_new0(AwShades, (gsize)n + 1);
  g_autofree float *top = g_new0(float, (gsize)n + 1);
  g_autofree float *low = g_new(float, (gsize)n + 1);
  for (guint32 k = 0; k <= n; k++)
    low[k] = FLT_MAX;
  for (gsize i = 0; i < n_coarse(w); i++)
    low[coarse[i]] = MIN(low[coarse[i]], w->ground->value[i]);
  for (guint32 k = 1; k <= n; k++)
    if (!isfinite(object[k].background))
      object[k].background = (double)low[k];
  for (gsize i = 0; i < n_coarse(w); i++)
    top[coarse[i]] = MAX(top[coarse[i]], w->coarse->value[i] - (float)object[coarse[i]].background);
  for (gsize i = 0; i < n_coarse(w); i++) {
    guint32 k = coarse[i];
    float v = k && top[k] > 0 ? (w->coarse->value[i] - (float)object[k].background) / top[k] : -1;
    if (v >= 0)
      shades[k].count[MIN((int)(v * AW_SHADES), AW_SHADES - 1)]++;
  }
  for (guint32 k = 1; k <= n; k++) {
    object[k].plateau = object[k].background + aw_shades_plateau(&shades[k], (double)top[k]);
  }
}

double aw_segment_slope(const AwPlane *p, gsize at)
{
  gsize width = (gsize)p->width_px, x = at % width, y = at / width;
  gsize left = x > 0 ? at - 1 : at, right = x + 1 < width ? at + 1 : at, up = y > 0 ? at - width : at,
        down = y + 1 < (gsize)p->height_px ? at + width : at;
  double dx = (double)(p->value[right] - p->value[left]), dy = (double)(p->value[down] - p->value[up]);
  return sqrt(dx * dx + dy * dy) / 2;
}

void aw_segment_edges(const AwSegmentWork *w)
{
  GArray *edge = w->edge;
  AwObject *object = aw_segment_object(w, 0);
  for (guint32 k = 0; k <= w->labels->n_labels; k++)
    object[k].n_edge = object[k].n_touching = object[k].slope = object[k].slope_square = 0;
  g_array_set_size(edge, 0);
  aw_label_edges(w->labels->label, w->width_px, w->height_px, edge);
  for (guint i = 0; i < edge->len; i++) {
    AwSpot s = g_array_index(edge, AwSpot, i);
    AwObject *o = &object[s.label];
    guint32 around[4];
    aw_labels_around(w->labels->label, w->width_px, w->height_px, s.at, around);
    if (around[0] && around[1] && around[2] && around[3]) {
      o->n_touching++;
      continue;
    }
    double slope = aw_segment_slope(w->smooth, s.at);
    o->n_edge++;
    o->slope += slope;
    o->slope_square += slope * slope;
  }
}

double aw_object_edge_width(const AwSegmentWork *w, const AwObject *o)
{
  double width = o->n_edge > 0 && o->slope > 0 ? (o->plateau - o->background) * o->n_edge / o->slope : 0;
  return sqrt(MAX(width * width - 6.25, 0.25)) / w->scale.radius_px;
}

static void outline_features(const AwSegmentWork *w, const AwObject *o, double *f)
{
  double height = MAX(o->plateau - o->background, 1e-30), r = w->scale.radius_px, radius = sqrt(o->n_px / G_PI);
  double outer = radius + w->rules->ring_to * r, inner = radius + w->rules->ring_from * r;
  f[0] = log(height / w->scale.height);
  f[1] = log(aw_object_edge_width(w, o));
  f[2] = o->n_ring / (G_PI * (outer * outer - inner * inner));
  f[3] = o->ring_spread / height;
}

static void choose_levels(const AwSegmentWork *w, AwObject *object)
{
  guint32 n = w->labels->n_labels;
  for (guint32 k = 1; k <= n; k++) {
    double f[AW_N_OUTLINE_FEATURES];
    outline_features(w, &object[k], f);
    if (w->probe && w->probe->outline)
      w->probe->outline(w, f, k, object[k].background, object[k].plateau, w->probe->data);
    double level = aw_outline_level(f) + w->rules->outline_shift;
    object[k].cut = object[k].background + level * (object[k].plateau - object[k].background);
  }
}

gboolean aw_segment_levels(AwSegmentWork *w, GError **error)
{
  g_autofree guint32 *inner = aw_try_alloc(2 * n_coarse(w), sizeof *inner, "a label image", error);
  if (!inner)
    return FALSE;
  AwObject *object = aw_segment_object(w, 0);
  guint32 *coarse = inner + n_coarse(w);
  reduce_labels(w, inner);
  memcpy(coarse, inner, n_coarse(w) * sizeof *inner);
  ring_backgrounds(w, coarse, object);
  plateaus(w, inner, object);
  aw_segment_edges(w);
  choose_levels(w, object);
  return TRUE;
}

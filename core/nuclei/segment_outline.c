/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <math.h>
#include <string.h>

#include "base/limits.h"
#include "image/rank.h"
#include "nuclei/segment_work.h"

/* What a label is measured by before its final outline. */
typedef struct {
  AwRect box;
  double background, plateau, cut;
} Object;

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

typedef struct {
  guint32 at, label;
} Spot;

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
      Spot s = g_array_index(reached, Spot, k);
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
          Spot n = { (guint32)at, s.label };
          g_array_append_val(reached, n);
        }
    }
    from = to;
  }
  gsize end = reached->len;
  g_array_append_val(rounds, end);
}

static void start_spread(const guint32 *label, int width, int height, GArray *reached)
{
  for (int y = 0; y < height; y++)
    for (int x = 0; x < width; x++) {
      gsize i = (gsize)y * (gsize)width + (gsize)x;
      if (!label[i])
        continue;
      gboolean edge = (x > 0 && !label[i - 1]) || (x + 1 < width && !label[i + 1]) ||
                      (y > 0 && !label[i - (gsize)width]) || (y + 1 < height && !label[i + (gsize)width]);
      if (edge) {
        Spot s = { (guint32)i, label[i] };
        g_array_append_val(reached, s);
      }
    }
}

/* Values grouped by label: start[k] ... start[k + 1] - 1 in `value` belong to label k. */
static void group(const Spot *spot, gsize n, const AwPlane *plane, guint32 n_labels, gsize *start, float *value)
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

static void ring_backgrounds(const AwSegmentWork *w, guint32 *coarse, Object *object)
{
  int cw = w->coarse->width_px, ch = w->coarse->height_px;
  double r = w->scale.radius_px / w->factor;
  int first = MAX((int)lround(w->rules->ring_from * r), 1), last = MAX((int)lround(w->rules->ring_to * r), first + 1);
  g_autoptr(GArray) reached = g_array_new(FALSE, FALSE, sizeof(Spot));
  g_autoptr(GArray) rounds = g_array_new(FALSE, FALSE, sizeof(gsize));
  start_spread(coarse, cw, ch, reached);
  spread(coarse, cw, ch, last, reached, rounds);
  gsize from = g_array_index(rounds, gsize, first), n = reached->len - from;
  guint32 n_labels = w->labels->n_labels;
  g_autofree gsize *start = g_new(gsize, (gsize)n_labels + 2);
  g_autofree float *value = g_new(float, n + 1);
  group(&g_array_index(reached, Spot, from), n, w->coarse, n_labels, start, value);
  for (guint32 k = 1; k <= n_labels; k++) {
    gsize count = start[k + 1] - start[k];
    object[k].background = count >= 8 ? (double)aw_quantile(value + start[k], count, w->rules->ring_quantile) : NAN;
  }
}

/* Plateaus over the ring background; where there was no ring, over the lowest ground under the label. */
static void plateaus(const AwSegmentWork *w, const guint32 *coarse, Object *object)
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
    object[k].cut = object[k].background + w->rules->outline_level * (object[k].plateau - object[k].background);
  }
}

/* Labels grow over brighter ground than their own cut, one pixel a round. */
static void grow(AwSegmentWork *w, const Object *object)
{
  int width = w->width_px, height = w->height_px, n_rounds = (int)lround(0.35 * w->scale.radius_px);
  guint32 *label = w->labels->label;
  g_autoptr(GArray) reached = g_array_new(FALSE, FALSE, sizeof(Spot));
  start_spread(label, width, height, reached);
  gsize from = 0;
  for (int round = 0; round < n_rounds; round++) {
    gsize to = reached->len;
    for (gsize k = from; k < to; k++) {
      Spot s = g_array_index(reached, Spot, k);
      int x = (int)(s.at % (guint32)width), y = (int)(s.at / (guint32)width);
      const int dx[4] = { -1, 1, 0, 0 }, dy[4] = { 0, 0, -1, 1 };
      for (int d = 0; d < 4; d++) {
        int i = x + dx[d], j = y + dy[d];
        if (i < 0 || j < 0 || i >= width || j >= height)
          continue;
        gsize at = (gsize)j * (gsize)width + (gsize)i;
        if (label[at] || (double)w->smooth->value[at] <= object[s.label].cut)
          continue;
        label[at] = s.label;
        Spot n = { (guint32)at, s.label };
        g_array_append_val(reached, n);
      }
    }
    from = to;
  }
}

static void find_boxes(const AwSegmentWork *w, Object *object)
{
  for (guint32 k = 0; k <= w->labels->n_labels; k++)
    object[k].box = (AwRect){ G_MAXINT, G_MAXINT, 0, 0 };
  for (int y = 0; y < w->height_px; y++) {
    const guint32 *row = w->labels->label + (gsize)y * (gsize)w->width_px;
    for (int x = 0; x < w->width_px; x++)
      if (row[x]) {
        AwRect *b = &object[row[x]].box;
        *b = (AwRect){ MIN(b->x0, x), MIN(b->y0, y), MAX(b->x1, x + 1), MAX(b->y1, y + 1) };
      }
  }
}

/* One label: what is above its cut, opened, its largest part, holes filled. Returns the pixels left. */
static gint64 trim(AwSegmentWork *w, guint32 k, const Object *o, GByteArray *buffer)
{
  AwRect b = { MAX(o->box.x0 - 1, 0), MAX(o->box.y0 - 1, 0), MIN(o->box.x1 + 1, w->width_px),
               MIN(o->box.y1 + 1, w->height_px) };
  int bw = b.x1 - b.x0, bh = b.y1 - b.y0;
  gsize n = (gsize)bw * (gsize)bh;
  g_byte_array_set_size(buffer, (guint)(2 * n));
  guint8 *mask = buffer->data;
  for (int y = 0; y < bh; y++) {
    gsize at = (gsize)(b.y0 + y) * (gsize)w->width_px + (gsize)b.x0;
    for (int x = 0; x < bw; x++)
      mask[(gsize)y * (gsize)bw + (gsize)x] =
          w->labels->label[at + (gsize)x] == k && (double)w->smooth->value[at + (gsize)x] > o->cut;
  }
  aw_mask_fill_holes(mask, bw, bh, (gint64)n);
  aw_mask_open(mask, bw, bh, mask + n);
  gint64 left = aw_mask_keep_largest(mask, bw, bh);
  double r = w->scale.radius_px;
  gboolean keep = (double)left >= MAX(15, w->rules->smallest_area * G_PI * r * r);
  for (int y = 0; y < bh; y++) {
    guint32 *row = w->labels->label + (gsize)(b.y0 + y) * (gsize)w->width_px + b.x0;
    for (int x = 0; x < bw; x++) {
      gboolean in = keep && mask[(gsize)y * (gsize)bw + (gsize)x];
      if (row[x] == k || (in && row[x] == 0))
        row[x] = in ? k : 0;
    }
  }
  return keep ? left : 0;
}

static void number_again(AwSegmentWork *w)
{
  g_autofree guint32 *number = g_new0(guint32, (gsize)w->labels->n_labels + 1);
  gsize n_px = (gsize)w->width_px * (gsize)w->height_px;
  guint32 n = 0;
  GArray *neck = g_array_new(FALSE, TRUE, sizeof(double));
  g_array_set_size(neck, 1);
  for (gsize i = 0; i < n_px; i++) {
    guint32 k = w->labels->label[i];
    if (!k)
      continue;
    if (!number[k]) {
      number[k] = ++n;
      g_array_append_val(neck, g_array_index(w->neck, double, k));
    }
    w->labels->label[i] = number[k];
  }
  w->labels->n_labels = n;
  g_array_free(w->neck, TRUE);
  w->neck = neck;
}

gboolean aw_segment_outlines(AwSegmentWork *w, GError **error)
{
  g_autofree guint32 *coarse = aw_try_alloc(n_coarse(w), sizeof *coarse, "a label image", error);
  g_autofree Object *object = g_new0(Object, (gsize)w->labels->n_labels + 1);
  if (!coarse)
    return FALSE;
  reduce_labels(w, coarse);
  g_autofree guint32 *inner = g_memdup2(coarse, n_coarse(w) * sizeof *coarse);
  ring_backgrounds(w, coarse, object);
  plateaus(w, inner, object);
  grow(w, object);
  find_boxes(w, object);
  g_autoptr(GByteArray) buffer = g_byte_array_new();
  for (guint32 k = 1; k <= w->labels->n_labels; k++)
    if (object[k].box.x1 > 0)
      trim(w, k, &object[k], buffer);
  number_again(w);
  return TRUE;
}

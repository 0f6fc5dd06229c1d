/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <math.h>
#include <string.h>

#include "base/limits.h"
#include "image/rank.h"
#include "nuclei/segment_spread.h"

void aw_spread_start(const guint32 *label, int width, int height, GArray *edge)
{
  for (int y = 0; y < height; y++)
    for (int x = 0; x < width; x++) {
      gsize i = (gsize)y * (gsize)width + (gsize)x;
      if (!label[i])
        continue;
      gboolean free_edge = (x > 0 && !label[i - 1]) || (x + 1 < width && !label[i + 1]) ||
                           (y > 0 && !label[i - (gsize)width]) || (y + 1 < height && !label[i + (gsize)width]);
      if (free_edge) {
        AwSpot s = { (guint32)i, label[i] };
        g_array_append_val(edge, s);
      }
    }
}

/* Labels grow over brighter ground than their own cut, one pixel a round. */
static void grow(AwSegmentWork *w, const AwObject *object)
{
  int width = w->width_px, height = w->height_px, n_rounds = (int)lround(0.35 * w->scale.radius_px);
  guint32 *label = w->labels->label;
  g_autoptr(GArray) reached = g_array_new(FALSE, FALSE, sizeof(AwSpot));
  aw_spread_start(label, width, height, reached);
  gsize from = 0;
  for (int round = 0; round < n_rounds; round++) {
    gsize to = reached->len;
    for (gsize k = from; k < to; k++) {
      AwSpot s = g_array_index(reached, AwSpot, k);
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
        AwSpot n = { (guint32)at, s.label };
        g_array_append_val(reached, n);
      }
    }
    from = to;
  }
}

static void find_boxes(const AwSegmentWork *w, AwObject *object)
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

static void take_mask(const AwSegmentWork *w, guint32 k, AwRect b, double cut, guint8 *mask)
{
  for (int y = b.y0; y < b.y1; y++) {
    const guint32 *label = w->labels->label + (gsize)y * (gsize)w->width_px;
    const float *value = aw_plane_row(w->smooth, y);
    for (int x = b.x0; x < b.x1; x++)
      *mask++ = label[x] == k && (double)value[x] > cut;
  }
}

static void give_mask(AwSegmentWork *w, guint32 k, AwRect b, const guint8 *mask)
{
  for (int y = b.y0; y < b.y1; y++) {
    guint32 *label = w->labels->label + (gsize)y * (gsize)w->width_px;
    for (int x = b.x0; x < b.x1; x++, mask++)
      if (label[x] == k || (*mask && label[x] == 0))
        label[x] = *mask ? k : 0;
  }
}

static void measure_shape(AwObject *o, const guint8 *mask, int width, int height)
{
  g_autoptr(AwMaskRuns) runs = aw_mask_runs(mask, width, height, 1, TRUE);
  g_autofree AwCorner *corner = g_new(AwCorner, 2 * runs->n_runs + 1);
  gsize n = 0;
  o->shape = (AwMoments){ 0 };
  for (gsize i = 0; i < runs->n_runs; i++) {
    const AwMaskRun *r = &runs->run[i];
    aw_moments_add_run(&o->shape, r->y, r->x0, r->x1);
    corner[n++] = (AwCorner){ r->x0, r->y };
    corner[n++] = (AwCorner){ r->x1 - 1, r->y };
  }
  o->convexity = n ? aw_hull_convexity(corner, aw_hull(corner, n), o->shape.n) : 0;
}

/* One label: what is above its cut, holes filled, opened, its largest part; nothing when that is too small. */
static void trim(AwSegmentWork *w, guint32 k, GByteArray *buffer)
{
  AwObject *o = aw_segment_object(w, k);
  AwRect b = { MAX(o->box.x0 - 1, 0), MAX(o->box.y0 - 1, 0), MIN(o->box.x1 + 1, w->width_px),
               MIN(o->box.y1 + 1, w->height_px) };
  int width = b.x1 - b.x0, height = b.y1 - b.y0;
  gsize n = (gsize)width * (gsize)height;
  g_byte_array_set_size(buffer, (guint)(2 * n));
  guint8 *mask = buffer->data;
  take_mask(w, k, b, o->cut, mask);
  aw_mask_fill_holes(mask, width, height, (gint64)n);
  aw_mask_open(mask, width, height, mask + n);
  double left = (double)aw_mask_keep_largest(mask, width, height), r = w->scale.radius_px;
  if (left < MAX(15, w->rules->smallest_area * G_PI * r * r))
    memset(mask, 0, n);
  else
    measure_shape(o, mask, width, height);
  give_mask(w, k, b, mask);
}

void aw_segment_renumber(AwSegmentWork *w, const guint8 *drop)
{
  g_autofree guint32 *number = g_new0(guint32, (gsize)w->labels->n_labels + 1);
  gsize n_px = (gsize)w->width_px * (gsize)w->height_px;
  GArray *objects = g_array_new(FALSE, TRUE, sizeof(AwObject));
  g_array_set_size(objects, 1);
  for (gsize i = 0; i < n_px; i++) {
    guint32 k = w->labels->label[i];
    if (!k)
      continue;
    if (!number[k] && !(drop && drop[k])) {
      number[k] = objects->len;
      g_array_append_val(objects, *aw_segment_object(w, k));
    }
    w->labels->label[i] = number[k];
  }
  w->labels->n_labels = objects->len - 1;
  g_array_free(w->objects, TRUE);
  w->objects = objects;
}

gboolean aw_segment_outlines(AwSegmentWork *w, GError **error)
{
  if (!aw_segment_levels(w, error))
    return FALSE;
  grow(w, aw_segment_object(w, 0));
  find_boxes(w, aw_segment_object(w, 0));
  g_autoptr(GByteArray) buffer = g_byte_array_new();
  for (guint32 k = 1; k <= w->labels->n_labels; k++)
    if (aw_segment_object(w, k)->box.x1 > 0)
      trim(w, k, buffer);
  aw_segment_renumber(w, NULL);
  return TRUE;
}

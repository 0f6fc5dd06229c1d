/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <math.h>
#include <string.h>

#include "base/limits.h"
#include "image/rank.h"
#include "nuclei/segment_spread.h"

AW_HOT static void mark_row(const guint32 *restrict up, const guint32 *restrict mid, const guint32 *restrict down,
                            guint8 *restrict mark, int width)
{
  for (int x = 1; x < width - 1; x++)
    mark[x] = mid[x] && (mid[x - 1] != mid[x] || mid[x + 1] != mid[x] || up[x] != mid[x] || down[x] != mid[x]);
}

void aw_label_edges(const guint32 *label, int width, int height, GArray *edge)
{
  gsize w = (gsize)width, n_words = (w + 7) / 8;
  g_autofree guint64 *words = g_new0(guint64, n_words);
  guint8 *mark = (guint8 *)words;
  for (int y = 0; y < height; y++) {
    const guint32 *mid = label + (gsize)y * w, *up = y > 0 ? mid - w : mid, *down = y + 1 < height ? mid + w : mid;
    mark_row(up, mid, down, mark, width);
    for (gsize x = 0; x < w; x += MAX(w - 1, 1)) {
      guint32 left = mid[x > 0 ? x - 1 : x], right = mid[x + 1 < w ? x + 1 : x];
      mark[x] = mid[x] && (left != mid[x] || right != mid[x] || up[x] != mid[x] || down[x] != mid[x]);
    }
    for (gsize i = 0; i < n_words; i++)
      for (gsize x = 8 * i; words[i] && x < MIN(8 * i + 8, w); x++)
        if (mark[x]) {
          AwSpot s = { (guint32)((gsize)y * w + x), mid[x] };
          g_array_append_val(edge, s);
        }
  }
}

void aw_labels_around(const guint32 *label, int width, int height, guint32 at, guint32 around[4])
{
  gsize w = (gsize)width, x = at % w, y = at / w;
  around[0] = label[x > 0 ? at - 1 : at];
  around[1] = label[x + 1 < w ? at + 1 : at];
  around[2] = label[y > 0 ? at - w : at];
  around[3] = label[y + 1 < (gsize)height ? at + w : at];
}

static void include(AwRect *box, int x, int y)
{
  *box = (AwRect){ MIN(box->x0, x), MIN(box->y0, y), MAX(box->x1, x + 1), MAX(box->y1, y + 1) };
}

/* Takes the unlabelled neighbours of a spot that are brighter than its object's cut. */
static void grow_spot(AwSegmentWork *w, AwSpot s, GArray *reached)
{
  int width = w->width_px, x = (int)(s.at % (guint32)width), y = (int)(s.at / (guint32)width);
  AwObject *o = aw_segment_object(w, s.label);
  for (int d = 0; d < 4; d++) {
    int i = x + (d == 1) - (d == 0), j = y + (d == 3) - (d == 2);
    if (i < 0 || j < 0 || i >= width || j >= w->height_px)
      continue;
    gsize at = (gsize)j * (gsize)width + (gsize)i;
    if (w->labels->label[at] || (double)w->smooth->value[at] <= o->cut)
      continue;
    w->labels->label[at] = s.label;
    include(&o->box, i, j);
    AwSpot n = { (guint32)at, s.label };
    g_array_append_val(reached, n);
  }
}

/* Labels grow over brighter ground than their own cut, one pixel a round. */
static void grow(AwSegmentWork *w)
{
  int n_rounds = (int)lround(w->rules->grow_radii * w->scale.radius_px);
  for (guint round = 0, from = 0, to = w->edge->len; (int)round < n_rounds; round++, from = to, to = w->edge->len)
    for (guint k = from; k < to; k++)
      grow_spot(w, g_array_index(w->edge, AwSpot, k), w->edge);
}

AW_HOT static void mask_row(const guint32 *restrict label, const float *restrict value, guint32 k, float cut,
                            guint8 *restrict mask, int width)
{
  for (int x = 0; x < width; x++)
    mask[x] = (label[x] == k) & (value[x] > cut);
}

static void take_mask(const AwSegmentWork *w, guint32 k, AwRect b, double cut, guint8 *mask)
{
  int width = b.x1 - b.x0;
  for (int y = b.y0; y < b.y1; y++, mask += width)
    mask_row(w->labels->label + (gsize)y * (gsize)w->width_px + b.x0, aw_plane_row(w->smooth, y) + b.x0, k, (float)cut,
             mask, width);
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
  o->n_px = o->shape.n;
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
  if (left < MAX(15, w->rules->smallest_area * G_PI * r * r)) {
    memset(mask, 0, n);
    o->n_px = 0;
  } else
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
    if (!number[k] && !drop[k]) {
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
  grow(w);
  g_autoptr(GByteArray) buffer = g_byte_array_new();
  for (guint32 k = 1; k <= w->labels->n_labels; k++)
    trim(w, k, buffer);
  return TRUE;
}

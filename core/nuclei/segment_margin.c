/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/segment_margin.h"

#include <string.h>

#include "base/limits.h"

#define M AW_SEGMENT_MARGIN_PX

/* Index i of a line of n pixels that goes on as its own mirror image on both sides. */
static int mirrored(int i, int n)
{
  int period = 2 * n, k = ((i % period) + period) % period;
  return k < n ? k : period - 1 - k;
}

/* One row with its margins; only they need the mirror. */
static void widen_row(guint8 *to, const guint8 *from, int width_px, gsize size)
{
  memcpy(to + M * size, from, (gsize)width_px * size);
  for (int i = 0; i < M; i++) {
    memcpy(to + (gsize)i * size, from + (gsize)mirrored(i - M, width_px) * size, size);
    memcpy(to + (gsize)(M + width_px + i) * size, from + (gsize)mirrored(width_px + i, width_px) * size, size);
  }
}

AwImage *aw_segment_mirror(const AwImage *image, GError **error)
{
  AwImage *wide = aw_image_new(image->width_px + 2 * M, image->height_px + 2 * M, image->sample, error);
  if (!wide)
    return NULL;
  gsize size = aw_sample_bytes(image->sample);
  wide->full_scale = image->full_scale;
  for (int y = 0; y < wide->height_px; y++) {
    gsize source = (gsize)mirrored(y - M, image->height_px) * (gsize)image->width_px * size;
    widen_row((guint8 *)wide->pixels + (gsize)y * (gsize)wide->width_px * size, (const guint8 *)image->pixels + source,
              image->width_px, size);
  }
  return wide;
}

/* Copies the middle of the labels and marks which of them are there. */
static void copy_middle(const AwLabels *wide, AwLabels *labels, guint32 *renumber)
{
  for (int y = 0; y < labels->height_px; y++) {
    const guint32 *from = wide->label + (gsize)(y + M) * (gsize)wide->width_px + M;
    guint32 *to = labels->label + (gsize)y * (gsize)labels->width_px;
    memcpy(to, from, (gsize)labels->width_px * sizeof *to);
    for (int x = 0; x < labels->width_px; x++)
      renumber[to[x]] = 1;
  }
}

AwSegmentation *aw_segment_cut_back(const AwSegmentation *wide, GError **error)
{
  gsize n_wide = (gsize)wide->labels->n_labels + 1;
  g_autofree guint32 *renumber = aw_try_alloc(n_wide, sizeof *renumber, "label numbers", error);
  g_autoptr(AwLabels) labels =
      renumber ? aw_labels_new(wide->labels->width_px - 2 * M, wide->labels->height_px - 2 * M, error) : NULL;
  if (!labels)
    return NULL;
  copy_middle(wide->labels, labels, renumber);
  AwSegmentInfo *info = g_new0(AwSegmentInfo, n_wide);
  renumber[0] = 0;
  for (gsize k = 1; k < n_wide; k++)
    if (renumber[k]) {
      renumber[k] = ++labels->n_labels;
      info[renumber[k]] = wide->info[k];
    }
  for (gsize i = 0; i < (gsize)labels->width_px * (gsize)labels->height_px; i++)
    labels->label[i] = renumber[labels->label[i]];
  AwSegmentation *s = g_new0(AwSegmentation, 1);
  *s = (AwSegmentation){ g_steal_pointer(&labels), info, wide->scale };
  return s;
}

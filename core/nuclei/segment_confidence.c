/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/limits.h"
#include "nuclei/segment_work.h"

AwSegmentInfo *aw_segment_infos(AwSegmentWork *w, GError **error)
{
  AwSegmentInfo *info = aw_try_alloc((gsize)w->labels->n_labels + 1, sizeof *info, "the nuclei's notes", error);
  for (guint32 k = 1; info && k <= w->labels->n_labels; k++)
    info[k] = (AwSegmentInfo){ 0.5, 1, g_array_index(w->neck, double, k) };
  return info;
}

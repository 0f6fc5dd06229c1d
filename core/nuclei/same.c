/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/same.h"

#include "base/grid.h"
#include "geometry/outline.h"

static AwGrid *index_centroids(GPtrArray *nuclei)
{
  g_autofree double *xy = g_new(double, 2 * (gsize)nuclei->len + 1);
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *nucleus = nuclei->pdata[i];
    xy[2 * i] = nucleus->centroid.x_um;
    xy[2 * i + 1] = nucleus->centroid.y_um;
  }
  return aw_grid_new(xy, nuclei->len);
}

static gboolean holds(const AwNucleus *outer, const AwNucleus *inner)
{
  return aw_outline_contains(outer->outline, outer->n_outline, inner->centroid);
}

/* Index of the only nucleus of `others` whose centroid lies inside `one`; -1 for none, -2 for several. */
static gint only_inside(const AwNucleus *one, GPtrArray *others, const AwGrid *grid, GArray *hits)
{
  gint found = -1;
  double reach = aw_outline_reach(one->outline, one->n_outline, one->centroid);
  aw_grid_within(grid, one->centroid.x_um, one->centroid.y_um, reach, hits);
  for (guint k = 0; k < hits->len; k++) {
    gint index = (gint)g_array_index(hits, AwGridHit, k).index;
    if (holds(one, others->pdata[index]))
      found = found == -1 ? index : -2;
  }
  return found;
}

gint *aw_nuclei_same(GPtrArray *before, GPtrArray *now)
{
  g_autoptr(AwGrid) old_grid = index_centroids(before);
  g_autoptr(AwGrid) new_grid = index_centroids(now);
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  gint *same = g_new(gint, now->len + 1);
  for (guint i = 0; i < now->len; i++) {
    gint old = only_inside(now->pdata[i], before, old_grid, hits);
    gboolean mutual = old >= 0 && only_inside(before->pdata[old], now, new_grid, hits) == (gint)i;
    same[i] = mutual ? old : -1;
  }
  return same;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/hit.h"

#include <stdlib.h>

#include "base/limits.h"

/*
 * A grid of square cells over the centroids, cells about as large as the mean distance between nuclei, stored as one
 * list of indices sorted by cell (first[c] ... first[c + 1]). Outlines reach out of their cell by at most `reach`.
 */
typedef struct {
  AwScanPoint low, high;
} Bounds;

struct AwHitIndex {
  GPtrArray *nuclei;
  AwScanPoint *centroid;
  Bounds *bounds; /* of each nucleus's outline and centroid */
  double x0, y0, cell_um, reach_um;
  int n_across, n_down;
  guint *first; /* n_across x n_down + 1 */
  guint *item;
};

typedef struct {
  int x0, y0, x1, y1; /* cells, both ends included; empty when x0 > x1 */
} Cells;

static gboolean is_sane(AwScanPoint q)
{
  return fabs(q.x_um) <= AW_MAX_COORDINATE_UM && fabs(q.y_um) <= AW_MAX_COORDINATE_UM;
}

static const AwNucleus *nucleus_at(const AwHitIndex *index, guint i)
{
  return index->nuclei->pdata[i];
}

/* The farthest outline point from the centroid; -1 when the nucleus is of no use. */
static double measure(const AwNucleus *nucleus, Bounds *bounds)
{
  double reach = 0;
  if (!is_sane(nucleus->centroid))
    return -1;
  bounds->low = bounds->high = nucleus->centroid;
  for (gsize i = 0; i < nucleus->n_outline; i++) {
    if (!is_sane(nucleus->outline[i]))
      return -1;
    double dx = nucleus->outline[i].x_um - nucleus->centroid.x_um;
    double dy = nucleus->outline[i].y_um - nucleus->centroid.y_um;
    reach = MAX(reach, hypot(dx, dy));
    bounds->low.x_um = MIN(bounds->low.x_um, nucleus->outline[i].x_um);
    bounds->low.y_um = MIN(bounds->low.y_um, nucleus->outline[i].y_um);
    bounds->high.x_um = MAX(bounds->high.x_um, nucleus->outline[i].x_um);
    bounds->high.y_um = MAX(bounds->high.y_um, nucleus->outline[i].y_um);
  }
  return reach;
}

static int clamp_cell(double offset_um, double cell_um, int n)
{
  return (int)CLAMP(floor(offset_um / cell_um), 0, n - 1);
}

static gsize cell_of(const AwHitIndex *index, AwScanPoint q)
{
  int x = clamp_cell(q.x_um - index->x0, index->cell_um, index->n_across);
  int y = clamp_cell(q.y_um - index->y0, index->cell_um, index->n_down);
  return (gsize)y * (gsize)index->n_across + (gsize)x;
}

/* Lays the grid over the usable nuclei; *usable gets one byte each. */
static void lay_grid(AwHitIndex *index, guint8 *usable)
{
  double x1 = -INFINITY, y1 = -INFINITY;
  gsize n = 0;
  index->x0 = index->y0 = INFINITY;
  for (guint i = 0; i < index->nuclei->len; i++) {
    const AwNucleus *nucleus = nucleus_at(index, i);
    double reach = measure(nucleus, &index->bounds[i]);
    usable[i] = reach >= 0;
    if (!usable[i])
      continue;
    n++;
    index->reach_um = MAX(index->reach_um, reach);
    index->x0 = MIN(index->x0, nucleus->centroid.x_um);
    index->y0 = MIN(index->y0, nucleus->centroid.y_um);
    x1 = MAX(x1, nucleus->centroid.x_um);
    y1 = MAX(y1, nucleus->centroid.y_um);
  }
  double w = n ? x1 - index->x0 : 0, h = n ? y1 - index->y0 : 0, side = sqrt(w * h / (double)(n + 1));
  index->cell_um = MAX(MAX(side, (w + h) / (2.0 * (double)n + 64)), 1e-3);
  index->n_across = (int)(w / index->cell_um) + 1;
  index->n_down = (int)(h / index->cell_um) + 1;
}

static void fill_grid(AwHitIndex *index, const guint8 *usable)
{
  gsize n_cells = (gsize)index->n_across * (gsize)index->n_down;
  index->first = g_new0(guint, n_cells + 2);
  index->item = g_new(guint, index->nuclei->len + 1);
  for (guint i = 0; i < index->nuclei->len; i++)
    if (usable[i])
      index->first[cell_of(index, nucleus_at(index, i)->centroid) + 2]++;
  for (gsize c = 2; c < n_cells + 2; c++)
    index->first[c] += index->first[c - 1];
  for (guint i = 0; i < index->nuclei->len; i++)
    if (usable[i])
      index->item[index->first[cell_of(index, nucleus_at(index, i)->centroid) + 1]++] = i;
}

AwHitIndex *aw_hit_index_new(GPtrArray *nuclei)
{
  g_return_val_if_fail(nuclei, NULL);
  AwHitIndex *index = g_new0(AwHitIndex, 1);
  guint8 *usable = g_new0(guint8, nuclei->len + 1);
  index->nuclei = g_ptr_array_ref(nuclei);
  index->bounds = g_new0(Bounds, nuclei->len + 1);
  index->centroid = g_new(AwScanPoint, nuclei->len + 1);
  for (guint i = 0; i < nuclei->len; i++)
    index->centroid[i] = nucleus_at(index, i)->centroid;
  lay_grid(index, usable);
  fill_grid(index, usable);
  g_free(usable);
  return index;
}

void aw_hit_index_free(AwHitIndex *index)
{
  if (!index)
    return;
  g_ptr_array_unref(index->nuclei);
  g_free(index->centroid);
  g_free(index->bounds);
  g_free(index->first);
  g_free(index->item);
  g_free(index);
}

const AwScanPoint *aw_hit_centroids(const AwHitIndex *index)
{
  return index->centroid;
}

gboolean aw_polygon_contains(const AwScanPoint *polygon, gsize n, AwScanPoint q)
{
  gboolean inside = FALSE;
  for (gsize i = 0, j = n - 1; i < n; j = i++) {
    AwScanPoint a = polygon[i], b = polygon[j];
    if ((a.y_um > q.y_um) != (b.y_um > q.y_um) &&
        q.x_um < a.x_um + (q.y_um - a.y_um) * (b.x_um - a.x_um) / (b.y_um - a.y_um))
      inside = !inside;
  }
  return inside;
}

static Cells cells_round(const AwHitIndex *index, AwScanPoint low, AwScanPoint high, double reach_um)
{
  double x0 = low.x_um - reach_um - index->x0, x1 = high.x_um + reach_um - index->x0;
  double y0 = low.y_um - reach_um - index->y0, y1 = high.y_um + reach_um - index->y0;
  gboolean meets = x1 >= 0 && y1 >= 0 && x0 <= index->n_across * index->cell_um && y0 <= index->n_down * index->cell_um;
  if (!meets)
    return (Cells){ 0, 0, -1, -1 };
  return (Cells){ clamp_cell(x0, index->cell_um, index->n_across), clamp_cell(y0, index->cell_um, index->n_down),
                  clamp_cell(x1, index->cell_um, index->n_across), clamp_cell(y1, index->cell_um, index->n_down) };
}

/* The first and the last + 1 entry of `item` in row y of the cells: neighbours in a row lie side by side. */
static guint row_begin(const AwHitIndex *index, Cells cells, int y)
{
  return index->first[(gsize)y * (gsize)index->n_across + (gsize)cells.x0];
}

static guint row_end(const AwHitIndex *index, Cells cells, int y)
{
  return index->first[(gsize)y * (gsize)index->n_across + (gsize)cells.x1 + 1];
}

static double distance(const AwNucleus *nucleus, AwScanPoint q)
{
  return hypot(nucleus->centroid.x_um - q.x_um, nucleus->centroid.y_um - q.y_um);
}

int aw_hit_at(const AwHitIndex *index, AwScanPoint q, double slack_um)
{
  int inside = -1, near = -1;
  double least_area = INFINITY, least_um = slack_um;
  if (!is_sane(q))
    return -1;
  Cells cells = cells_round(index, q, q, MAX(index->reach_um, slack_um));
  for (int y = cells.y0; y <= cells.y1; y++)
    for (guint k = row_begin(index, cells, y); k < row_end(index, cells, y); k++) {
      const AwNucleus *nucleus = nucleus_at(index, index->item[k]);
      double d = distance(nucleus, q);
      if (d <= index->reach_um && nucleus->area < least_area &&
          aw_polygon_contains(nucleus->outline, nucleus->n_outline, q)) {
        least_area = nucleus->area;
        inside = (int)index->item[k];
      }
      if (d <= least_um) {
        least_um = d;
        near = (int)index->item[k];
      }
    }
  return inside >= 0 ? inside : near;
}

static int by_number(const void *a, const void *b)
{
  guint x = *(const guint *)a, y = *(const guint *)b;
  return (x > y) - (x < y);
}

/* Sorts numbers below n, none twice; many are faster ticked off in a list of all. */
static void sort_items(GArray *found, guint n)
{
  if (found->len < 2)
    return;
  if (found->len < n / 16) {
    qsort(found->data, found->len, sizeof(guint), by_number);
    return;
  }
  guint8 *ticked = g_new0(guint8, n + 1);
  for (guint i = 0; i < found->len; i++)
    ticked[g_array_index(found, guint, i)] = 1;
  for (guint i = 0, k = 0; i < n; i++)
    if (ticked[i])
      g_array_index(found, guint, k++) = i;
  g_free(ticked);
}

/* Everything in the cells, rising. */
static GArray *collect(const AwHitIndex *index, Cells cells)
{
  GArray *found = g_array_new(FALSE, FALSE, sizeof(guint));
  for (int y = cells.y0; y <= cells.y1; y++) {
    guint begin = row_begin(index, cells, y), end = row_end(index, cells, y);
    if (end > begin)
      g_array_append_vals(found, &index->item[begin], end - begin);
  }
  sort_items(found, index->nuclei->len);
  return found;
}

typedef gboolean (*Test)(const AwHitIndex *index, guint item, gconstpointer data);

static GArray *keep(const AwHitIndex *index, GArray *found, Test test, gconstpointer data)
{
  guint n = 0;
  for (guint i = 0; i < found->len; i++) {
    guint item = g_array_index(found, guint, i);
    if (test(index, item, data))
      g_array_index(found, guint, n++) = item;
  }
  g_array_set_size(found, n);
  return found;
}

static gboolean overlaps(const AwHitIndex *index, guint item, gconstpointer data)
{
  const Bounds *a = &index->bounds[item], *b = data;
  return a->high.x_um >= b->low.x_um && a->low.x_um <= b->high.x_um && a->high.y_um >= b->low.y_um &&
         a->low.y_um <= b->high.y_um;
}

GArray *aw_hit_in_rectangle(const AwHitIndex *index, AwScanPoint a, AwScanPoint b)
{
  Bounds box = { { MIN(a.x_um, b.x_um), MIN(a.y_um, b.y_um) }, { MAX(a.x_um, b.x_um), MAX(a.y_um, b.y_um) } };
  return keep(index, collect(index, cells_round(index, box.low, box.high, index->reach_um)), overlaps, &box);
}

typedef struct {
  const AwScanPoint *point;
  gsize n;
} Loop;

/* Winding number of the loop round the centroid (Sunday 2001): unlike counting crossings it keeps what a hand that
 * crossed its own line went round twice. */
static gboolean is_wound(const AwHitIndex *index, guint item, gconstpointer data)
{
  const Loop *loop = data;
  AwScanPoint q = nucleus_at(index, item)->centroid;
  int turns = 0;
  for (gsize i = 0, j = loop->n - 1; i < loop->n; j = i++) {
    AwScanPoint a = loop->point[j], b = loop->point[i];
    double side = (b.x_um - a.x_um) * (q.y_um - a.y_um) - (q.x_um - a.x_um) * (b.y_um - a.y_um);
    if (a.y_um <= q.y_um && b.y_um > q.y_um && side > 0)
      turns++;
    else if (a.y_um > q.y_um && b.y_um <= q.y_um && side < 0)
      turns--;
  }
  return turns != 0;
}

GArray *aw_hit_in_loop(const AwHitIndex *index, const AwScanPoint *loop, gsize n)
{
  AwScanPoint low = { INFINITY, INFINITY }, high = { -INFINITY, -INFINITY };
  for (gsize i = 0; i < n; i++) {
    low = (AwScanPoint){ MIN(low.x_um, loop[i].x_um), MIN(low.y_um, loop[i].y_um) };
    high = (AwScanPoint){ MAX(high.x_um, loop[i].x_um), MAX(high.y_um, loop[i].y_um) };
  }
  Loop drawn = { loop, n };
  Cells none = { 0, 0, -1, -1 };
  Cells cells = n >= 3 && is_sane(low) && is_sane(high) ? cells_round(index, low, high, 0) : none;
  return keep(index, collect(index, cells), is_wound, &drawn);
}

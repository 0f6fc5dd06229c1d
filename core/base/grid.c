/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/grid.h"

#include <math.h>
#include <string.h>

struct AwGrid {
  gsize n;
  double x0, y0, cell; /* corner and side of the cells */
  int n_x, n_y;
  double *xy;   /* sorted by cell */
  gsize *index; /* the caller's index of each sorted point */
  gsize *first; /* of each cell, n_x n_y + 1 entries */
};

static int cell_of(double value, double origin, double cell, int n)
{
  return (int)CLAMP(floor((value - origin) / cell), 0.0, (double)(n - 1));
}

/* About two points a cell, never more than 2 n + 2 cells even when all points lie on a line. */
static void lay_out(AwGrid *grid, const double *xy)
{
  double x1 = -INFINITY, y1 = -INFINITY;
  grid->x0 = grid->y0 = INFINITY;
  for (gsize i = 0; i < grid->n; i++) {
    grid->x0 = MIN(grid->x0, xy[2 * i]);
    grid->y0 = MIN(grid->y0, xy[2 * i + 1]);
    x1 = MAX(x1, xy[2 * i]);
    y1 = MAX(y1, xy[2 * i + 1]);
  }
  double w = grid->n ? x1 - grid->x0 : 0, h = grid->n ? y1 - grid->y0 : 0, n = (double)MAX(grid->n, 1);
  grid->cell = MAX(sqrt(2 * w * h / n), 2 * MAX(w, h) / n);
  if (!(grid->cell > 0))
    grid->cell = 1;
  grid->n_x = (int)(w / grid->cell) + 1;
  grid->n_y = (int)(h / grid->cell) + 1;
}

static gsize place_of(const AwGrid *grid, double x, double y)
{
  gsize cx = (gsize)cell_of(x, grid->x0, grid->cell, grid->n_x);
  return (gsize)cell_of(y, grid->y0, grid->cell, grid->n_y) * (gsize)grid->n_x + cx;
}

AwGrid *aw_grid_new(const double *xy, gsize n)
{
  g_return_val_if_fail(xy || n == 0, NULL);
  AwGrid *grid = g_new0(AwGrid, 1);
  grid->n = n;
  lay_out(grid, xy);
  gsize n_cells = (gsize)grid->n_x * (gsize)grid->n_y;
  grid->xy = g_new(double, 2 * n + 1);
  grid->index = g_new(gsize, n + 1);
  grid->first = g_new0(gsize, n_cells + 2);
  for (gsize i = 0; i < n; i++)
    grid->first[place_of(grid, xy[2 * i], xy[2 * i + 1]) + 2]++;
  for (gsize c = 2; c < n_cells + 2; c++)
    grid->first[c] += grid->first[c - 1];
  for (gsize i = 0; i < n; i++) {
    gsize slot = grid->first[place_of(grid, xy[2 * i], xy[2 * i + 1]) + 1]++;
    grid->xy[2 * slot] = xy[2 * i];
    grid->xy[2 * slot + 1] = xy[2 * i + 1];
    grid->index[slot] = i;
  }
  return grid;
}

void aw_grid_free(AwGrid *grid)
{
  if (!grid)
    return;
  g_free(grid->xy);
  g_free(grid->index);
  g_free(grid->first);
  g_free(grid);
}

static gboolean comes_before(AwGridHit a, AwGridHit b)
{
  return a.distance < b.distance || (a.distance <= b.distance && a.index < b.index);
}

static int compare_hits(gconstpointer a, gconstpointer b)
{
  const AwGridHit *p = a, *q = b;
  return comes_before(*p, *q) ? -1 : comes_before(*q, *p) ? 1 : 0;
}

static AwGridHit hit_at(const AwGrid *grid, gsize slot, double x, double y)
{
  double dx = grid->xy[2 * slot] - x, dy = grid->xy[2 * slot + 1] - y;
  return (AwGridHit){ grid->index[slot], sqrt(dx * dx + dy * dy) };
}

/* A search for the k nearest points to (x, y); hits[0 ... n-1] are the best so far, in order. */
typedef struct {
  double x, y;
  gsize k, n;
  AwGridHit *hits;
} Search;

/* By insertion; k is small wherever this is used. */
static void insert_hit(Search *s, AwGridHit hit)
{
  if (s->n == s->k && !comes_before(hit, s->hits[s->n - 1]))
    return;
  gsize at = s->n < s->k ? s->n++ : s->k - 1;
  for (; at > 0 && comes_before(hit, s->hits[at - 1]); at--)
    s->hits[at] = s->hits[at - 1];
  s->hits[at] = hit;
}

static void search_cell(const AwGrid *grid, gsize cell, Search *s)
{
  for (gsize slot = grid->first[cell]; slot < grid->first[cell + 1]; slot++)
    insert_hit(s, hit_at(grid, slot, s->x, s->y));
}

/* Searches the cells whose larger distance in columns or rows from (cx, cy) is `ring`. */
static void search_ring(const AwGrid *grid, int cx, int cy, int ring, Search *s)
{
  for (int y = MAX(cy - ring, 0); y <= MIN(cy + ring, grid->n_y - 1); y++) {
    int step = ABS(y - cy) == ring ? 1 : 2 * ring;
    for (int x = cx - ring; x <= cx + ring; x += step)
      if (x >= 0 && x < grid->n_x)
        search_cell(grid, (gsize)y * (gsize)grid->n_x + (gsize)x, s);
  }
}

gsize aw_grid_nearest(const AwGrid *grid, double x, double y, gsize k, AwGridHit *hits)
{
  Search search = { x, y, k, 0, hits };
  if (grid->n == 0 || k == 0)
    return 0;
  int cx = cell_of(x, grid->x0, grid->cell, grid->n_x), cy = cell_of(y, grid->y0, grid->cell, grid->n_y);
  int n_rings = MAX(grid->n_x, grid->n_y);
  for (int ring = 0; ring < n_rings; ring++) {
    search_ring(grid, cx, cy, ring, &search);
    /* Cells not yet searched are at least `ring` cells away; equal distances must all be seen, hence the strict <. */
    if (search.n == k && hits[k - 1].distance < ring * grid->cell)
      break;
  }
  return search.n;
}

void aw_grid_within(const AwGrid *grid, double x, double y, double radius, GArray *hits)
{
  g_array_set_size(hits, 0);
  if (grid->n == 0 || !(radius >= 0))
    return;
  int x0 = cell_of(x - radius, grid->x0, grid->cell, grid->n_x);
  int x1 = cell_of(x + radius, grid->x0, grid->cell, grid->n_x);
  int y0 = cell_of(y - radius, grid->y0, grid->cell, grid->n_y);
  int y1 = cell_of(y + radius, grid->y0, grid->cell, grid->n_y);
  for (int cy = y0; cy <= y1; cy++) {
    gsize row = (gsize)cy * (gsize)grid->n_x;
    for (gsize slot = grid->first[row + (gsize)x0]; slot < grid->first[row + (gsize)x1 + 1]; slot++) {
      AwGridHit hit = hit_at(grid, slot, x, y);
      if (hit.distance <= radius)
        g_array_append_val(hits, hit);
    }
  }
  g_array_sort(hits, compare_hits);
}

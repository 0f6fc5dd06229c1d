/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/tour_tree.h"

#include <math.h>

#include "base/limits.h"

/* A k-d tree whose cells are halves of halves of one array, so that a cell needs no pointers: cell c covers slots
 * lo ... hi-1, its children 2c and 2c+1 the two halves. Counts of the points left in each cell let a search pass by
 * emptied regions (Bentley, "K-d trees for semidynamic point sets", SoCG 1990). */

#define LEAF_POINTS 6

struct AwTourCell {
  double split;
  guint32 n_left;
  guint32 axis; /* 0: x, 1: y */
};

typedef struct {
  AwStop at;
  guint32 id;
} Item;

typedef struct {
  const AwTourTree *tree;
  double x, y, worst2; /* squared distance of the k-th best so far */
  guint32 self, skip;
  gint quadrant; /* -1: all of the plane */
  guint n, k;
  guint32 *slots;
  double d2[AW_TOUR_TREE_MAX_K];
} Query;

static inline double along(const AwStop *p, guint axis)
{
  return axis ? p->y : p->x;
}

/* TRUE when a stands before b along the axis; ties by the other axis and the given order keep the tree repeatable. */
static inline gboolean before(const Item *a, const Item *b, guint axis)
{
  double u = along(&a->at, axis), v = along(&b->at, axis);
  if (u != v)
    return u < v;
  u = along(&a->at, !axis);
  v = along(&b->at, !axis);
  return u != v ? u < v : a->id < b->id;
}

/* Hoare's selection: afterwards items[0 ... m-1] stand before items[m ... n-1]. */
static void select_middle(Item *items, gint64 n, gint64 m, guint axis)
{
  gint64 lo = 0, hi = n - 1;
  while (lo < hi) {
    Item pivot = items[lo + (hi - lo) / 2];
    gint64 i = lo, j = hi;
    while (i <= j) {
      while (before(&items[i], &pivot, axis))
        i++;
      while (before(&pivot, &items[j], axis))
        j--;
      if (i <= j) {
        Item t = items[i];
        items[i++] = items[j];
        items[j--] = t;
      }
    }
    if (m <= j)
      hi = j;
    else if (m >= i)
      lo = i;
    else
      return;
  }
}

static guint wider_axis(const Item *items, guint32 n)
{
  double x0 = items[0].at.x, x1 = x0, y0 = items[0].at.y, y1 = y0;
  for (guint32 i = 1; i < n; i++) {
    x0 = MIN(x0, items[i].at.x);
    x1 = MAX(x1, items[i].at.x);
    y0 = MIN(y0, items[i].at.y);
    y1 = MAX(y1, items[i].at.y);
  }
  return y1 - y0 > x1 - x0;
}

static void build(AwTourTree *tree, Item *items, guint32 cell, guint level, guint32 lo, guint32 hi)
{
  tree->cells[cell].n_left = hi - lo;
  if (level == tree->n_levels)
    return;
  guint32 mid = lo + (hi - lo) / 2;
  if (hi > lo) {
    guint axis = wider_axis(items + lo, hi - lo);
    select_middle(items + lo, hi - lo, mid - lo, axis);
    tree->cells[cell].axis = axis;
    tree->cells[cell].split = along(&items[mid].at, axis);
  }
  build(tree, items, 2 * cell, level + 1, lo, mid);
  build(tree, items, 2 * cell + 1, level + 1, mid, hi);
}

AwTourTree *aw_tour_tree_new(const AwStop *points, guint32 n, GError **error)
{
  g_autoptr(AwTourTree) tree = g_new0(AwTourTree, 1);
  tree->n = n;
  while (((gsize)LEAF_POINTS << tree->n_levels) < n)
    tree->n_levels++;
  gsize n_cells = (gsize)2 << tree->n_levels;
  g_autofree Item *items = aw_try_alloc(n, sizeof *items, "the points of a tour", error);
  if (!items || !(tree->at = aw_try_alloc(n, sizeof *tree->at, "the points of a tour", error)) ||
      !(tree->id = aw_try_alloc(n, sizeof *tree->id, "the points of a tour", error)) ||
      !(tree->gone = aw_try_alloc(n, 1, "the points of a tour", error)) ||
      !(tree->cells = aw_try_alloc(n_cells, sizeof *tree->cells, "the cells of a tour", error)))
    return NULL;
  for (guint32 i = 0; i < n; i++)
    items[i] = (Item){ points[i], i };
  build(tree, items, 1, 0, 0, n);
  for (guint32 i = 0; i < n; i++) {
    tree->at[i] = items[i].at;
    tree->id[i] = items[i].id;
  }
  return g_steal_pointer(&tree);
}

void aw_tour_tree_free(AwTourTree *tree)
{
  if (!tree)
    return;
  g_free(tree->at);
  g_free(tree->id);
  g_free(tree->gone);
  g_free(tree->cells);
  g_free(tree);
}

void aw_tour_tree_remove(AwTourTree *tree, guint32 slot)
{
  guint32 lo = 0, hi = tree->n, cell = 1;
  tree->gone[slot] = 1;
  tree->cells[cell].n_left--;
  for (guint level = 0; level < tree->n_levels; level++) {
    guint32 mid = lo + (hi - lo) / 2;
    cell = 2 * cell + (slot >= mid);
    if (slot < mid)
      hi = mid;
    else
      lo = mid;
    tree->cells[cell].n_left--;
  }
}

guint aw_tour_tree_quadrant(double dx, double dy)
{
  if (dx > 0 && dy >= 0)
    return 0;
  if (dx <= 0 && dy > 0)
    return 1;
  return dx < 0 ? 2 : 3;
}

static void look_in_leaf(Query *q, guint32 lo, guint32 hi)
{
  for (guint32 i = lo; i < hi; i++) {
    double dx = q->tree->at[i].x - q->x, dy = q->tree->at[i].y - q->y, d2 = dx * dx + dy * dy;
    if (d2 >= q->worst2 || i == q->self || i == q->skip || q->tree->gone[i] ||
        (q->quadrant >= 0 && (d2 == 0 || aw_tour_tree_quadrant(dx, dy) != (guint)q->quadrant)))
      continue;
    guint j = q->n < q->k ? q->n++ : q->n - 1;
    for (; j > 0 && q->d2[j - 1] > d2; j--) {
      q->d2[j] = q->d2[j - 1];
      q->slots[j] = q->slots[j - 1];
    }
    q->d2[j] = d2;
    q->slots[j] = i;
    if (q->n == q->k)
      q->worst2 = q->d2[q->n - 1];
  }
}

/* off_x, off_y: how far the query point lies outside the cell along each axis. */
static void visit(Query *q, guint32 cell, guint level, guint32 lo, guint32 hi, double off_x, double off_y)
{
  const struct AwTourCell *c = &q->tree->cells[cell];
  if (!c->n_left)
    return;
  if (level == q->tree->n_levels) {
    look_in_leaf(q, lo, hi);
    return;
  }
  guint32 mid = lo + (hi - lo) / 2;
  double off = (c->axis ? q->y : q->x) - c->split;
  double far_x = c->axis ? off_x : off, far_y = c->axis ? off : off_y;
  gboolean low = off < 0, want_low = TRUE, want_high = TRUE;
  if (q->quadrant >= 0) { /* one child may lie wholly on the wrong side of the query point */
    gboolean upwards = c->axis ? q->quadrant < 2 : q->quadrant == 0 || q->quadrant == 3;
    want_low = !upwards || off <= 0;
    want_high = upwards || off >= 0;
  }
  double far2 = far_x * far_x + far_y * far_y;
  for (guint turn = 0; turn < 2; turn++) {
    gboolean far = turn == 1, into_low = low != far;
    if ((far && far2 >= q->worst2) || !(into_low ? want_low : want_high))
      continue;
    visit(q, 2 * cell + !into_low, level + 1, into_low ? lo : mid, into_low ? mid : hi, far ? far_x : off_x,
          far ? far_y : off_y);
  }
}

static guint ask(const AwTourTree *tree, guint32 from, guint32 skip, gint quadrant, guint k, guint32 *slots)
{
  g_return_val_if_fail(from < tree->n && k >= 1 && k <= AW_TOUR_TREE_MAX_K, 0);
  Query q = { .tree = tree, .x = tree->at[from].x, .y = tree->at[from].y, .worst2 = INFINITY, .self = from };
  q.skip = skip;
  q.quadrant = quadrant;
  q.k = k;
  q.slots = slots;
  visit(&q, 1, 0, 0, tree->n, 0, 0);
  return q.n;
}

guint aw_tour_tree_nearest(const AwTourTree *tree, guint32 from, guint32 skip, guint k, guint32 *slots)
{
  return ask(tree, from, skip, -1, k, slots);
}

guint aw_tour_tree_nearest_in(const AwTourTree *tree, guint32 from, guint quadrant, guint k, guint32 *slots)
{
  return ask(tree, from, from, (gint)quadrant, k, slots);
}

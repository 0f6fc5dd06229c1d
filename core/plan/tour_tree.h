/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_TOUR_TREE_H
#define AW_PLAN_TOUR_TREE_H

#include "plan/tour.h"

/**
 * AwTourTree: a k-d tree over points that can be taken away one by one (internal to the tour engine).
 * Points are addressed by slot, their place in the tree's own order; neighbouring slots are near in space, so arrays
 * kept in slot order stay in the processor's cache while a search works on one part of the plane.
 */
typedef struct {
  guint32 n;
  AwStop *at;   /* n points in slot order */
  guint32 *id;  /* index of each slot in the array given to aw_tour_tree_new */
  guint8 *gone; /* 1 when the slot was taken away */
  guint n_levels;
  struct AwTourCell *cells; /* heap order, 2^(n_levels + 1) */
} AwTourTree;

AwTourTree *aw_tour_tree_new(const AwStop *points, guint32 n, GError **error);
void aw_tour_tree_free(AwTourTree *tree);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTourTree, aw_tour_tree_free)

/* Takes `slot` away (once): it is never found again. */
void aw_tour_tree_remove(AwTourTree *tree, guint32 slot);

#define AW_TOUR_TREE_MAX_K 32

/**
 * The up to k (1 ... AW_TOUR_TREE_MAX_K) slots nearest to slot `from`, nearest first, without `from` itself and without
 * slot `skip`. Returns how many were found.
 */
guint aw_tour_tree_nearest(const AwTourTree *tree, guint32 from, guint32 skip, guint k, guint32 *slots);

/**
 * The quadrant, 0 ... 3, of the direction (dx, dy), which is not (0, 0): each holds one of the half-axes at its
 * borders, so that every direction is in one quadrant.
 */
guint aw_tour_tree_quadrant(double dx, double dy);

/* As aw_tour_tree_nearest, within one quadrant around `from` and without points at the same place. */
guint aw_tour_tree_nearest_in(const AwTourTree *tree, guint32 from, guint quadrant, guint k, guint32 *slots);

#endif

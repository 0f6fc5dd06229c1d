/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_GRID_H
#define AW_BASE_GRID_H

#include <glib.h>

/**
 * AwGrid: a spatial index over points of the plane, built once and read by any number of threads.
 *
 * The points are sorted into square cells that hold about two of them each. Units are the caller's. Answers come
 * by rising distance, equal distances by rising index, so they never depend on how the cells fell.
 */
typedef struct AwGrid AwGrid;

/* A point found: its index in the array the grid was built from, and its distance. */
typedef struct {
  gsize index;
  double distance;
} AwGridHit;

/* Indexes n points, xy[2 i] and xy[2 i + 1], which must be finite; they are copied. n may be 0. */
AwGrid *aw_grid_new(const double *xy, gsize n);
void aw_grid_free(AwGrid *grid);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwGrid, aw_grid_free)

/* The at most k nearest points to (x, y); returns how many `hits` (room for k) were filled. */
gsize aw_grid_nearest(const AwGrid *grid, double x, double y, gsize k, AwGridHit *hits);

/* All points at most `radius` from (x, y), the edge included; `hits` (elements AwGridHit) is emptied first. */
void aw_grid_within(const AwGrid *grid, double x, double y, double radius, GArray *hits);

#endif

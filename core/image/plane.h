/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_PLANE_H
#define AW_IMAGE_PLANE_H

#include "image/image.h"

/* Hot row loops are compiled twice and chosen when the program starts; both give the same bytes. */
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__) && !defined(__SANITIZE_ADDRESS__) &&               \
    !defined(__SANITIZE_THREAD__)
#define AW_HOT __attribute__((target_clones("avx2", "default"), optimize("O3")))
#else
#define AW_HOT
#endif

/**
 * AwPlane: one plane of real numbers, rows from the top, no padding; what image operations work on.
 */
typedef struct {
  int width_px, height_px;
  float *value; /* width_px x height_px, owned */
} AwPlane;

/* A new plane, all zero; AW_ERROR_MEMORY. */
AwPlane *aw_plane_new(int width_px, int height_px, GError **error);
void aw_plane_free(AwPlane *plane);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwPlane, aw_plane_free)

static inline float *aw_plane_row(const AwPlane *plane, int y)
{
  return plane->value + (gsize)y * (gsize)plane->width_px;
}

/**
 * aw_plane_reduce: the mean over blocks of factor x factor pixels; blocks cut by the right or lower edge average what
 * is there. Block (0, 0) starts at the first pixel. The result has ceil(side / factor) pixels a side.
 */
AwPlane *aw_plane_reduce(const AwPlane *plane, int factor, GError **error);

/**
 * aw_plane_expand_row: bilinear values of a reduced plane at `width` pixels of row y of the full grid, from column x0.
 * Beyond the outermost block centres the nearest value holds.
 */
void aw_plane_expand_row(const AwPlane *reduced, int factor, int y, int x0, int width, float *row);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_PATCH_H
#define AW_NUCLEI_PATCH_H

#include "base/point.h"
#include "image/image.h"

/**
 * AwPatch: the small drawing board of the renderer. One object at a time is laid on it with exact pixel coverage,
 * shaded, blurred and then added to a picture. Sums run in a fixed order, so the same calls give the same bits.
 */
typedef struct {
  AwRect rect;     /* the picture's pixels that the patch covers; may reach beyond the picture */
  double *value;   /* (x1 - x0) x (y1 - y0) values, rows from the top; owned */
  double *scratch; /* as large; owned */
  gsize n_room;    /* values there is memory for */
} AwPatch;

/* Sets all pointers to NULL; aw_patch_clear frees what was got since. A patch is used again and again. */
void aw_patch_init(AwPatch *patch);
void aw_patch_clear(AwPatch *patch);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwPatch, aw_patch_clear)

static inline int aw_patch_width(const AwPatch *patch)
{
  return patch->rect.x1 - patch->rect.x0;
}

static inline int aw_patch_height(const AwPatch *patch)
{
  return patch->rect.y1 - patch->rect.y0;
}

/* The smallest rectangle of pixels that holds the n >= 1 points, widened by `margin_px` on each side. */
AwRect aw_points_rect(const AwPixelPoint *points, gsize n, double margin_px);

/**
 * aw_patch_cover: lays a polygon on an empty patch over `rect`, which must hold it with a pixel to spare all round.
 *
 * Each value becomes the part of the pixel's square (the pixel centre +- 0.5 px) that lies inside, 0 ... 1, exact to
 * rounding for simple polygons of either sense of rotation. AW_ERROR_MEMORY when the patch cannot grow.
 */
gboolean aw_patch_cover(AwPatch *patch, const AwPixelPoint *polygon, gsize n, AwRect rect, GError **error);

/**
 * aw_patch_blur: convolves with a Gaussian of standard deviation sigma_px >= 0, cut off at 4 sigma and normalised.
 * Outside the patch counts as 0: leave a margin of 4 sigma to lose no light.
 */
void aw_patch_blur(AwPatch *patch, double sigma_px);

/* The sum of all values. */
double aw_patch_sum(const AwPatch *patch);

/**
 * aw_patch_add: adds scale x patch to the picture's rows y0 ... y1-1.
 * picture: (y1 - y0) rows of width_px values whose first row is row y0 of the frame; what lies outside is dropped.
 */
void aw_patch_add(const AwPatch *patch, double scale, double *picture, int width_px, int y0, int y1);

#endif

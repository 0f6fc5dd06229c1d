/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_UPRIGHT_H
#define AW_FIGURES_UPRIGHT_H

#include "geometry/pixelmap.h"
#include "record/record.h"

/**
 * AwUpright: the whole dish as one image, as if a single huge camera frame had seen all of it.
 *
 * Scan coordinates run against the image (q = S - A (p - c)), so a map drawn with q as page coordinates would be
 * turned by 180 degrees, or mirrored where A has a mirrored sign. Pictures are therefore laid out in the dish pixel
 *     P = -A^-1 (q - q0)  =  -A^-1 (S - q0) + (p - c),
 * in which a frame is only shifted, never turned, scaled or mirrored: x_px to the right, y_px down, for any A that
 * can be inverted. The camera's rotation shows in the frames' stepwise offsets and in the axis cross.
 */
typedef struct {
  AwMatrix px_per_um; /* -A^-1 */
  AwMatrix um_per_px; /* -A */
  AwScanPoint q0;
} AwUpright;

/* A box of dish pixels. */
typedef struct {
  double x0, y0, x1, y1;
} AwBox;

/* FALSE when A is not finite or cannot be inverted; q0 is where P is 0. */
gboolean aw_upright_make(const AwPixelMap *map, AwScanPoint q0, AwUpright *upright);

AwPixelPoint aw_upright_from_scan(const AwUpright *upright, AwScanPoint q);
AwScanPoint aw_upright_to_scan(const AwUpright *upright, AwPixelPoint dish);

/* The box that a frame covers; its first pixel's centre lies half a pixel inside the corner (x0, y0). */
AwBox aw_upright_frame_box(const AwUpright *upright, const AwFrame *frame);

/* The frame's own pixel coordinate of a dish pixel; also outside the frame. */
AwPixelPoint aw_upright_to_frame(const AwUpright *upright, const AwFrame *frame, AwPixelPoint dish);

/* TRUE for a stage reading that can be drawn: finite and within AW_MAX_COORDINATE_UM. */
gboolean aw_scan_point_is_sane(AwScanPoint q);

/* The smallest box round both; an empty box (x0 > x1) adds nothing. */
AwBox aw_box_union(AwBox a, AwBox b);
extern const AwBox aw_box_empty;

/**
 * The box of all frames that can be placed; without any, that of the nuclei's centroids with a margin. Points that
 * are not finite or beyond AW_MAX_COORDINATE_UM are left out; the result is empty when nothing is left.
 * Either list may be NULL.
 */
AwBox aw_upright_dish_box(const AwUpright *upright, GPtrArray *frames, GPtrArray *nuclei);

#endif

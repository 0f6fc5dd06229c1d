/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_PIXELMAP_H
#define AW_GEOMETRY_PIXELMAP_H

#include "base/point.h"

/* Where a number comes from; every stored term of a calibration carries one. */
typedef enum { AW_ORIGIN_ASSUMED, AW_ORIGIN_ENTERED, AW_ORIGIN_FITTED } AwOrigin;

/* "assumed", "entered" or "fitted". */
const char *aw_origin_name(AwOrigin origin);

/**
 * AwPixelMap: the matrix A of docs/geometry.md, um of stage move per pixel shift of a fixed mark.
 * q = S - A (p - c): the scan coordinate runs against the image.
 */
typedef struct {
  AwMatrix um_per_px;
  AwOrigin origin;
  double rms_um; /* residual per axis of the fit that gave it; 0 unless fitted */
} AwPixelMap;

/* The centre c of a frame of that size. */
AwPixelPoint aw_frame_centre(int width_px, int height_px);

/* q = S - A (p - c). */
AwScanPoint aw_pixel_to_scan(const AwPixelMap *map, AwScanPoint stage, AwPixelPoint centre, AwPixelPoint p);

/* p = c - A^-1 (q - S). */
AwPixelPoint aw_scan_to_pixel(const AwPixelMap *map, AwScanPoint stage, AwPixelPoint centre, AwScanPoint q);

/* The mean um per px: the square root of |det A|. */
double aw_pixel_map_scale(const AwPixelMap *map);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_POINT_H
#define AW_BASE_POINT_H

#include <math.h>

/* Three kinds of points that must never be mixed, hence three C types (docs/geometry.md). */

/* A point of one image: the centre of the first pixel is (0, 0), x to the right, y down. */
typedef struct {
  double x_px, y_px;
} AwPixelPoint;

/* A scan coordinate: the scan-stage reading that would bring the point to the frame's centre. */
typedef struct {
  double x_um, y_um;
} AwScanPoint;

/* A reading of the beam stage. */
typedef struct {
  double bx_um, by_um;
} AwBeamPoint;

/* A 2 x 2 matrix, rows first: (x', y') = (xx x + xy y, yx x + yy y). */
typedef struct {
  double xx, xy, yx, yy;
} AwMatrix;

/* Half-open pixel rectangle: columns x0 <= x < x1, rows y0 <= y < y1. */
typedef struct {
  int x0, y0, x1, y1;
} AwRect;

static inline double aw_matrix_det(AwMatrix m)
{
  return m.xx * m.yy - m.xy * m.yx;
}

/* The inverse of m; the caller has checked that aw_matrix_det (m) is not 0. */
static inline AwMatrix aw_matrix_inverse(AwMatrix m)
{
  double d = aw_matrix_det(m);
  return (AwMatrix){ m.yy / d, -m.xy / d, -m.yx / d, m.xx / d };
}

static inline AwMatrix aw_matrix_multiply(AwMatrix a, AwMatrix b)
{
  return (AwMatrix){ a.xx * b.xx + a.xy * b.yx, a.xx * b.xy + a.xy * b.yy, a.yx * b.xx + a.yy * b.yx,
                     a.yx * b.xy + a.yy * b.yy };
}

#endif

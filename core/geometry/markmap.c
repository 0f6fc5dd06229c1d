/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/markmap.h"

#include <math.h>

#include "base/error.h"
#include "base/text.h"
#include "geometry/overlap_parts.h"

/* Views count as lying on one line when their spread across it is below this part of the spread along it. */
#define MIN_SPREAD_RATIO 1e-3

/* Sums over the centred views. */
typedef struct {
  double sx, sy, px, py; /* means */
  AwMatrix pp, sp, ss;   /* sum p p', sum S p', sum S S' */
} Moments;

static Moments moments_of(const AwMarkView *v, gsize n)
{
  Moments m = { 0 };
  for (gsize i = 0; i < n; i++) {
    m.sx += v[i].stage.x_um / (double)n;
    m.sy += v[i].stage.y_um / (double)n;
    m.px += v[i].p.x_px / (double)n;
    m.py += v[i].p.y_px / (double)n;
  }
  for (gsize i = 0; i < n; i++) {
    double x = v[i].p.x_px - m.px, y = v[i].p.y_px - m.py, u = v[i].stage.x_um - m.sx, w = v[i].stage.y_um - m.sy;
    m.pp = (AwMatrix){ m.pp.xx + x * x, m.pp.xy + x * y, m.pp.yx + x * y, m.pp.yy + y * y };
    m.sp = (AwMatrix){ m.sp.xx + u * x, m.sp.xy + u * y, m.sp.yx + w * x, m.sp.yy + w * y };
    m.ss = (AwMatrix){ m.ss.xx + u * u, m.ss.xy + u * w, m.ss.yx + u * w, m.ss.yy + w * w };
  }
  return m;
}

static gboolean on_one_line(AwMatrix s)
{
  double half = (s.xx + s.yy) / 2;
  return !(half - hypot((s.xx - s.yy) / 2, s.xy) > 2 * MIN_SPREAD_RATIO * MIN_SPREAD_RATIO * half);
}

const char *aw_unit_slip(double ratio)
{
  if (fabs(log(ratio * 1000)) < log(1.2))
    return "mm";
  return fabs(log(ratio / 1000)) < log(1.2) ? "nm" : NULL;
}

static gboolean check_views(const Moments *m, gsize n, GError **error)
{
  if (n < 3) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "%" G_GSIZE_FORMAT " views of the mark are too few; a pixel map needs at least 3", n);
    return FALSE;
  }
  if (!on_one_line(m->ss) && !on_one_line(m->pp))
    return TRUE;
  g_set_error_literal(error, AW_ERROR, AW_ERROR_RANGE,
                      on_one_line(m->ss)
                          ? "the stage readings lie on one line; move the mark along x and along y"
                          : "the mark's pixels lie on one line though the readings do not; was it the same mark?");
  return FALSE;
}

/* Scale, angle and shear of a matrix, in that order. */
static void shape_of(AwMatrix a, double out[3])
{
  double across = atan2(a.yx, a.xx), down = atan2(a.yy, a.xy);
  double sign = aw_matrix_det(a) < 0 ? -1 : 1;
  out[0] = sqrt(fabs(aw_matrix_det(a)));
  out[1] = across;
  out[2] = remainder(sign * (down - across) - G_PI / 2, 2 * G_PI);
}

/* Errors of the shape carried over from those of the matrix by differences; rows are independent. */
static void carry_errors(const AwMarkMap *map, double se[3])
{
  AwMatrix a = map->map.um_per_px, c = map->row_covariance;
  double *element[4] = { &a.xx, &a.xy, &a.yx, &a.yy }, d[4][3], base[3], step = 1e-5 * map->scale;
  shape_of(a, base);
  for (int i = 0; i < 4; i++) {
    double kept = *element[i];
    *element[i] += step;
    shape_of(a, d[i]);
    *element[i] = kept;
    for (int k = 0; k < 3; k++)
      d[i][k] = remainder(d[i][k] - base[k], 2 * G_PI) / step;
  }
  for (int k = 0; k < 3; k++) {
    double var = 0;
    for (int row = 0; row < 4; row += 2)
      var += d[row][k] * d[row][k] * c.xx + 2 * d[row][k] * d[row + 1][k] * c.xy + d[row + 1][k] * d[row + 1][k] * c.yy;
    se[k] = sqrt(var);
  }
}

static void describe(AwMarkMap *map)
{
  AwMatrix a = map->map.um_per_px;
  double shape[3], se[3];
  shape_of(a, shape);
  map->scale = shape[0];
  map->angle_rad = shape[1];
  map->shear_rad = shape[2];
  map->scale_x = hypot(a.xx, a.yx);
  map->scale_y = hypot(a.xy, a.yy);
  map->mirrored = aw_matrix_det(a) < 0;
  carry_errors(map, se);
  map->scale_se = se[0];
  map->angle_se = se[1];
  map->shear_se = se[2];
}

AwScanPoint aw_mark_map_residual(const AwMarkMap *map, const AwMarkView *views, gsize n, gsize i)
{
  AwScanPoint mean = { 0, 0 }, own = { 0, 0 };
  AwPixelPoint origin = { 0, 0 };
  for (gsize k = 0; k < n; k++) {
    AwScanPoint q = aw_pixel_to_scan(&map->map, views[k].stage, origin, views[k].p);
    mean.x_um += q.x_um / (double)n;
    mean.y_um += q.y_um / (double)n;
    own = k == i ? q : own;
  }
  return (AwScanPoint){ own.x_um - mean.x_um, own.y_um - mean.y_um };
}

gboolean aw_mark_map_fit(const AwMarkView *views, gsize n, double pixel_um, AwMarkMap *map, GError **error)
{
  Moments m = moments_of(views, n);
  *map = (AwMarkMap){ .n = n };
  if (!check_views(&m, n, error))
    return FALSE;
  AwMatrix inverse = aw_matrix_inverse(m.pp);
  double rss = 0;
  map->map = (AwPixelMap){ aw_matrix_multiply(m.sp, inverse), AW_ORIGIN_FITTED, 0 };
  for (gsize i = 0; i < n; i++) {
    AwScanPoint r = aw_mark_map_residual(map, views, n, i);
    rss += r.x_um * r.x_um + r.y_um * r.y_um;
  }
  map->n_free = 2 * (int)n - 6;
  map->map.rms_um = sqrt(rss / (2 * (double)n));
  double var = map->n_free > 0 ? rss / map->n_free : NAN;
  map->row_covariance = (AwMatrix){ var * inverse.xx, var * inverse.xy, var * inverse.yx, var * inverse.yy };
  describe(map);
  const char *unit = pixel_um > 0 ? aw_unit_slip(map->scale / pixel_um) : NULL;
  if (!unit)
    return TRUE;
  g_autofree char *found = aw_text_from_double(map->scale, 6), *known = aw_text_from_double_exact(pixel_um);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "the readings give %s um per pixel, but the pixel size is %s um: the um columns seem to hold %s", found,
              known, unit);
  return FALSE;
}

char *aw_mark_map_words(const AwMarkMap *map)
{
  AwMatrix upright = { map->scale, 0, 0, map->scale };
  return aw_overlap_name_difference(upright, map->map.um_per_px);
}

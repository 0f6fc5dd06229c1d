/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/pixelmap.h"

const char *aw_origin_name(AwOrigin origin)
{
  static const char *const names[] = { "assumed", "entered", "fitted" };
  return names[origin];
}

AwPixelPoint aw_frame_centre(int width_px, int height_px)
{
  return (AwPixelPoint){ (width_px - 1) / 2.0, (height_px - 1) / 2.0 };
}

AwScanPoint aw_pixel_to_scan(const AwPixelMap *map, AwScanPoint stage, AwPixelPoint centre, AwPixelPoint p)
{
  double dx = p.x_px - centre.x_px, dy = p.y_px - centre.y_px;
  AwMatrix a = map->um_per_px;
  return (AwScanPoint){ stage.x_um - (a.xx * dx + a.xy * dy), stage.y_um - (a.yx * dx + a.yy * dy) };
}

AwPixelPoint aw_scan_to_pixel(const AwPixelMap *map, AwScanPoint stage, AwPixelPoint centre, AwScanPoint q)
{
  AwMatrix inv = aw_matrix_inverse(map->um_per_px);
  double dx = q.x_um - stage.x_um, dy = q.y_um - stage.y_um;
  return (AwPixelPoint){ centre.x_px - (inv.xx * dx + inv.xy * dy), centre.y_px - (inv.yx * dx + inv.yy * dy) };
}

double aw_pixel_map_scale(const AwPixelMap *map)
{
  return sqrt(fabs(aw_matrix_det(map->um_per_px)));
}

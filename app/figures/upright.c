/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/upright.h"

#include "base/limits.h"

const AwBox aw_box_empty = { 1, 1, -1, -1 };

gboolean aw_upright_make(const AwPixelMap *map, AwScanPoint q0, AwUpright *upright)
{
  AwMatrix a = { -map->um_per_px.xx, -map->um_per_px.xy, -map->um_per_px.yx, -map->um_per_px.yy };
  double size = fabs(a.xx) + fabs(a.xy) + fabs(a.yx) + fabs(a.yy);
  double det = fabs(aw_matrix_det(a));
  if (!isfinite(size) || !(det > 1e-9 * size * size) || !aw_scan_point_is_sane(q0))
    return FALSE;
  *upright = (AwUpright){ aw_matrix_inverse(a), a, q0 };
  return TRUE;
}

AwPixelPoint aw_upright_from_scan(const AwUpright *upright, AwScanPoint q)
{
  AwMatrix m = upright->px_per_um;
  double dx = q.x_um - upright->q0.x_um, dy = q.y_um - upright->q0.y_um;
  return (AwPixelPoint){ m.xx * dx + m.xy * dy, m.yx * dx + m.yy * dy };
}

AwScanPoint aw_upright_to_scan(const AwUpright *upright, AwPixelPoint dish)
{
  AwMatrix m = upright->um_per_px;
  return (AwScanPoint){ upright->q0.x_um + m.xx * dish.x_px + m.xy * dish.y_px,
                        upright->q0.y_um + m.yx * dish.x_px + m.yy * dish.y_px };
}

AwBox aw_upright_frame_box(const AwUpright *upright, const AwFrame *frame)
{
  AwPixelPoint c = aw_upright_from_scan(upright, frame->stage);
  double hx = frame->width_px / 2.0, hy = frame->height_px / 2.0;
  return (AwBox){ c.x_px - hx, c.y_px - hy, c.x_px + hx, c.y_px + hy };
}

AwPixelPoint aw_upright_to_frame(const AwUpright *upright, const AwFrame *frame, AwPixelPoint dish)
{
  AwPixelPoint at = aw_upright_from_scan(upright, frame->stage);
  AwPixelPoint c = aw_frame_centre(frame->width_px, frame->height_px);
  return (AwPixelPoint){ dish.x_px - at.x_px + c.x_px, dish.y_px - at.y_px + c.y_px };
}

gboolean aw_scan_point_is_sane(AwScanPoint q)
{
  return fabs(q.x_um) <= AW_MAX_COORDINATE_UM && fabs(q.y_um) <= AW_MAX_COORDINATE_UM;
}

AwBox aw_box_union(AwBox a, AwBox b)
{
  if (a.x0 > a.x1)
    return b;
  if (b.x0 > b.x1)
    return a;
  return (AwBox){ MIN(a.x0, b.x0), MIN(a.y0, b.y0), MAX(a.x1, b.x1), MAX(a.y1, b.y1) };
}

static AwBox centroid_box(const AwUpright *upright, GPtrArray *nuclei)
{
  AwBox box = aw_box_empty;
  double margin_um = 0;
  for (guint i = 0; nuclei && i < nuclei->len; i++) {
    const AwNucleus *nucleus = nuclei->pdata[i];
    if (!aw_scan_point_is_sane(nucleus->centroid))
      continue;
    AwPixelPoint p = aw_upright_from_scan(upright, nucleus->centroid);
    box = aw_box_union(box, (AwBox){ p.x_px, p.y_px, p.x_px, p.y_px });
    if (nucleus->diameter > margin_um && nucleus->diameter < AW_MAX_COORDINATE_UM)
      margin_um = nucleus->diameter;
  }
  AwPixelMap map = { .um_per_px = upright->um_per_px };
  double margin_px = margin_um / aw_pixel_map_scale(&map) + 10;
  if (box.x0 > box.x1)
    return box;
  return (AwBox){ box.x0 - margin_px, box.y0 - margin_px, box.x1 + margin_px, box.y1 + margin_px };
}

AwBox aw_upright_dish_box(const AwUpright *upright, GPtrArray *frames, GPtrArray *nuclei)
{
  AwBox box = aw_box_empty;
  for (guint i = 0; frames && i < frames->len; i++) {
    const AwFrame *frame = frames->pdata[i];
    if (aw_scan_point_is_sane(frame->stage) && frame->width_px > 0 && frame->height_px > 0)
      box = aw_box_union(box, aw_upright_frame_box(upright, frame));
  }
  return box.x0 > box.x1 ? centroid_box(upright, nuclei) : box;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/measure.h"

#include <string.h>

#include "geometry/contour.h"
#include "geometry/outline.h"
#include "nuclei/light.h"
#include "nuclei/runs.h"
#include "nuclei/shape.h"

AwPlacement aw_placement_loose(int width_px, int height_px)
{
  return (AwPlacement){ .map = { .um_per_px = { -1, 0, 0, -1 } },
                        .frame_width_px = width_px,
                        .frame_height_px = height_px };
}

/* The outline of the runs' largest part, holes filled, in px of the image. */
static void set_outline(AwNucleus *nucleus, AwRect box, GArray *points)
{
  int margin = AW_CONTOUR_MARGIN_PX, w = box.x1 - box.x0 + 2 * margin, h = box.y1 - box.y0 + 2 * margin;
  g_autofree guint8 *mask = g_malloc0((gsize)w * (gsize)h);
  AwRaster raster = { mask, w, h };
  for (gsize i = 0; i < nucleus->n_runs; i++) {
    AwRun r = nucleus->runs[i];
    gsize at = (gsize)(r.y - box.y0 + margin) * (gsize)w + (gsize)(r.x0 - box.x0 + margin);
    memset(mask + at, 1, (gsize)(r.x1 - r.x0));
  }
  if (!aw_runs_are_plain(nucleus->runs, nucleus->n_runs))
    aw_raster_clean(&raster);
  aw_contour_trace(&raster, points);
  nucleus->n_outline = points->len;
  nucleus->outline = g_memdup2(points->data, points->len * sizeof(AwScanPoint));
  for (gsize i = 0; i < nucleus->n_outline; i++) {
    nucleus->outline[i].x_um += box.x0 - margin;
    nucleus->outline[i].y_um += box.y0 - margin;
  }
}

static void set_shape(AwNucleus *nucleus)
{
  AwMoments m = aw_runs_moments(nucleus->runs, nucleus->n_runs);
  nucleus->centroid_px = (AwPixelPoint){ m.x_px, m.y_px };
  nucleus->centroid = (AwScanPoint){ m.x_px, m.y_px };
  nucleus->area = (double)m.n_px;
  nucleus->diameter = 2 * sqrt(nucleus->area / G_PI);
  nucleus->convexity = nucleus->area / (double)aw_runs_hull_px(nucleus->runs, nucleus->n_runs);
  aw_ellipse_from_covariance(m.xx, m.xy, m.yy, &nucleus->major, &nucleus->minor, &nucleus->angle_rad);
}

static AwNucleus *make_nucleus(const AwRunTable *table, guint32 label, GArray *points)
{
  AwNucleus *nucleus = g_new0(AwNucleus, 1);
  nucleus->n_runs = table->first[label + 1] - table->first[label];
  nucleus->runs = g_memdup2(table->runs + table->first[label], nucleus->n_runs * sizeof(AwRun));
  nucleus->n_views = 1;
  nucleus->flags = table->touching[label] ? AW_FLAG_TOUCHING : 0;
  set_shape(nucleus);
  set_outline(nucleus, aw_runs_box(nucleus->runs, nucleus->n_runs), points);
  return nucleus;
}

GPtrArray *aw_measure_masks(const AwImage *image, const AwLabels *labels, const AwSegmentInfo *info,
                            double saturation_level, GError **error)
{
  g_return_val_if_fail(image && labels, NULL);
  g_return_val_if_fail(image->width_px == labels->width_px && image->height_px == labels->height_px, NULL);
  g_autoptr(AwRunTable) table = aw_run_table_new(labels, error);
  if (!table)
    return NULL;
  GPtrArray *nuclei = aw_nuclei_new();
  g_autoptr(GArray) points = g_array_new(FALSE, FALSE, sizeof(AwScanPoint));
  for (guint32 label = 1; label <= labels->n_labels; label++) {
    AwNucleus *nucleus = make_nucleus(table, label, points);
    nucleus->confidence = info ? info[label].confidence : 1;
    aw_light_measure(image, labels, label, saturation_level, nucleus);
    g_ptr_array_add(nuclei, nucleus);
  }
  aw_light_settle(image, nuclei);
  return nuclei;
}

static void move_pixels(AwNucleus *nucleus, const AwPlacement *placement)
{
  int x = placement->x_offset_px, y = placement->y_offset_px;
  for (gsize i = 0; i < nucleus->n_runs; i++) {
    AwRun *r = &nucleus->runs[i];
    *r = (AwRun){ r->y + y, r->x0 + x, r->x1 + x };
    if (r->y <= 0 || r->x0 <= 0 || r->y >= placement->frame_height_px - 1 || r->x1 >= placement->frame_width_px)
      nucleus->flags |= AW_FLAG_BORDER;
  }
  nucleus->centroid_px.x_px += x;
  nucleus->centroid_px.y_px += y;
}

void aw_nucleus_place(AwNucleus *nucleus, const AwPlacement *placement)
{
  AwMatrix a = placement->map.um_per_px;
  AwMatrix back = { -a.xx, -a.xy, -a.yx, -a.yy };
  AwScanPoint centre = { placement->centre.x_px - placement->x_offset_px,
                         placement->centre.y_px - placement->y_offset_px };
  double scale = aw_pixel_map_scale(&placement->map);
  move_pixels(nucleus, placement);
  nucleus->centroid = aw_pixel_to_scan(&placement->map, placement->stage, placement->centre, nucleus->centroid_px);
  aw_outline_map(nucleus->outline, nucleus->n_outline, back, centre, placement->stage);
  aw_ellipse_map(a, &nucleus->major, &nucleus->minor, &nucleus->angle_rad);
  nucleus->area *= scale * scale;
  nucleus->diameter *= scale;
  nucleus->sharpness /= scale;
}

GPtrArray *aw_measure_nuclei(const AwImage *image, const AwLabels *labels, const AwSegmentInfo *info,
                             const AwPlacement *placement, double saturation_level, GError **error)
{
  g_return_val_if_fail(placement && fabs(aw_matrix_det(placement->map.um_per_px)) > 0, NULL);
  g_autoptr(GPtrArray) nuclei = aw_measure_masks(image, labels, info, saturation_level, error);
  if (!nuclei)
    return NULL;
  for (guint i = 0; i < nuclei->len; i++)
    aw_nucleus_place(nuclei->pdata[i], placement);
  aw_measure_relations(nuclei);
  return g_steal_pointer(&nuclei);
}

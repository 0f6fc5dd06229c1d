/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/overlay.h"

#include <stdlib.h>

#include "view/overlay_parts.h"

#define OUTLINE_FROM 6.0 /* typical diameter from which outlines are drawn, logical px */
#define MAX_FULL 500     /* nuclei in view that are drawn in full style: about 4 us each */

struct AwOverlay {
  AwRaster *raster;
};

AwDetail aw_overlay_detail(double size_px, gsize n_in_view)
{
  if (!(size_px >= OUTLINE_FROM))
    return AW_DETAIL_MARKS;
  return n_in_view <= MAX_FULL ? AW_DETAIL_FULL : AW_DETAIL_HAIRLINE;
}

static int by_size(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

double aw_overlay_typical_um(GPtrArray *nuclei)
{
  g_autofree double *sizes = g_new(double, nuclei->len + 1);
  gsize n = 0;
  for (guint i = 0; i < nuclei->len; i++) {
    double d = ((const AwNucleus *)nuclei->pdata[i])->diameter;
    if (d > 0 && isfinite(d))
      sizes[n++] = d;
  }
  qsort(sizes, n, sizeof *sizes, by_size);
  return n ? sizes[n / 2] : 1;
}

AwOverlay *aw_overlay_new(void)
{
  AwOverlay *overlay = g_new0(AwOverlay, 1);
  overlay->raster = aw_raster_new();
  return overlay;
}

void aw_overlay_free(AwOverlay *overlay)
{
  if (!overlay)
    return;
  aw_raster_free(overlay->raster);
  g_free(overlay);
}

/* Nuclei in view: those over the upright rectangle round the turned view; a few too many do no harm. */
static GArray *find_in_view(const AwScene *scene, const AwViewport *view)
{
  AwScanPoint low = { INFINITY, INFINITY }, high = { -INFINITY, -INFINITY };
  for (int i = 0; i < 4; i++) {
    AwScreenPoint corner = { i & 1 ? view->width : 0, i & 2 ? view->height : 0 };
    AwScanPoint q = aw_viewport_to_scan(view, scene->upright, corner);
    low = (AwScanPoint){ MIN(low.x_um, q.x_um), MIN(low.y_um, q.y_um) };
    high = (AwScanPoint){ MAX(high.x_um, q.x_um), MAX(high.y_um, q.y_um) };
  }
  return aw_hit_in_rectangle(scene->index, low, high);
}

static AwPass start(AwOverlay *overlay, cairo_t *cr, const AwScene *scene, const AwViewport *view)
{
  AwMatrix m = scene->upright->px_per_um;
  AwPass pass = { .scene = scene, .view = view, .cr = cr, .raster = overlay->raster, .u = scene->scale };
  pass.centroid = aw_hit_centroids(scene->index);
  pass.px_per_um = (AwMatrix){ m.xx * view->zoom, m.xy * view->zoom, m.yx * view->zoom, m.yy * view->zoom };
  pass.origin = aw_viewport_from_dish(view, (AwPixelPoint){ 0, 0 });
  pass.size = scene->nucleus_um * sqrt(fabs(aw_matrix_det(pass.px_per_um)));
  return pass;
}

gsize aw_overlay_draw(AwOverlay *overlay, cairo_t *cr, const AwScene *scene, const AwViewport *view)
{
  g_return_val_if_fail(overlay && cr && scene && view && scene->scale > 0, 0);
  if (!aw_raster_begin(overlay->raster, (int)ceil(view->width), (int)ceil(view->height)))
    return 0;
  AwPass pass = start(overlay, cr, scene, view);
  g_autoptr(GArray) item = find_in_view(scene, view);
  AwDetail detail = aw_overlay_detail(pass.size / pass.u, item->len);
  pass.stop = aw_overlay_stops(&pass);
  cairo_save(cr);
  aw_overlay_tour(&pass);
  aw_overlay_nuclei(&pass, item, detail);
  aw_raster_paint(pass.raster, cr);
  if (scene->show_labels)
    aw_overlay_numbers(&pass, item);
  aw_overlay_signs(&pass);
  cairo_restore(cr);
  g_free(pass.stop);
  return item->len;
}

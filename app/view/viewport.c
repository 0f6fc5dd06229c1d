/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/viewport.h"

static double fit_zoom(const AwViewport *view)
{
  double rim = 2 * AW_FIT_MARGIN_FRAC * MIN(view->width, view->height);
  double across = (view->width - rim) / (view->dish.x1 - view->dish.x0);
  double down = (view->height - rim) / (view->dish.y1 - view->dish.y0);
  return MIN(MIN(across, down), AW_MAX_ZOOM);
}

/* The dish can be made half as large as fits, no smaller; its middle can be left, the dish itself cannot. */
static void clamp(AwViewport *view)
{
  double least = fit_zoom(view) / 2;
  view->zoom = CLAMP(view->zoom, least, AW_MAX_ZOOM);
  view->centre.x_px = CLAMP(view->centre.x_px, view->dish.x0, view->dish.x1);
  view->centre.y_px = CLAMP(view->centre.y_px, view->dish.y0, view->dish.y1);
}

AwViewport aw_viewport_new(AwBox dish, double width, double height)
{
  double span = dish.x1 - dish.x0 + dish.y1 - dish.y0;
  if (!(dish.x1 > dish.x0) || !(dish.y1 > dish.y0) || !isfinite(span))
    dish = (AwBox){ 0, 0, 1, 1 };
  AwViewport view = { .width = MAX(width, 1), .height = MAX(height, 1), .dish = dish };
  aw_viewport_fit(&view);
  return view;
}

void aw_viewport_fit(AwViewport *view)
{
  view->centre = (AwPixelPoint){ (view->dish.x0 + view->dish.x1) / 2, (view->dish.y0 + view->dish.y1) / 2 };
  view->zoom = fit_zoom(view);
}

gboolean aw_viewport_is_fit(const AwViewport *view)
{
  AwViewport fit = *view;
  aw_viewport_fit(&fit);
  return fabs(view->zoom / fit.zoom - 1) < 1e-9 && fabs(view->centre.x_px - fit.centre.x_px) * fit.zoom < 1e-3 &&
         fabs(view->centre.y_px - fit.centre.y_px) * fit.zoom < 1e-3;
}

void aw_viewport_resize(AwViewport *view, double width, double height)
{
  gboolean fit = aw_viewport_is_fit(view);
  view->width = MAX(width, 1);
  view->height = MAX(height, 1);
  if (fit)
    aw_viewport_fit(view);
  clamp(view);
}

void aw_viewport_pan(AwViewport *view, double dx, double dy)
{
  g_return_if_fail(isfinite(dx) && isfinite(dy));
  view->centre.x_px -= dx / view->zoom;
  view->centre.y_px -= dy / view->zoom;
  clamp(view);
}

void aw_viewport_zoom_at(AwViewport *view, double factor, AwScreenPoint at)
{
  g_return_if_fail(factor > 0 && isfinite(factor) && isfinite(at.sx) && isfinite(at.sy));
  AwPixelPoint held = aw_viewport_to_dish(view, at);
  view->zoom *= factor;
  clamp(view);
  view->centre.x_px = held.x_px - (at.sx - view->width / 2) / view->zoom;
  view->centre.y_px = held.y_px - (at.sy - view->height / 2) / view->zoom;
  clamp(view);
}

void aw_viewport_show(AwViewport *view, AwBox box, double margin, double max_zoom)
{
  g_return_if_fail(box.x1 >= box.x0 && box.y1 >= box.y0 && isfinite(box.x1 - box.x0 + box.y1 - box.y0));
  double across = MAX(view->width - 2 * margin, 1) / MAX(box.x1 - box.x0, 1e-6);
  double down = MAX(view->height - 2 * margin, 1) / MAX(box.y1 - box.y0, 1e-6);
  view->centre = (AwPixelPoint){ (box.x0 + box.x1) / 2, (box.y0 + box.y1) / 2 };
  view->zoom = MIN(MIN(across, down), max_zoom);
  clamp(view);
}

AwScreenPoint aw_viewport_from_dish(const AwViewport *view, AwPixelPoint dish)
{
  return (AwScreenPoint){ view->width / 2 + (dish.x_px - view->centre.x_px) * view->zoom,
                          view->height / 2 + (dish.y_px - view->centre.y_px) * view->zoom };
}

AwPixelPoint aw_viewport_to_dish(const AwViewport *view, AwScreenPoint at)
{
  return (AwPixelPoint){ view->centre.x_px + (at.sx - view->width / 2) / view->zoom,
                         view->centre.y_px + (at.sy - view->height / 2) / view->zoom };
}

AwScreenPoint aw_viewport_from_scan(const AwViewport *view, const AwUpright *upright, AwScanPoint q)
{
  return aw_viewport_from_dish(view, aw_upright_from_scan(upright, q));
}

AwScanPoint aw_viewport_to_scan(const AwViewport *view, const AwUpright *upright, AwScreenPoint at)
{
  return aw_upright_to_scan(upright, aw_viewport_to_dish(view, at));
}

AwBox aw_viewport_visible(const AwViewport *view)
{
  double hx = view->width / 2 / view->zoom, hy = view->height / 2 / view->zoom;
  return (AwBox){ view->centre.x_px - hx, view->centre.y_px - hy, view->centre.x_px + hx, view->centre.y_px + hy };
}

gboolean aw_box_overlap(AwBox a, AwBox b)
{
  return a.x0 < b.x1 && b.x0 < a.x1 && a.y0 < b.y1 && b.y0 < a.y1;
}

int aw_view_frame_at(const AwUpright *upright, GPtrArray *frames, AwPixelPoint dish, AwPixelPoint *pixel)
{
  for (guint i = frames->len; i > 0; i--) {
    const AwFrame *frame = frames->pdata[i - 1];
    AwPixelPoint p = aw_upright_to_frame(upright, frame, dish);
    if (!(p.x_px >= -0.5 && p.x_px < frame->width_px - 0.5 && p.y_px >= -0.5 && p.y_px < frame->height_px - 0.5))
      continue;
    if (pixel)
      *pixel = p;
    return (int)i - 1;
  }
  return -1;
}

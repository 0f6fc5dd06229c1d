/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "view/viewport.h"

static const AwBox dish = { -200, 100, 3800, 2100 }; /* 4000 x 2000 dish px */

static void near(AwScreenPoint a, double sx, double sy)
{
  g_assert_cmpfloat_with_epsilon(a.sx, sx, 1e-6);
  g_assert_cmpfloat_with_epsilon(a.sy, sy, 1e-6);
}

static void fit(void)
{
  AwViewport view = aw_viewport_new(dish, 1000, 800);
  g_assert_cmpfloat_with_epsilon(view.zoom, (1000 - 0.04 * 800) / 4000, 1e-12);
  near(aw_viewport_from_dish(&view, (AwPixelPoint){ 1800, 1100 }), 500, 400);
  near(aw_viewport_from_dish(&view, (AwPixelPoint){ -200, 1100 }), 16, 400);
  g_assert_true(aw_viewport_is_fit(&view));
  aw_viewport_zoom_at(&view, 2, (AwScreenPoint){ 0, 0 });
  g_assert_false(aw_viewport_is_fit(&view));
  aw_viewport_fit(&view);
  g_assert_true(aw_viewport_is_fit(&view));
}

static void zoom_holds_point(void)
{
  AwViewport view = aw_viewport_new(dish, 1000, 800);
  AwScreenPoint at = { 333, 417 };
  AwPixelPoint before = aw_viewport_to_dish(&view, at);
  for (int i = 0; i < 12; i++) {
    aw_viewport_zoom_at(&view, 1.37, at);
    near(aw_viewport_from_dish(&view, before), 333, 417);
  }
  aw_viewport_zoom_at(&view, 1e9, at);
  g_assert_cmpfloat(view.zoom, ==, AW_MAX_ZOOM);
  near(aw_viewport_from_dish(&view, before), 333, 417);
  aw_viewport_zoom_at(&view, 1e-9, at);
  g_assert_cmpfloat_with_epsilon(view.zoom, (1000 - 32) / 4000.0 / 2, 1e-12);
}

static void pan_stops_at_dish(void)
{
  AwViewport view = aw_viewport_new(dish, 1000, 800);
  aw_viewport_zoom_at(&view, 8, (AwScreenPoint){ 500, 400 });
  AwPixelPoint held = aw_viewport_to_dish(&view, (AwScreenPoint){ 100, 100 });
  aw_viewport_pan(&view, 30, -12);
  near(aw_viewport_from_dish(&view, held), 130, 88);
  aw_viewport_pan(&view, 1e7, 1e7);
  g_assert_cmpfloat(view.centre.x_px, ==, -200);
  g_assert_cmpfloat(view.centre.y_px, ==, 100);
  aw_viewport_pan(&view, -1e7, -1e7);
  g_assert_cmpfloat(view.centre.x_px, ==, 3800);
  g_assert_cmpfloat(view.centre.y_px, ==, 2100);
}

static void resize(void)
{
  AwViewport view = aw_viewport_new(dish, 1000, 800);
  aw_viewport_resize(&view, 500, 700);
  g_assert_true(aw_viewport_is_fit(&view));
  aw_viewport_zoom_at(&view, 5, (AwScreenPoint){ 10, 10 });
  AwViewport kept = view;
  aw_viewport_resize(&view, 900, 650);
  g_assert_cmpfloat(view.zoom, ==, kept.zoom);
  g_assert_cmpfloat(view.centre.x_px, ==, kept.centre.x_px);
  aw_viewport_resize(&view, 0, -5);
  g_assert_cmpfloat(view.width, ==, 1);
  g_assert_cmpfloat(view.height, ==, 1);
}

static void show_box(void)
{
  AwViewport view = aw_viewport_new(dish, 1000, 800);
  aw_viewport_show(&view, (AwBox){ 1000, 500, 1100, 600 }, 100, 40);
  g_assert_cmpfloat_with_epsilon(view.zoom, 6, 1e-12);
  near(aw_viewport_from_dish(&view, (AwPixelPoint){ 1050, 550 }), 500, 400);
  aw_viewport_show(&view, (AwBox){ 1000, 500, 1000, 500 }, 100, 4);
  g_assert_cmpfloat(view.zoom, ==, 4);
  AwBox seen = aw_viewport_visible(&view);
  g_assert_cmpfloat_with_epsilon(seen.x0, 875, 1e-9);
  g_assert_cmpfloat_with_epsilon(seen.y1, 600, 1e-9);
}

static void useless_dish(void)
{
  static const AwBox boxes[] = { { 1, 1, -1, -1 }, { 0, 0, NAN, 5 }, { -INFINITY, 0, INFINITY, 1 } };
  for (gsize i = 0; i < G_N_ELEMENTS(boxes); i++) {
    AwViewport view = aw_viewport_new(boxes[i], 100, 100);
    g_assert_cmpfloat(view.zoom, ==, AW_MAX_ZOOM);
    g_assert_true(isfinite(view.centre.x_px));
  }
}

/* Screen, scan and frame pixels there and back; the frame on top is the later one. */
static void frames_under_pointer(void)
{
  AwPixelMap map = { { 0.6, -0.1, 0.12, 0.61 }, AW_ORIGIN_FITTED, 0.1 };
  AwFrame first = { .width_px = 400, .height_px = 300, .stage = { 0, 0 } };
  AwFrame second = { .width_px = 400, .height_px = 300, .stage = { -150, 20 } };
  GPtrArray *frames = g_ptr_array_new();
  g_ptr_array_add(frames, &first);
  g_ptr_array_add(frames, &second);
  AwUpright up;
  g_assert_true(aw_upright_make(&map, first.stage, &up));
  AwViewport view = aw_viewport_new(aw_upright_dish_box(&up, frames, NULL), 1280, 720);
  AwPixelPoint corner = { 395, 8 }, c = aw_frame_centre(400, 300), p;
  AwScanPoint q = aw_pixel_to_scan(&map, first.stage, c, (AwPixelPoint){ 20, 30 });
  AwScreenPoint at = aw_viewport_from_scan(&view, &up, q);
  AwScanPoint back = aw_viewport_to_scan(&view, &up, at);
  g_assert_cmpfloat_with_epsilon(back.x_um, q.x_um, 1e-9);
  g_assert_cmpfloat_with_epsilon(back.y_um, q.y_um, 1e-9);
  g_assert_cmpint(aw_view_frame_at(&up, frames, aw_viewport_to_dish(&view, at), &p), ==, 0);
  g_assert_cmpfloat_with_epsilon(p.x_px, 20, 1e-9);
  g_assert_cmpfloat_with_epsilon(p.y_px, 30, 1e-9);
  q = aw_pixel_to_scan(&map, second.stage, c, corner);
  g_assert_cmpint(aw_view_frame_at(&up, frames, aw_upright_from_scan(&up, q), &p), ==, 1);
  g_assert_cmpfloat_with_epsilon(p.x_px, corner.x_px, 1e-9);
  g_assert_cmpint(aw_view_frame_at(&up, frames, (AwPixelPoint){ -5000, 0 }, NULL), ==, -1);
  g_ptr_array_unref(frames);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/view/viewport/fit", fit);
  g_test_add_func("/view/viewport/zoom_holds_point", zoom_holds_point);
  g_test_add_func("/view/viewport/pan_stops_at_dish", pan_stops_at_dish);
  g_test_add_func("/view/viewport/resize", resize);
  g_test_add_func("/view/viewport/show_box", show_box);
  g_test_add_func("/view/viewport/useless_dish", useless_dish);
  g_test_add_func("/view/viewport/frames_under_pointer", frames_under_pointer);
  return g_test_run();
}

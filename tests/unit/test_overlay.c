/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "support/fake_dish.h"
#include "view/overlay.h"

#define W 360
#define H 240

typedef struct {
  FakeDish *dish;
  AwUpright upright;
  AwHitIndex *index;
  guint *tour;
  AwScanPoint *aim;
  guint8 *marks;
  AwScene scene;
} Stage;

/* Nine frames, 300 nuclei, some of them marked; everything shown. */
static void set_up(Stage *stage, gconstpointer data)
{
  (void)data;
  FakeDishSettings s = fake_dish_defaults();
  s.overview_px = 0;
  s.n_nuclei = 300;
  stage->dish = fake_dish_new(&s);
  GPtrArray *nuclei = stage->dish->nuclei;
  const AwFrame *first = stage->dish->frames->pdata[0];
  g_assert_true(aw_upright_make(&stage->dish->map, first->stage, &stage->upright));
  stage->index = aw_hit_index_new(nuclei);
  stage->tour = g_new(guint, nuclei->len);
  stage->aim = g_new(AwScanPoint, nuclei->len);
  stage->marks = g_new0(guint8, nuclei->len);
  for (guint i = 0; i < stage->dish->tour->len; i++)
    stage->tour[i] = (guint)g_array_index(stage->dish->tour, gint64, i) - 1;
  for (guint i = 0; i < nuclei->len; i++) {
    stage->aim[i] = ((const AwNucleus *)nuclei->pdata[i])->centroid;
    stage->marks[i] = (guint8)((i % 7 == 0 ? AW_MARK_SELECTED : 0) | (i % 5 == 0 ? AW_MARK_CAUTION : 0));
  }
  stage->scene = (AwScene){ .upright = &stage->upright,
                            .nuclei = nuclei,
                            .index = stage->index,
                            .state = stage->dish->state,
                            .marks = stage->marks,
                            .aim = stage->aim,
                            .nucleus_um = aw_overlay_typical_um(nuclei),
                            .current = 100,
                            .tour = stage->tour,
                            .n_tour = stage->dish->tour->len,
                            .n_done = 10,
                            .show_labels = TRUE,
                            .scale = 1 };
}

static void tear_down(Stage *stage, gconstpointer data)
{
  (void)data;
  aw_hit_index_free(stage->index);
  g_free(stage->tour);
  g_free(stage->aim);
  g_free(stage->marks);
  fake_dish_free(stage->dish);
}

static AwViewport view_of(const Stage *stage)
{
  return aw_viewport_new(aw_upright_dish_box(&stage->upright, stage->dish->frames, NULL), W, H);
}

/* A view with the current nucleus in the middle and that many screen px per dish px. */
static AwViewport close_up(const Stage *stage, double zoom)
{
  AwViewport view = view_of(stage);
  const AwNucleus *nucleus = stage->dish->nuclei->pdata[stage->scene.current];
  AwPixelPoint p = aw_upright_from_scan(&stage->upright, nucleus->centroid);
  aw_viewport_show(&view, (AwBox){ p.x_px, p.y_px, p.x_px, p.y_px }, 0, zoom);
  return view;
}

static cairo_surface_t *draw(const AwScene *scene, const AwViewport *view, gsize *n_in_view)
{
  g_autoptr(AwOverlay) overlay = aw_overlay_new();
  cairo_surface_t *page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, W, H);
  cairo_t *cr = cairo_create(page);
  cairo_set_source_rgb(cr, 0.2, 0.2, 0.2);
  cairo_paint(cr);
  gsize n = aw_overlay_draw(overlay, cr, scene, view);
  if (n_in_view)
    *n_in_view = n;
  g_assert_cmpint(cairo_status(cr), ==, CAIRO_STATUS_SUCCESS);
  cairo_destroy(cr);
  cairo_surface_flush(page);
  return page;
}

static const unsigned char *pixel(cairo_surface_t *page, int x, int y)
{
  return cairo_image_surface_get_data(page) + y * cairo_image_surface_get_stride(page) + 4 * x;
}

/**
 * The page against tests/pictures/NAME: the mean difference must stay under 2 of 255, which leaves room for another
 * version of cairo and none for a mark out of place. AIMWELL_KEEP=1 writes the pictures anew, to be looked at.
 */
static void check_kept(cairo_surface_t *page, const char *name)
{
  g_autofree char *path = g_build_filename("tests", "pictures", name, NULL);
  if (g_getenv("AIMWELL_KEEP"))
    cairo_surface_write_to_png(page, path);
  cairo_surface_t *kept = cairo_image_surface_create_from_png(path);
  g_assert_cmpint(cairo_surface_status(kept), ==, CAIRO_STATUS_SUCCESS);
  g_assert_cmpint(cairo_image_surface_get_width(kept), ==, W);
  double sum = 0;
  for (int y = 0; y < H; y++)
    for (int x = 0; x < 4 * W; x++)
      if (x % 4 != 3)
        sum += abs(pixel(page, 0, y)[x] - pixel(kept, 0, y)[x]);
  g_assert_cmpfloat(sum / (3.0 * W * H), <, 2);
  cairo_surface_destroy(kept);
}

static void kept_pictures(Stage *stage, gconstpointer data)
{
  (void)data;
  static const char *const names[] = { "overlay-marks.png", "overlay-outlines.png", "overlay-close.png" };
  static const double zooms[] = { 0.11, 0.6, 2.5 };
  for (gsize i = 0; i < G_N_ELEMENTS(names); i++) {
    AwViewport view = close_up(stage, zooms[i]);
    cairo_surface_t *page = draw(&stage->scene, &view, NULL);
    check_kept(page, names[i]);
    cairo_surface_destroy(page);
  }
}

static void detail(void)
{
  g_assert_cmpint(aw_overlay_detail(2, 20000), ==, AW_DETAIL_MARKS);
  g_assert_cmpint(aw_overlay_detail(5.9, 1), ==, AW_DETAIL_MARKS);
  g_assert_cmpint(aw_overlay_detail(6.1, 10000), ==, AW_DETAIL_HAIRLINE);
  g_assert_cmpint(aw_overlay_detail(6.1, 400), ==, AW_DETAIL_FULL);
  g_assert_cmpint(aw_overlay_detail(NAN, 1), ==, AW_DETAIL_MARKS);
}

/* The ink of an accepted nucleus's outline lies where the outline is, and nowhere near the middle of the ring. */
static void outline_in_place(Stage *stage, gconstpointer data)
{
  (void)data;
  stage->scene.tour = NULL;
  stage->scene.aim = NULL;
  stage->scene.marks = NULL;
  guint i = 0;
  while (stage->scene.state[i] != AW_STATE_ACCEPTED)
    i++;
  stage->scene.current = (int)i;
  AwViewport view = close_up(stage, 4);
  stage->scene.current = -1;
  cairo_surface_t *page = draw(&stage->scene, &view, NULL);
  const AwNucleus *nucleus = stage->dish->nuclei->pdata[i];
  for (gsize k = 0; k < nucleus->n_outline; k++) {
    AwScreenPoint p = aw_viewport_from_scan(&view, &stage->upright, nucleus->outline[k]);
    const unsigned char *on = pixel(page, (int)p.sx, (int)p.sy);
    const unsigned char *in = pixel(page, (int)((p.sx + W / 2.0) / 2), (int)((p.sy + H / 2.0) / 2));
    g_assert_cmpint(on[0], >, 150); /* blue */
    g_assert_cmpint(on[2], <, 110); /* red */
    g_assert_cmpint(in[0], <, 80);
  }
  cairo_surface_destroy(page);
}

static void counts_in_view(Stage *stage, gconstpointer data)
{
  (void)data;
  gsize n = 0;
  AwViewport view = view_of(stage);
  cairo_surface_destroy(draw(&stage->scene, &view, &n));
  g_assert_cmpuint(n, ==, stage->dish->nuclei->len);
  view = close_up(stage, 4);
  cairo_surface_destroy(draw(&stage->scene, &view, &n));
  g_assert_cmpuint(n, >=, 1);
  g_assert_cmpuint(n, <, 40);
}

/* With nothing but states there must still be a picture, and mad numbers must not harm. */
static void poor_scenes(Stage *stage, gconstpointer data)
{
  (void)data;
  static const double zooms[] = { 0.1, 0.6, 4 };
  AwNucleus *nucleus = stage->dish->nuclei->pdata[100];
  nucleus->diameter = NAN;
  stage->aim[3].x_um = INFINITY;
  stage->scene.current = 5000;
  for (gsize i = 0; i < G_N_ELEMENTS(zooms); i++) {
    AwScene bare = stage->scene;
    AwViewport view = view_of(stage);
    view.zoom = zooms[i];
    cairo_surface_destroy(draw(&bare, &view, NULL));
    bare.marks = NULL;
    bare.aim = NULL;
    bare.tour = NULL;
    bare.n_tour = 0;
    bare.current = 100;
    cairo_surface_destroy(draw(&bare, &view, NULL));
  }
  g_autoptr(GPtrArray) none = g_ptr_array_new();
  g_assert_cmpfloat(aw_overlay_typical_um(none), ==, 1);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/view/overlay/detail", detail);
  g_test_add("/view/overlay/kept_pictures", Stage, NULL, set_up, kept_pictures, tear_down);
  g_test_add("/view/overlay/outline_in_place", Stage, NULL, set_up, outline_in_place, tear_down);
  g_test_add("/view/overlay/counts_in_view", Stage, NULL, set_up, counts_in_view, tear_down);
  g_test_add("/view/overlay/poor_scenes", Stage, NULL, set_up, poor_scenes, tear_down);
  return g_test_run();
}

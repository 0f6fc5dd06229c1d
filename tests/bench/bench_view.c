/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * What the viewer's screen costs on an image surface of 1920 x 1080: 20,000 nuclei, 100 frames of 2048 x 2048, a tour.
 * One line per view: the best of several redraws, CPU ms, against the 16 ms that a smooth pan or zoom step may take.
 */
#include <stdio.h>
#include <time.h>

#include "image/overview.h"
#include "support/fake_dish.h"
#include "view/overlay.h"
#include "view/pictures.h"

#define W 1920
#define H 1080
#define N_ROUNDS 20

typedef struct {
  FakeDish *dish;
  AwUpright upright;
  AwHitIndex *index;
  AwPictures *pictures;
  AwOverlay *overlay;
  AwScene scene;
  guint *tour;
  cairo_t *cr;
} Bench;

static double cpu_ms(void)
{
  struct timespec t;
  clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
  return (double)t.tv_sec * 1e3 + (double)t.tv_nsec / 1e6;
}

/* Any tile will do for timing, as long as it has the size and form of a real one. */
static void load_tiles(Bench *bench, const AwViewport *view)
{
  g_autoptr(GArray) missing = aw_pictures_missing(bench->pictures, view);
  for (guint i = 0; i < missing->len; i++) {
    AwTileKey key = g_array_index(missing, AwTileKey, i);
    int side = MIN(AW_TILE_PX, 2048 >> key.level);
    AwImage *tile = aw_image_new(side, side, AW_SAMPLE_U16, NULL);
    for (int k = 0; k < side * side; k++)
      ((guint16 *)tile->pixels)[k] = (guint16)(k * 7 % 4096);
    aw_pictures_put(bench->pictures, key, tile);
  }
}

static void redraw(Bench *bench, const AwViewport *view, double *pictures_ms, double *overlay_ms)
{
  double start = cpu_ms();
  aw_pictures_draw(bench->pictures, bench->cr, view, 1000);
  double middle = cpu_ms();
  aw_overlay_draw(bench->overlay, bench->cr, &bench->scene, view);
  *pictures_ms = MIN(*pictures_ms, middle - start);
  *overlay_ms = MIN(*overlay_ms, cpu_ms() - middle);
}

/* A pan step: the same zoom, a little moved each time. */
static void measure(Bench *bench, AwViewport view, const char *what)
{
  double pictures_ms = 1e9, overlay_ms = 1e9;
  for (int round = 0; round < N_ROUNDS; round++) {
    aw_viewport_pan(&view, 3, 2);
    load_tiles(bench, &view);
    aw_pictures_draw(bench->pictures, bench->cr, &view, 1000); /* greys of new tiles are made once, ahead of need */
    redraw(bench, &view, &pictures_ms, &overlay_ms);
  }
  printf("%-34s zoom %6.3f   pictures %5.1f ms   overlay %5.1f ms   together %5.1f ms of 16\n", what, view.zoom,
         pictures_ms, overlay_ms, pictures_ms + overlay_ms);
}

static void first_paint(Bench *bench, const AwViewport *view)
{
  double start = cpu_ms();
  AwHitIndex *index = aw_hit_index_new(bench->dish->nuclei);
  aw_pictures_set_percentiles(bench->pictures, 0.01, 0.998);
  aw_pictures_draw(bench->pictures, bench->cr, view, 1000);
  aw_overlay_draw(bench->overlay, bench->cr, &bench->scene, view);
  printf("%-34s %5.0f ms of 1000 (index, contrast, 100 overviews, overlay)\n", "first paint", cpu_ms() - start);
  aw_hit_index_free(index);
}

/* Overviews of noise: no picture compresses worse, none takes longer to decode. */
static void add_overviews(FakeDish *dish)
{
  AwImage *image = aw_image_new(512, 512, AW_SAMPLE_F32, NULL);
  for (int k = 0; k < 512 * 512; k++)
    ((float *)image->pixels)[k] = (float)((unsigned)k * 2654435761u >> 24);
  for (guint i = 0; i < dish->frames->len; i++)
    ((AwFrame *)dish->frames->pdata[i])->overview = aw_image_overview(image, 512, 0, 255, NULL);
  aw_image_free(image);
}

static void set_up(Bench *bench)
{
  FakeDishSettings s = fake_dish_defaults();
  s.n_across = s.n_down = 10;
  s.side_px = 2048;
  s.overview_px = 0;
  s.n_nuclei = 20000;
  FakeDish *dish = bench->dish = fake_dish_new(&s);
  add_overviews(dish);
  aw_upright_make(&dish->map, ((const AwFrame *)dish->frames->pdata[0])->stage, &bench->upright);
  bench->index = aw_hit_index_new(dish->nuclei);
  bench->pictures = aw_pictures_new(&bench->upright, dish->frames, 100, 4000, (gsize)400 << 20);
  bench->overlay = aw_overlay_new();
  guint *tour = bench->tour = g_new(guint, dish->tour->len);
  for (guint i = 0; i < dish->tour->len; i++)
    tour[i] = (guint)g_array_index(dish->tour, gint64, i) - 1;
  bench->scene = (AwScene){ .upright = &bench->upright,
                            .nuclei = dish->nuclei,
                            .index = bench->index,
                            .state = dish->state,
                            .nucleus_um = aw_overlay_typical_um(dish->nuclei),
                            .current = 10,
                            .tour = tour,
                            .n_tour = dish->tour->len,
                            .show_labels = TRUE,
                            .scale = 1 };
}

static void show_zooms(Bench *bench, AwViewport view)
{
  static const double zooms[] = { 0.12, 0.25, 0.4, 0.5, 0.71, 1.0, 1.41, 3 };
  AwScreenPoint middle = { W / 2.0, H / 2.0 };
  measure(bench, view, "whole dish, tour shown");
  for (gsize i = 0; i < G_N_ELEMENTS(zooms); i++) {
    aw_viewport_zoom_at(&view, zooms[i] / view.zoom, middle);
    measure(bench, view, "closer, tour shown");
  }
  bench->scene.n_tour = 0;
  aw_viewport_fit(&view);
  measure(bench, view, "whole dish, no tour");
}

/* How fast this machine is just now: the same work in one cairo call. */
static void yardstick(cairo_t *cr)
{
  double best = 1e9;
  for (int round = 0; round < N_ROUNDS; round++) {
    double start = cpu_ms();
    for (int i = 0; i < 20000; i++)
      cairo_rectangle(cr, i * 37 % W, i * 91 % H, 5, 5);
    cairo_fill(cr);
    best = MIN(best, cpu_ms() - start);
  }
  printf("%-34s %5.1f ms (about 7 on a quiet machine)\n", "yardstick: 20,000 squares, one fill", best);
}

static void pick(const Bench *bench, const AwViewport *view)
{
  double start = cpu_ms();
  int n = 0;
  for (int i = 0; i < 10000; i++) {
    AwScreenPoint at = { i * 37 % W, i * 91 % H };
    n += aw_hit_at(bench->index, aw_viewport_to_scan(view, &bench->upright, at), 5) >= 0;
  }
  printf("%-34s %5.1f us each (%d of 10000 hit)\n", "pick a nucleus", (cpu_ms() - start) / 10, n);
}

int main(void)
{
  Bench bench = { 0 };
  cairo_surface_t *page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, W, H);
  bench.cr = cairo_create(page);
  set_up(&bench);
  AwViewport view = aw_viewport_new(aw_upright_dish_box(&bench.upright, bench.dish->frames, NULL), W, H);
  first_paint(&bench, &view);
  yardstick(bench.cr);
  show_zooms(&bench, view);
  pick(&bench, &view);
  cairo_destroy(bench.cr);
  cairo_surface_destroy(page);
  aw_overlay_free(bench.overlay);
  aw_pictures_free(bench.pictures);
  aw_hit_index_free(bench.index);
  g_free(bench.tour);
  fake_dish_free(bench.dish);
  return 0;
}

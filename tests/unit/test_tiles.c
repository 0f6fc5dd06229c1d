/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <glib/gstdio.h>
#include <math.h>

#include "base/error.h"
#include "image/overview.h"
#include "image/writer.h"
#include "support/fake_dish.h"
#include "view/pictures.h"

#define SIDE_X 700
#define SIDE_Y 530

/* A ramp that tells every pixel: value = 10 x + 3 y. */
static AwImage *ramp(AwSample sample)
{
  AwImage *image = aw_image_new(SIDE_X, SIDE_Y, sample, NULL);
  for (int y = 0; y < SIDE_Y; y++)
    for (int x = 0; x < SIDE_X; x++) {
      int i = y * SIDE_X + x, value = 10 * x + 3 * y;
      if (sample == AW_SAMPLE_U16)
        ((guint16 *)image->pixels)[i] = (guint16)value;
      else
        ((float *)image->pixels)[i] = (float)value;
    }
  image->full_scale = sample == AW_SAMPLE_U16 ? 65535 : 0;
  return image;
}

typedef struct {
  char *folder, *path;
  AwImageReader *reader;
} File;

static void set_up(File *file, gconstpointer data)
{
  g_autoptr(AwImage) image = ramp(GPOINTER_TO_INT(data) ? AW_SAMPLE_F32 : AW_SAMPLE_U16);
  file->folder = g_dir_make_tmp("aimwell-tiles-XXXXXX", NULL);
  file->path = g_build_filename(file->folder, "frame.tif", NULL);
  g_assert_true(aw_image_write_tiff(image, file->path, 0.65, NULL));
  file->reader = aw_image_reader_open(file->path, 0, -1, NULL);
  g_assert_nonnull(file->reader);
}

static void tear_down(File *file, gconstpointer data)
{
  (void)data;
  aw_image_reader_free(file->reader);
  g_remove(file->path);
  g_rmdir(file->folder);
  g_free(file->path);
  g_free(file->folder);
}

/* The mean of the ramp over a block is the ramp at the block's middle. */
static void check_tile(AwImageReader *reader, AwTileKey key, int n_across, int n_down)
{
  g_autoptr(AwImage) tile = aw_tile_read(reader, key, NULL);
  g_assert_nonnull(tile);
  g_assert_cmpint(tile->width_px, ==, n_across);
  g_assert_cmpint(tile->height_px, ==, n_down);
  AwRect rect = aw_tile_rect(key, SIDE_X, SIDE_Y);
  int k = 1 << key.level;
  for (int y = 0; y < n_down; y++)
    for (int x = 0; x < n_across; x++) {
      int x0 = rect.x0 + x * k, y0 = rect.y0 + y * k, x1 = MIN(x0 + k, SIDE_X), y1 = MIN(y0 + k, SIDE_Y);
      double expected = 5.0 * (x0 + x1 - 1) + 1.5 * (y0 + y1 - 1);
      g_assert_cmpfloat_with_epsilon(aw_image_value(tile, x, y), expected, 0.501);
    }
}

static void reads_pyramid(File *file, gconstpointer data)
{
  (void)data;
  check_tile(file->reader, (AwTileKey){ 0, 0, 0, 0 }, 256, 256);
  check_tile(file->reader, (AwTileKey){ 0, 0, 2, 2 }, 700 - 512, 530 - 512);
  check_tile(file->reader, (AwTileKey){ 0, 1, 1, 0 }, 94, 256);
  check_tile(file->reader, (AwTileKey){ 0, 3, 0, 0 }, 88, 67);
  check_tile(file->reader, (AwTileKey){ 0, 10, 0, 0 }, 1, 1);
}

static void outside(File *file, gconstpointer data)
{
  (void)data;
  GError *error = NULL;
  g_assert_null(aw_tile_read(file->reader, (AwTileKey){ 0, 0, 3, 0 }, &error));
  g_assert_error(error, AW_ERROR, AW_ERROR_RANGE);
  g_assert_nonnull(strstr(error->message, "700 x 530"));
  g_error_free(error);
}

/* A file cut short after its header was read. */
static void damaged(File *file, gconstpointer data)
{
  (void)data;
  GError *error = NULL;
  GStatBuf st;
  g_assert_cmpint(g_stat(file->path, &st), ==, 0);
  g_assert_cmpint(truncate(file->path, st.st_size / 3), ==, 0);
  g_autoptr(AwImage) tile = aw_tile_read(file->reader, (AwTileKey){ 0, 2, 0, 0 }, &error);
  g_assert_null(tile);
  g_assert_nonnull(error);
  g_error_free(error);
}

static void levels(void)
{
  static const double zooms[] = { 8, 1, 0.72, 0.70, 0.36, 0.35, 0.001, 1e-9 };
  static const int expected[] = { 0, 0, 0, 1, 1, 2, 10, AW_MAX_TILE_LEVEL };
  for (gsize i = 0; i < G_N_ELEMENTS(zooms); i++)
    g_assert_cmpint(aw_tile_level(zooms[i]), ==, expected[i]);
}

static void needed(void)
{
  AwPixelMap map = { { 0.5, 0, 0, 0.5 }, AW_ORIGIN_ENTERED, 0 };
  AwFrame frame = { .width_px = 2000, .height_px = 1000, .stage = { 0, 0 } };
  AwUpright up;
  g_assert_true(aw_upright_make(&map, frame.stage, &up));
  g_autoptr(GPtrArray) frames = g_ptr_array_new();
  g_ptr_array_add(frames, &frame);
  AwViewport view = aw_viewport_new(aw_upright_frame_box(&up, &frame), 400, 300);
  aw_viewport_zoom_at(&view, 1 / view.zoom, (AwScreenPoint){ 200, 150 });
  g_autoptr(GArray) keys = g_array_new(FALSE, FALSE, sizeof(AwTileKey));
  aw_tiles_in_view(&up, &frame, 0, 0, &view, keys); /* frame px 800 ... 1200 by 350 ... 650 */
  g_assert_cmpuint(keys->len, ==, 2 * 2);
  g_assert_cmpint(g_array_index(keys, AwTileKey, 0).column, ==, 3);
  g_assert_cmpint(g_array_index(keys, AwTileKey, 0).row, ==, 1);
  aw_viewport_pan(&view, 210, 0); /* now 590 ... 990: three columns, the middle one nearest */
  g_array_set_size(keys, 0);
  aw_tiles_in_view(&up, &frame, 0, 0, &view, keys);
  aw_tiles_sort(&up, frames, &view, keys);
  g_assert_cmpuint(keys->len, ==, 4);
  g_assert_cmpint(g_array_index(keys, AwTileKey, 0).column, ==, 3);
  g_assert_cmpint(g_array_index(keys, AwTileKey, 3).column, ==, 2);
  frame.stage.x_um = 1e6;
  g_array_set_size(keys, 0);
  aw_tiles_in_view(&up, &frame, 0, 0, &view, keys);
  g_assert_cmpuint(keys->len, ==, 0);
}

static void greys(void)
{
  AwContrast contrast = { 100, 300, 1, FALSE };
  g_assert_cmpint(aw_contrast_grey(&contrast, 100), ==, 0);
  g_assert_cmpint(aw_contrast_grey(&contrast, 200), ==, 128);
  g_assert_cmpint(aw_contrast_grey(&contrast, 999), ==, 255);
  g_assert_cmpint(aw_contrast_grey(&contrast, NAN), ==, 0);
  contrast.gamma = 0.5;
  g_assert_cmpint(aw_contrast_grey(&contrast, 150), ==, 128); /* sqrt (1/4) */
  contrast.inverted = TRUE;
  g_assert_cmpint(aw_contrast_grey(&contrast, 150), ==, 127);
  contrast.high = 100;
  g_assert_cmpint(aw_contrast_grey(&contrast, 100), ==, 255);
  g_assert_cmpint(aw_contrast_grey(&contrast, 101), ==, 0);
}

static void percentiles(void)
{
  g_autoptr(AwImage) image = ramp(AW_SAMPLE_F32), more = ramp(AW_SAMPLE_U16);
  const AwImage *images[] = { image, more };
  AwContrast contrast = { 1, 2, 1, FALSE };
  aw_contrast_set_percentiles(&contrast, images, 2, 0, 0.5);
  g_assert_cmpfloat_with_epsilon(contrast.low, 0, 40);
  g_assert_cmpfloat_with_epsilon(contrast.high, (10.0 * (SIDE_X - 1) + 3.0 * (SIDE_Y - 1)) / 2, 40);
  for (int i = 0; i < SIDE_X * SIDE_Y; i++)
    ((float *)image->pixels)[i] = NAN;
  AwContrast kept = contrast;
  aw_contrast_set_percentiles(&contrast, images, 1, 0.1, 0.9);
  g_assert_cmpfloat(contrast.low, ==, kept.low);
}

static AwImage *flat(int side)
{
  return aw_image_new(side, side, AW_SAMPLE_U16, NULL);
}

/* Room for three tiles: the one not asked for longest goes first. */
static void cache_drops_oldest(void)
{
  g_autoptr(AwTileCache) cache = aw_tile_cache_new(3 * (100 * 100 * 6 + 200));
  AwContrast contrast = { 0, 65535, 1, FALSE };
  g_autoptr(AwGreys) ready = aw_greys_new(&contrast);
  AwTileKey key[] = { { 0, 0, 0, 0 }, { 0, 0, 1, 0 }, { 1, 0, 0, 0 }, { 0, 1, 0, 0 } };
  for (int i = 0; i < 3; i++) {
    aw_tile_cache_put(cache, key[i], flat(100));
    g_assert_nonnull(aw_tile_cache_get(cache, key[i], ready, 1));
  }
  g_assert_cmpuint(aw_tile_cache_n_tiles(cache), ==, 3);
  aw_tile_cache_get(cache, key[0], ready, 1);
  aw_tile_cache_put(cache, key[3], flat(100));
  g_assert_nonnull(aw_tile_cache_get(cache, key[3], ready, 1));
  g_assert_true(aw_tile_cache_has(cache, key[0]));
  g_assert_false(aw_tile_cache_has(cache, key[1]));
  g_assert_cmpuint(aw_tile_cache_n_bytes(cache), <=, 3 * (100 * 100 * 6 + 200));
  aw_tile_cache_put(cache, key[2], flat(2000)); /* larger than the limit: kept alone */
  g_assert_cmpuint(aw_tile_cache_n_tiles(cache), ==, 1);
  g_assert_null(aw_tile_cache_get(cache, key[0], ready, 1));
}

static void cache_follows_contrast(void)
{
  g_autoptr(AwTileCache) cache = aw_tile_cache_new(1 << 20);
  AwContrast contrast = { 0, 100, 1, TRUE };
  g_autoptr(AwGreys) ready = aw_greys_new(&contrast);
  AwTileKey key = { 0, 0, 0, 0 };
  aw_tile_cache_put(cache, key, flat(10));
  cairo_surface_t *surface = aw_tile_cache_get(cache, key, ready, 1);
  g_assert_cmpint(cairo_image_surface_get_data(surface)[0], ==, 255);
  g_assert_true(surface == aw_tile_cache_get(cache, key, ready, 1));
  contrast.inverted = FALSE;
  g_autoptr(AwGreys) other = aw_greys_new(&contrast);
  surface = aw_tile_cache_get(cache, key, other, 2);
  g_assert_cmpint(cairo_image_surface_get_data(surface)[0], ==, 0);
}

/* ---- the whole: pictures of one frame whose overview and tiles show the same ramp ---- */

typedef struct {
  File file;
  AwFrame frame;
  GPtrArray *frames;
  AwUpright up;
  AwPictures *pictures;
  cairo_surface_t *page;
  cairo_t *cr;
  AwViewport view;
} Show;

static void show_up(Show *show, gconstpointer data)
{
  (void)data;
  set_up(&show->file, NULL);
  g_autoptr(AwImage) image = ramp(AW_SAMPLE_U16);
  AwPixelMap map = { { 0.6, 0.05, -0.05, 0.6 }, AW_ORIGIN_ENTERED, 0 };
  show->frame = (AwFrame){ .width_px = SIDE_X, .height_px = SIDE_Y, .stage = { 70, 80 } };
  show->frame.overview = aw_image_overview(image, 140, 3000, 5600, NULL);
  show->frames = g_ptr_array_new();
  g_ptr_array_add(show->frames, &show->frame);
  g_assert_true(aw_upright_make(&map, (AwScanPoint){ 0, 0 }, &show->up));
  show->pictures = aw_pictures_new(&show->up, show->frames, 3000, 5600, 64 << 20);
  AwContrast contrast = { 3800, 4800, 1, FALSE }; /* 2.55 greys for a pixel to the right */
  aw_pictures_set_contrast(show->pictures, &contrast);
  show->page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, 350, 265);
  show->cr = cairo_create(show->page);
  show->view = aw_viewport_new(aw_upright_dish_box(&show->up, show->frames, NULL), 350, 265);
}

static void show_down(Show *show, gconstpointer data)
{
  (void)data;
  cairo_destroy(show->cr);
  cairo_surface_destroy(show->page);
  aw_pictures_free(show->pictures);
  g_ptr_array_unref(show->frames);
  g_bytes_unref(show->frame.overview);
  tear_down(&show->file, NULL);
}

/* Every page pixel on the steep part of the ramp must show its grey there, within `slack_px` frame pixels. */
static void check_ramp(Show *show, double slack_px)
{
  int n_checked = 0;
  cairo_surface_flush(show->page);
  for (int y = 0; y < 265; y += 7)
    for (int x = 0; x < 350; x += 3) {
      AwPixelPoint dish = aw_viewport_to_dish(&show->view, (AwScreenPoint){ x + 0.5, y + 0.5 });
      AwPixelPoint p = aw_upright_to_frame(&show->up, &show->frame, dish);
      double value = 10 * p.x_px + 3 * p.y_px, expected = (value - 3800) / 1000 * 255;
      if (p.x_px < 8 || p.y_px < 8 || p.x_px > SIDE_X - 9 || p.y_px > SIDE_Y - 9 || value < 3900 || value > 4700)
        continue;
      int grey = cairo_image_surface_get_data(show->page)[y * cairo_image_surface_get_stride(show->page) + 4 * x];
      g_assert_cmpfloat_with_epsilon(grey, expected, 2.55 * slack_px);
      n_checked++;
    }
  g_assert_cmpint(n_checked, >, 100);
}

static gsize draw_at(Show *show, double zoom, guint max_decodes)
{
  aw_viewport_zoom_at(&show->view, zoom / show->view.zoom, (AwScreenPoint){ 175, 132.5 });
  return aw_pictures_draw(show->pictures, show->cr, &show->view, max_decodes);
}

static void overview_far_out(Show *show, gconstpointer data)
{
  (void)data;
  g_assert_cmpuint(draw_at(show, 0.25, 0), ==, 1); /* no decoding allowed yet */
  g_assert_cmpuint(draw_at(show, 0.25, 1), ==, 0);
  check_ramp(show, 3.5);
  g_autoptr(GArray) none = aw_pictures_missing(show->pictures, &show->view);
  g_assert_cmpuint(none->len, ==, 0); /* tiles shrunk by 4 show little more than an overview shrunk by 5 */
}

static void tiles_close_up(Show *show, gconstpointer data)
{
  (void)data;
  for (double zoom = 0.5; zoom < 9; zoom *= 2) {
    draw_at(show, zoom, 9);
    check_ramp(show, 3); /* from overviews or coarser tiles */
    g_autoptr(GArray) missing = aw_pictures_missing(show->pictures, &show->view);
    g_assert_cmpuint(missing->len, >, 0);
    while (missing->len > 0) {
      AwTileKey key = g_array_index(missing, AwTileKey, missing->len - 1);
      aw_pictures_put(show->pictures, key, aw_tile_read(show->file.reader, key, NULL));
      g_array_set_size(missing, missing->len - 1);
    }
    g_assert_cmpuint(draw_at(show, zoom, 9), ==, 0);
    check_ramp(show, 1.5);
    if (zoom > 0.7)
      break;
  }
  for (double zoom = 2; zoom < 9; zoom *= 2) { /* the same level 0, no more than half a pixel out of place */
    draw_at(show, zoom, 9);
    check_ramp(show, 1.5);
  }
  double value = 0;
  g_assert_true(aw_pictures_value(show->pictures, 0, (AwPixelPoint){ 350.2, 264.8 }, &value));
  g_assert_cmpfloat(value, ==, 3500 + 795);
  g_assert_false(aw_pictures_value(show->pictures, 0, (AwPixelPoint){ -3, 5 }, &value));
  g_assert_false(aw_pictures_value(show->pictures, 7, (AwPixelPoint){ 350, 264 }, &value));
  g_assert_false(aw_pictures_value(show->pictures, 0, (AwPixelPoint){ NAN, 264 }, &value));
}

static void contrast_reaches_overviews(Show *show, gconstpointer data)
{
  (void)data;
  AwContrast contrast = { 3000, 3000 + 2592 * 2, 1, FALSE }; /* the middle of the frame is at 4296 */
  aw_pictures_set_contrast(show->pictures, &contrast);
  draw_at(show, 0.4, 9);
  cairo_surface_flush(show->page);
  const unsigned char *middle =
      cairo_image_surface_get_data(show->page) + 132 * cairo_image_surface_get_stride(show->page);
  g_assert_cmpfloat_with_epsilon(middle[4 * 175], 64, 2);
  aw_pictures_set_percentiles(show->pictures, 0.25, 0.75);
  const AwContrast *now = aw_pictures_contrast(show->pictures);
  g_assert_cmpfloat_with_epsilon((now->low + now->high) / 2, 8592 / 2.0, 60);
  g_assert_cmpfloat(now->low, >=, 3000);
  g_assert_cmpfloat(now->low, <, 3300);
}

/* Damaged overviews and absurd frames leave dark ground, nothing worse. */
static void poor_frames(Show *show, gconstpointer data)
{
  (void)data;
  AwFrame bare = { .width_px = 300, .height_px = 200, .stage = { 60, 70 } };
  AwFrame mad = { .width_px = -5, .height_px = 200, .stage = { NAN, 0 } };
  AwFrame bad = bare;
  bad.overview = g_bytes_new_static("\x89PNG but then only words, no picture", 36);
  g_ptr_array_add(show->frames, &bare);
  g_ptr_array_add(show->frames, &mad);
  g_ptr_array_add(show->frames, &bad);
  g_assert_cmpuint(draw_at(show, 0.3, 9), >, 0);
  aw_pictures_draw_edges(show->pictures, show->cr, &show->view, 1);
  g_assert_cmpint(cairo_status(show->cr), ==, CAIRO_STATUS_SUCCESS);
  g_bytes_unref(bad.overview);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add("/view/tiles/reads_pyramid", File, NULL, set_up, reads_pyramid, tear_down);
  g_test_add("/view/tiles/reads_float_pyramid", File, GINT_TO_POINTER(1), set_up, reads_pyramid, tear_down);
  g_test_add("/view/tiles/outside", File, NULL, set_up, outside, tear_down);
  g_test_add("/view/tiles/damaged", File, NULL, set_up, damaged, tear_down);
  g_test_add_func("/view/tiles/levels", levels);
  g_test_add_func("/view/tiles/needed", needed);
  g_test_add_func("/view/contrast/greys", greys);
  g_test_add_func("/view/contrast/percentiles", percentiles);
  g_test_add_func("/view/tilecache/drops_oldest", cache_drops_oldest);
  g_test_add_func("/view/tilecache/follows_contrast", cache_follows_contrast);
  g_test_add("/view/pictures/overview_far_out", Show, NULL, show_up, overview_far_out, show_down);
  g_test_add("/view/pictures/tiles_close_up", Show, NULL, show_up, tiles_close_up, show_down);
  g_test_add("/view/pictures/contrast_reaches_overviews", Show, NULL, show_up, contrast_reaches_overviews, show_down);
  g_test_add("/view/pictures/poor_frames", Show, NULL, show_up, poor_frames, show_down);
  return g_test_run();
}

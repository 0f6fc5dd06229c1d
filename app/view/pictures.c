/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/pictures.h"

#include <string.h>

#include "figures/map.h"
#include "figures/style.h"
#include "image/overview.h"

#define MAX_SAMPLED 64
#define PIXELS_FROM 4.0 /* zoom from which pixels are shown as squares */

/* Overviews live in the same cache: level -1 is the overview, -2 the overview shrunk by two, and so on. */
struct AwPictures {
  const AwUpright *upright;
  GPtrArray *frames;
  double overview_low, overview_high;
  AwTileCache *cache;
  AwContrast contrast;
  AwGreys *greys, *overview_greys; /* under that contrast */
  guint version;                   /* of the contrast */
};

/* One redraw. */
typedef struct {
  AwPictures *pictures;
  cairo_t *cr;
  const AwViewport *view;
  guint decodes_left;
  gsize n_missing;
} Draw;

/* The overviews' contrast is the same in their own values, where 0 and 255 stand for overview_low and _high. */
static void update_greys(AwPictures *pictures)
{
  double range = pictures->overview_high - pictures->overview_low;
  AwContrast shown = pictures->contrast;
  shown.low = range > 0 ? (pictures->contrast.low - pictures->overview_low) / range * 255 : 0;
  shown.high = range > 0 ? (pictures->contrast.high - pictures->overview_low) / range * 255 : 255;
  aw_greys_free(pictures->greys);
  aw_greys_free(pictures->overview_greys);
  pictures->greys = aw_greys_new(&pictures->contrast);
  pictures->overview_greys = aw_greys_new(&shown);
  pictures->version++;
}

AwPictures *aw_pictures_new(const AwUpright *upright, GPtrArray *frames, double overview_low, double overview_high,
                            gsize max_bytes)
{
  g_return_val_if_fail(upright && frames, NULL);
  AwPictures *pictures = g_new0(AwPictures, 1);
  pictures->upright = upright;
  pictures->frames = frames;
  pictures->overview_low = overview_low;
  pictures->overview_high = overview_high;
  pictures->cache = aw_tile_cache_new(max_bytes);
  gboolean known = overview_high > overview_low;
  pictures->contrast = (AwContrast){ known ? overview_low : 0, known ? overview_high : 65535, 1, FALSE };
  update_greys(pictures);
  return pictures;
}

void aw_pictures_free(AwPictures *pictures)
{
  if (!pictures)
    return;
  aw_tile_cache_free(pictures->cache);
  aw_greys_free(pictures->greys);
  aw_greys_free(pictures->overview_greys);
  g_free(pictures);
}

void aw_pictures_set_contrast(AwPictures *pictures, const AwContrast *contrast)
{
  g_return_if_fail(pictures && contrast);
  pictures->contrast = *contrast;
  update_greys(pictures);
}

const AwContrast *aw_pictures_contrast(const AwPictures *pictures)
{
  return &pictures->contrast;
}

void aw_pictures_set_percentiles(AwPictures *pictures, double low_frac, double high_frac)
{
  g_autoptr(GPtrArray) images = g_ptr_array_new_with_free_func((GDestroyNotify)aw_image_free);
  guint stride = pictures->frames->len / MAX_SAMPLED + 1;
  AwContrast shown = { 0, 255, 1, FALSE };
  for (guint i = 0; i < pictures->frames->len; i += stride) {
    AwImage *image = aw_frame_picture(pictures->frames->pdata[i]);
    if (image)
      g_ptr_array_add(images, image);
  }
  aw_contrast_set_percentiles(&shown, (const AwImage *const *)(void *)images->pdata, images->len, low_frac, high_frac);
  double range = pictures->overview_high - pictures->overview_low;
  gboolean known = range > 0;
  pictures->contrast.low = known ? pictures->overview_low + shown.low / 255 * range : shown.low;
  pictures->contrast.high = known ? pictures->overview_low + shown.high / 255 * range : shown.high;
  update_greys(pictures);
}

static gboolean can_place(const AwFrame *frame)
{
  return aw_scan_point_is_sane(frame->stage) && frame->width_px > 0 && frame->height_px > 0;
}

/* The shrink factor of a frame's overview, from its header; 0 when there is none. */
static int overview_factor(const AwFrame *frame)
{
  gsize n = 0;
  const guint8 *bytes = frame->overview ? g_bytes_get_data(frame->overview, &n) : NULL;
  guint32 sides[2];
  if (n < 24)
    return 0;
  memcpy(sides, bytes + 16, sizeof sides);
  guint32 side = MAX(GUINT32_FROM_BE(sides[0]), GUINT32_FROM_BE(sides[1]));
  return side >= 1 && side <= AW_MAX_OVERVIEW_SIDE_PX ? aw_overview_factor(frame->width_px, frame->height_px, (int)side)
                                                      : 0;
}

/* How often the overview is halved for this zoom. */
static int halvings(double zoom, int factor)
{
  return (int)CLAMP(floor(0.5 - log2(zoom * factor)), 0, 12);
}

/* The overview's surface, halved as asked for; decodes it and all its halves when it is not at hand. */
static cairo_surface_t *overview(Draw *draw, int frame, int n_halvings)
{
  AwPictures *pictures = draw->pictures;
  AwTileKey key = { frame, -1 - n_halvings, 0, 0 };
  if (!aw_tile_cache_has(pictures->cache, key)) {
    AwImage *image = draw->decodes_left > 0 ? aw_frame_picture(pictures->frames->pdata[frame]) : NULL;
    draw->decodes_left -= draw->decodes_left > 0;
    for (int level = -1; image && level >= key.level; level--) {
      AwImage *half = level > key.level ? aw_tile_halve(image, NULL) : NULL;
      aw_tile_cache_put(pictures->cache, (AwTileKey){ frame, level, 0, 0 }, image);
      image = half;
    }
  }
  return aw_tile_cache_get(pictures->cache, key, pictures->overview_greys, pictures->version);
}

/* Screen rectangles are rounded to whole pixels: neighbours then meet without a seam. */
static void screen_rect(const AwViewport *view, AwBox box, double r[4])
{
  AwScreenPoint a = aw_viewport_from_dish(view, (AwPixelPoint){ box.x0, box.y0 });
  AwScreenPoint b = aw_viewport_from_dish(view, (AwPixelPoint){ box.x1, box.y1 });
  r[0] = floor(a.sx + 0.5);
  r[1] = floor(a.sy + 0.5);
  r[2] = floor(b.sx + 0.5);
  r[3] = floor(b.sy + 0.5);
}

/* Draws a surface that covers `box` of the dish, as far as it lies inside `limit`. */
static void place(const Draw *draw, cairo_surface_t *surface, AwBox box, AwBox limit)
{
  double r[4], l[4];
  screen_rect(draw->view, box, r);
  screen_rect(draw->view, limit, l);
  double x0 = MAX(MAX(r[0], l[0]), 0), y0 = MAX(MAX(r[1], l[1]), 0);
  double x1 = MIN(MIN(r[2], l[2]), draw->view->width), y1 = MIN(MIN(r[3], l[3]), draw->view->height);
  if (x0 >= x1 || y0 >= y1)
    return;
  cairo_matrix_t to_surface;
  double sx = (r[2] - r[0]) / cairo_image_surface_get_width(surface);
  double sy = (r[3] - r[1]) / cairo_image_surface_get_height(surface);
  cairo_matrix_init(&to_surface, 1 / sx, 0, 0, 1 / sy, -r[0] / sx, -r[1] / sy);
  cairo_set_source_surface(draw->cr, surface, 0, 0);
  cairo_pattern_set_matrix(cairo_get_source(draw->cr), &to_surface);
  cairo_pattern_set_extend(cairo_get_source(draw->cr), CAIRO_EXTEND_PAD);
  cairo_pattern_set_filter(cairo_get_source(draw->cr),
                           draw->view->zoom >= PIXELS_FROM ? CAIRO_FILTER_NEAREST : CAIRO_FILTER_BILINEAR);
  cairo_rectangle(draw->cr, x0, y0, x1 - x0, y1 - y0);
  cairo_fill(draw->cr);
}

/* A frame's overview within `limit`, or dark ground where there is none. Counts what could not be shown. */
static void draw_overview(Draw *draw, int frame, int factor, AwBox limit)
{
  const AwFrame *f = draw->pictures->frames->pdata[frame];
  int n_halvings = factor ? halvings(draw->view->zoom, factor) : 0;
  cairo_surface_t *surface = factor ? overview(draw, frame, n_halvings) : NULL;
  if (surface) {
    double step = factor * pow(2, n_halvings);
    AwBox box = aw_upright_frame_box(draw->pictures->upright, f);
    box.x1 = box.x0 + step * cairo_image_surface_get_width(surface);
    box.y1 = box.y0 + step * cairo_image_surface_get_height(surface);
    place(draw, surface, box, limit);
    return;
  }
  double r[4];
  screen_rect(draw->view, limit, r);
  cairo_rectangle(draw->cr, r[0], r[1], r[2] - r[0], r[3] - r[1]);
  aw_style_set_ink(draw->cr, aw_ink_night);
  cairo_fill(draw->cr);
  draw->n_missing += factor > 0;
}

/* The nearest coarser tile at hand that holds the wanted one, cut to it. */
static gboolean draw_coarser(Draw *draw, AwTileKey key, AwBox limit)
{
  AwPictures *pictures = draw->pictures;
  const AwFrame *frame = pictures->frames->pdata[key.frame];
  while (++key.level <= AW_MAX_TILE_LEVEL) {
    key.column /= 2;
    key.row /= 2;
    cairo_surface_t *surface = aw_tile_cache_get(pictures->cache, key, pictures->greys, pictures->version);
    if (!surface)
      continue;
    place(draw, surface,
          aw_tile_box(pictures->upright, frame, key, cairo_image_surface_get_width(surface),
                      cairo_image_surface_get_height(surface)),
          limit);
    return TRUE;
  }
  return FALSE;
}

static AwBox box_within(AwBox a, AwBox b)
{
  return (AwBox){ MAX(a.x0, b.x0), MAX(a.y0, b.y0), MIN(a.x1, b.x1), MIN(a.y1, b.y1) };
}

static void draw_tile(Draw *draw, AwTileKey key, int factor)
{
  AwPictures *pictures = draw->pictures;
  const AwFrame *frame = pictures->frames->pdata[key.frame];
  AwBox whole = aw_upright_frame_box(pictures->upright, frame);
  AwBox box = aw_tile_box(pictures->upright, frame, key, AW_TILE_PX, AW_TILE_PX), limit = box_within(box, whole);
  cairo_surface_t *surface = aw_tile_cache_get(pictures->cache, key, pictures->greys, pictures->version);
  if (surface) {
    box = aw_tile_box(pictures->upright, frame, key, cairo_image_surface_get_width(surface),
                      cairo_image_surface_get_height(surface));
    place(draw, surface, box, limit);
    return;
  }
  draw->n_missing++;
  if (!draw_coarser(draw, key, limit))
    draw_overview(draw, key.frame, factor, limit);
}

/* TRUE when tiles of the wanted level show clearly more than the overview does; reading them must pay. */
static gboolean wants_tiles(int level, int factor)
{
  return factor == 0 || 1.3 * (1 << level) < factor;
}

static void draw_frame(Draw *draw, int i, int level)
{
  const AwFrame *frame = draw->pictures->frames->pdata[i];
  AwBox box = aw_upright_frame_box(draw->pictures->upright, frame);
  int factor = overview_factor(frame);
  if (!wants_tiles(level, factor)) {
    draw_overview(draw, i, factor, box);
    return;
  }
  g_autoptr(GArray) keys = g_array_new(FALSE, FALSE, sizeof(AwTileKey));
  aw_tiles_in_view(draw->pictures->upright, frame, i, level, draw->view, keys);
  for (guint k = 0; k < keys->len; k++)
    draw_tile(draw, g_array_index(keys, AwTileKey, k), factor);
}

static gboolean is_in_view(const AwPictures *pictures, const AwViewport *view, const AwFrame *frame)
{
  return can_place(frame) && aw_box_overlap(aw_viewport_visible(view), aw_upright_frame_box(pictures->upright, frame));
}

gsize aw_pictures_draw(AwPictures *pictures, cairo_t *cr, const AwViewport *view, guint max_decodes)
{
  g_return_val_if_fail(pictures && cr && view, 0);
  Draw draw = { pictures, cr, view, max_decodes, 0 };
  int level = aw_tile_level(view->zoom);
  cairo_save(cr);
  cairo_set_antialias(cr, CAIRO_ANTIALIAS_NONE); /* all edges lie on whole pixels */
  for (guint i = 0; i < pictures->frames->len; i++)
    if (is_in_view(pictures, view, pictures->frames->pdata[i]))
      draw_frame(&draw, (int)i, level);
  cairo_restore(cr);
  return draw.n_missing;
}

GArray *aw_pictures_missing(AwPictures *pictures, const AwViewport *view)
{
  GArray *keys = g_array_new(FALSE, FALSE, sizeof(AwTileKey));
  int level = aw_tile_level(view->zoom);
  guint n = 0;
  for (guint i = 0; i < pictures->frames->len; i++) {
    const AwFrame *frame = pictures->frames->pdata[i];
    if (is_in_view(pictures, view, frame) && wants_tiles(level, overview_factor(frame)))
      aw_tiles_in_view(pictures->upright, frame, (int)i, level, view, keys);
  }
  for (guint k = 0; k < keys->len; k++)
    if (!aw_tile_cache_has(pictures->cache, g_array_index(keys, AwTileKey, k)))
      g_array_index(keys, AwTileKey, n++) = g_array_index(keys, AwTileKey, k);
  g_array_set_size(keys, n);
  aw_tiles_sort(pictures->upright, pictures->frames, view, keys);
  return keys;
}

void aw_pictures_put(AwPictures *pictures, AwTileKey key, AwImage *tile)
{
  g_return_if_fail(pictures && tile && key.level >= 0);
  aw_tile_cache_put(pictures->cache, key, tile);
}

gboolean aw_pictures_value(const AwPictures *pictures, int frame, AwPixelPoint pixel, double *value)
{
  double x = floor(pixel.x_px + 0.5), y = floor(pixel.y_px + 0.5);
  if (!(x >= 0 && y >= 0 && x < AW_TILE_PX * 1e6 && y < AW_TILE_PX * 1e6))
    return FALSE;
  AwTileKey key = { frame, 0, (int)x / AW_TILE_PX, (int)y / AW_TILE_PX };
  const AwImage *tile = aw_tile_cache_image(pictures->cache, key);
  int u = (int)x - key.column * AW_TILE_PX, v = (int)y - key.row * AW_TILE_PX;
  if (!tile || u >= tile->width_px || v >= tile->height_px)
    return FALSE;
  *value = aw_image_value(tile, u, v);
  return TRUE;
}

void aw_pictures_draw_edges(const AwPictures *pictures, cairo_t *cr, const AwViewport *view, double u)
{
  cairo_save(cr);
  cairo_set_dash(cr, NULL, 0, 0);
  cairo_set_line_width(cr, u);
  cairo_set_source_rgba(cr, 1, 1, 1, 0.4);
  for (guint i = 0; i < pictures->frames->len; i++) {
    double r[4];
    if (!is_in_view(pictures, view, pictures->frames->pdata[i]))
      continue;
    screen_rect(view, aw_upright_frame_box(pictures->upright, pictures->frames->pdata[i]), r);
    cairo_rectangle(cr, r[0] + u / 2, r[1] + u / 2, r[2] - r[0] - u, r[3] - r[1] - u);
    cairo_stroke(cr);
  }
  cairo_restore(cr);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "figures/label.h"
#include "figures/map_parts.h"

#define MAX_OVERVIEW_SIDE_PX 8192
#define MAX_SAMPLED 64 /* frames whose histogram sets the contrast of all */

/* Overviews are darkened, so that bright outlines read on the brightest nucleus. */
static const AwInk brightest = { 0.66, 0.68, 0.70, 1 };
static const AwInk unseen = { 0.17, 0.19, 0.225, 1 }; /* a frame without a picture */

typedef struct {
  const guint8 *bytes;
  gsize left;
} Source;

static cairo_status_t supply(void *closure, unsigned char *data, unsigned int length)
{
  Source *source = closure;
  if (length > source->left)
    return CAIRO_STATUS_READ_ERROR;
  memcpy(data, source->bytes, length);
  source->bytes += length;
  source->left -= length;
  return CAIRO_STATUS_SUCCESS;
}

static guint32 big_endian(const guint8 *b)
{
  return ((guint32)b[0] << 24) | ((guint32)b[1] << 16) | ((guint32)b[2] << 8) | b[3];
}

/* The picture of a frame, or NULL when there is none that can be shown. The sides are read from the PNG's header
 * first: a damaged record must not claim gigabytes. */
static cairo_surface_t *decode(const AwFrame *frame)
{
  gsize n = 0;
  const guint8 *bytes = frame->overview ? g_bytes_get_data(frame->overview, &n) : NULL;
  if (n < 24 || big_endian(bytes + 16) > MAX_OVERVIEW_SIDE_PX || big_endian(bytes + 20) > MAX_OVERVIEW_SIDE_PX)
    return NULL;
  Source source = { bytes, n };
  cairo_surface_t *surface = cairo_image_surface_create_from_png_stream(supply, &source);
  cairo_format_t format = cairo_image_surface_get_format(surface);
  if (cairo_surface_status(surface) == CAIRO_STATUS_SUCCESS &&
      (format == CAIRO_FORMAT_RGB24 || format == CAIRO_FORMAT_ARGB32))
    return surface;
  cairo_surface_destroy(surface);
  return NULL;
}

static void count_greys(cairo_surface_t *surface, gint64 histogram[256])
{
  int stride = cairo_image_surface_get_stride(surface), width = cairo_image_surface_get_width(surface);
  for (int y = 0; y < cairo_image_surface_get_height(surface); y++) {
    const unsigned char *row = cairo_image_surface_get_data(surface) + (gsize)y * (gsize)stride;
    for (int x = 0; x < width; x++)
      histogram[row[4 * x + 1]]++;
  }
}

static int percentile(const gint64 histogram[256], double frac)
{
  gint64 total = 0, sum = 0;
  for (int i = 0; i < 256; i++)
    total += histogram[i];
  for (int i = 0; i < 256; i++) {
    sum += histogram[i];
    if ((double)sum > frac * (double)total)
      return i;
  }
  return 255;
}

static guint32 channel(double dark, double bright, double t)
{
  return (guint32)(255 * (dark + (bright - dark) * t) + 0.5);
}

/* One contrast for all frames, so that brightness can be compared across the dish: 5 % and 99.8 % of the greys. */
static void make_contrast(GPtrArray *frames, guint32 table[256])
{
  gint64 histogram[256] = { 0 };
  guint stride = frames->len / MAX_SAMPLED + 1;
  for (guint i = 0; i < frames->len; i += stride) {
    cairo_surface_t *surface = decode(frames->pdata[i]);
    if (surface)
      count_greys(surface, histogram);
    cairo_surface_destroy(surface);
  }
  int lo = percentile(histogram, 0.05), hi = MAX(percentile(histogram, 0.998), lo + 12);
  for (int v = 0; v < 256; v++) {
    double t = pow(CLAMP((double)(v - lo) / (hi - lo), 0, 1), 0.8);
    table[v] = channel(aw_ink_night.r, brightest.r, t) << 16 | channel(aw_ink_night.g, brightest.g, t) << 8 |
               channel(aw_ink_night.b, brightest.b, t);
  }
}

static cairo_surface_t *darken(cairo_surface_t *surface, const guint32 table[256])
{
  int width = cairo_image_surface_get_width(surface), height = cairo_image_surface_get_height(surface);
  int stride = cairo_image_surface_get_stride(surface);
  cairo_surface_t *out = cairo_image_surface_create(CAIRO_FORMAT_RGB24, width, height);
  if (cairo_surface_status(out) != CAIRO_STATUS_SUCCESS)
    return out;
  int out_stride = cairo_image_surface_get_stride(out);
  for (int y = 0; y < height; y++) {
    const unsigned char *from = cairo_image_surface_get_data(surface) + (gsize)y * (gsize)stride;
    guint32 *to = (guint32 *)(void *)(cairo_image_surface_get_data(out) + (gsize)y * (gsize)out_stride);
    for (int x = 0; x < width; x++)
      to[x] = table[from[4 * x + 1]];
  }
  cairo_surface_mark_dirty(out);
  return out;
}

static void frame_rect(const AwMapPage *page, const AwFrame *frame)
{
  AwBox box = aw_upright_frame_box(&page->upright, frame);
  cairo_rectangle(page->cr, page->x + (box.x0 - page->box.x0) * page->scale,
                  page->y + (box.y0 - page->box.y0) * page->scale, (box.x1 - box.x0) * page->scale,
                  (box.y1 - box.y0) * page->scale);
}

static void draw_picture(const AwMapPage *page, const AwFrame *frame, const guint32 table[256])
{
  cairo_t *cr = page->cr;
  frame_rect(page, frame);
  aw_style_set_ink(cr, unseen);
  cairo_surface_t *raw = decode(frame), *surface = raw ? darken(raw, table) : NULL;
  if (!surface) {
    cairo_fill(cr);
    return;
  }
  AwBox box = aw_upright_frame_box(&page->upright, frame);
  cairo_save(cr);
  cairo_clip(cr);
  cairo_translate(cr, page->x + (box.x0 - page->box.x0) * page->scale, page->y + (box.y0 - page->box.y0) * page->scale);
  cairo_scale(cr, (box.x1 - box.x0) * page->scale / cairo_image_surface_get_width(surface),
              (box.y1 - box.y0) * page->scale / cairo_image_surface_get_height(surface));
  cairo_set_source_surface(cr, surface, 0, 0);
  cairo_pattern_set_filter(cairo_get_source(cr), CAIRO_FILTER_GOOD);
  cairo_pattern_set_extend(cairo_get_source(cr), CAIRO_EXTEND_PAD);
  cairo_paint(cr);
  cairo_restore(cr);
  cairo_surface_destroy(surface);
  cairo_surface_destroy(raw);
}

static gboolean can_place(const AwFrame *frame)
{
  return aw_scan_point_is_sane(frame->stage) && frame->width_px > 0 && frame->height_px > 0;
}

/* Light edges; numbers (as in the scan table, from 1) where a frame is large enough to carry one. */
static void draw_edge(const AwMapPage *page, const AwFrame *frame, guint number)
{
  double u = page->u;
  AwBox box = aw_upright_frame_box(&page->upright, frame);
  frame_rect(page, frame);
  cairo_set_source_rgba(page->cr, 1, 1, 1, 0.30);
  cairo_stroke(page->cr);
  if ((box.x1 - box.x0) * page->scale < 90 * u || (box.y1 - box.y0) * page->scale < 60 * u)
    return;
  g_autofree char *text = g_strdup_printf("%u", number);
  AwLabel label = { .size = 12 * u, .ink = { 1, 1, 1, 0.6 } };
  aw_label_draw(page->cr, &label, text, page->x + (box.x0 - page->box.x0) * page->scale + 6 * u,
                page->y + (box.y0 - page->box.y0) * page->scale + 3 * u);
}

void aw_map_draw_pictures(const AwMapPage *page)
{
  GPtrArray *frames = page->content->frames;
  guint32 table[256];
  if (!frames || frames->len == 0) {
    aw_style_set_ink(page->cr, aw_ink_night);
    cairo_paint(page->cr);
    return;
  }
  make_contrast(frames, table);
  for (guint i = 0; i < frames->len; i++)
    if (can_place(frames->pdata[i]))
      draw_picture(page, frames->pdata[i], table);
  cairo_set_line_width(page->cr, page->u);
  cairo_set_dash(page->cr, NULL, 0, 0);
  for (guint i = 0; i < frames->len; i++)
    if (can_place(frames->pdata[i]))
      draw_edge(page, frames->pdata[i], i + 1);
}

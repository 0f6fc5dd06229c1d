/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "figures/label.h"
#include "figures/map.h"
#include "figures/map_parts.h"
#include "image/overview.h"

#define MAX_SAMPLED 64 /* frames whose histogram sets the contrast of all */

/* Overviews are darkened, so that bright outlines read on the brightest nucleus. */
static const AwInk brightest = { 0.66, 0.68, 0.70, 1 };
static const AwInk unseen = { 0.17, 0.19, 0.225, 1 }; /* a frame without a picture */

/* The sides stand at a fixed place of a PNG and
 * are looked at first: a damaged record must not claim gigabytes. */
AwImage *aw_frame_picture(const AwFrame *frame)
{
  gsize n = 0;
  const guint8 *bytes = frame->overview ? g_bytes_get_data(frame->overview, &n) : NULL;
  guint32 sides[2];
  if (n < 24)
    return NULL;
  memcpy(sides, bytes + 16, sizeof sides);
  if (GUINT32_FROM_BE(sides[0]) > AW_MAX_OVERVIEW_SIDE_PX || GUINT32_FROM_BE(sides[1]) > AW_MAX_OVERVIEW_SIDE_PX)
    return NULL;
  return aw_overview_decode(frame->overview, "overview", NULL);
}

static void count_greys(const AwImage *image, gint64 histogram[256])
{
  gsize n = (gsize)image->width_px * (gsize)image->height_px;
  for (gsize i = 0; i < n; i++)
    histogram[((const guint8 *)image->pixels)[i]]++;
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
    g_autoptr(AwImage) image = aw_frame_picture(frames->pdata[i]);
    if (image)
      count_greys(image, histogram);
  }
  int lo = percentile(histogram, 0.05), hi = MAX(percentile(histogram, 0.998), lo + 12);
  for (int v = 0; v < 256; v++) {
    double t = pow(CLAMP((double)(v - lo) / (hi - lo), 0, 1), 0.8);
    table[v] = channel(aw_ink_night.r, brightest.r, t) << 16 | channel(aw_ink_night.g, brightest.g, t) << 8 |
               channel(aw_ink_night.b, brightest.b, t);
  }
}

static cairo_surface_t *darken(const AwImage *image, const guint32 table[256])
{
  cairo_surface_t *out = cairo_image_surface_create(CAIRO_FORMAT_RGB24, image->width_px, image->height_px);
  if (cairo_surface_status(out) != CAIRO_STATUS_SUCCESS)
    return out;
  gsize stride = (gsize)cairo_image_surface_get_stride(out), width = (gsize)image->width_px;
  for (gsize y = 0; y < (gsize)image->height_px; y++) {
    const guint8 *from = (const guint8 *)image->pixels + y * width;
    guint32 *to = (guint32 *)(void *)(cairo_image_surface_get_data(out) + y * stride);
    for (gsize x = 0; x < width; x++)
      to[x] = table[from[x]];
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

/* A picture pixel is k plane pixels a side, so that at the right and lower rim the picture may reach out of the frame;
 * the clip cuts that off. */
static void draw_picture(const AwMapPage *page, const AwFrame *frame, const guint32 table[256])
{
  cairo_t *cr = page->cr;
  frame_rect(page, frame);
  aw_style_set_ink(cr, unseen);
  g_autoptr(AwImage) image = aw_frame_picture(frame);
  if (!image) {
    cairo_fill(cr);
    return;
  }
  AwBox box = aw_upright_frame_box(&page->upright, frame);
  int k = aw_overview_factor(frame->width_px, frame->height_px, MAX(image->width_px, image->height_px));
  cairo_surface_t *surface = darken(image, table);
  cairo_save(cr);
  cairo_clip(cr);
  cairo_translate(cr, page->x + (box.x0 - page->box.x0) * page->scale, page->y + (box.y0 - page->box.y0) * page->scale);
  cairo_scale(cr, k * page->scale, k * page->scale);
  cairo_set_source_surface(cr, surface, 0, 0);
  cairo_pattern_set_filter(cairo_get_source(cr), CAIRO_FILTER_GOOD);
  cairo_pattern_set_extend(cairo_get_source(cr), CAIRO_EXTEND_PAD);
  cairo_paint(cr);
  cairo_restore(cr);
  cairo_surface_destroy(surface);
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

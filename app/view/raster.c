/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/raster.h"

#include <math.h>
#include <string.h>

#define SEAM 1.0 /* dark rim of a stamp, px */

struct AwRaster {
  cairo_surface_t *surface;
  int width, height;
  gsize stride; /* in pixels */
  guint32 *pixels;
};

struct AwStamp {
  int side; /* odd */
  guint32 *pixels;
};

AwRaster *aw_raster_new(void)
{
  return g_new0(AwRaster, 1);
}

void aw_raster_free(AwRaster *raster)
{
  if (!raster)
    return;
  g_clear_pointer(&raster->surface, cairo_surface_destroy);
  g_free(raster);
}

gboolean aw_raster_begin(AwRaster *raster, int width, int height)
{
  g_return_val_if_fail(raster && width > 0 && height > 0, FALSE);
  if (!raster->surface || raster->width != width || raster->height != height) {
    g_clear_pointer(&raster->surface, cairo_surface_destroy);
    raster->surface = cairo_image_surface_create(CAIRO_FORMAT_ARGB32, width, height);
  }
  if (cairo_surface_status(raster->surface) != CAIRO_STATUS_SUCCESS) {
    g_clear_pointer(&raster->surface, cairo_surface_destroy);
    return FALSE;
  }
  raster->width = width;
  raster->height = height;
  raster->stride = (gsize)cairo_image_surface_get_stride(raster->surface) / sizeof(guint32);
  cairo_surface_flush(raster->surface);
  raster->pixels = (guint32 *)(void *)cairo_image_surface_get_data(raster->surface);
  memset(raster->pixels, 0, raster->stride * (gsize)height * sizeof(guint32));
  return TRUE;
}

void aw_raster_paint(const AwRaster *raster, cairo_t *cr)
{
  g_return_if_fail(raster->surface);
  cairo_surface_mark_dirty(raster->surface);
  cairo_set_source_surface(cr, raster->surface, 0, 0);
  cairo_paint(cr);
}

/* Products of two bytes over 255, rounded, for two bytes at once (Blinn 1994). */
static guint32 scale_pair(guint32 pair, guint32 by)
{
  guint32 t = (pair & 0x00ff00ff) * by + 0x00800080;
  return ((t + ((t >> 8) & 0x00ff00ff)) >> 8) & 0x00ff00ff;
}

static guint32 scale_pixel(guint32 pixel, guint32 by)
{
  return scale_pair(pixel, by) | scale_pair(pixel >> 8, by) << 8;
}

/* Porter & Duff's "over", premultiplied. */
static void over(guint32 *at, guint32 ink)
{
  *at = ink + scale_pixel(*at, 255 - (ink >> 24));
}

AwStamp *aw_stamp_new(AwGlyph glyph, AwInk ink, double r)
{
  g_return_val_if_fail(r > 0 && r < 100, NULL);
  AwStamp *stamp = g_new0(AwStamp, 1);
  stamp->side = 2 * (int)ceil(r + SEAM) + 1;
  cairo_surface_t *surface = cairo_image_surface_create(CAIRO_FORMAT_ARGB32, stamp->side, stamp->side);
  cairo_t *cr = cairo_create(surface);
  double middle = stamp->side / 2.0;
  aw_style_set_ink(cr, aw_ink_casing);
  cairo_arc(cr, middle, middle, r + SEAM, 0, 2 * G_PI);
  cairo_fill(cr);
  aw_style_set_ink(cr, ink);
  aw_style_draw_glyph(cr, glyph, middle, middle, r);
  cairo_destroy(cr);
  cairo_surface_flush(surface);
  gsize side = (gsize)stamp->side, stride = (gsize)cairo_image_surface_get_stride(surface);
  stamp->pixels = g_new0(guint32, side * side);
  for (gsize y = 0; y < side; y++)
    memcpy(stamp->pixels + y * side, cairo_image_surface_get_data(surface) + y * stride, side * sizeof(guint32));
  cairo_surface_destroy(surface);
  return stamp;
}

void aw_stamp_free(AwStamp *stamp)
{
  if (!stamp)
    return;
  g_free(stamp->pixels);
  g_free(stamp);
}

void aw_raster_stamp(AwRaster *raster, const AwStamp *stamp, double x, double y)
{
  if (!(x > -100 && x < raster->width + 100 && y > -100 && y < raster->height + 100))
    return;
  int left = (int)floor(x) - stamp->side / 2, top = (int)floor(y) - stamp->side / 2;
  int x0 = MAX(left, 0), x1 = MIN(left + stamp->side, raster->width);
  int y0 = MAX(top, 0), y1 = MIN(top + stamp->side, raster->height);
  for (int row = y0; row < y1; row++) {
    guint32 *to = raster->pixels + (gsize)row * raster->stride;
    const guint32 *from = stamp->pixels + (row - top) * stamp->side - left;
    for (int column = x0; column < x1; column++)
      if (from[column])
        over(&to[column], from[column]);
  }
}

/* Cuts the line to the layer and a rim of 2 px (Liang & Barsky 1984); FALSE when nothing is left. */
static gboolean cut_line(const AwRaster *raster, double p[4])
{
  double dx = p[2] - p[0], dy = p[3] - p[1], t0 = 0, t1 = 1;
  double run[4] = { -dx, dx, -dy, dy };
  double room[4] = { p[0] + 2, raster->width + 2 - p[0], p[1] + 2, raster->height + 2 - p[1] };
  if (!isfinite(dx) || !isfinite(dy))
    return FALSE;
  for (int i = 0; i < 4; i++) {
    double t = room[i] / run[i];
    if (run[i] == 0 && room[i] < 0)
      return FALSE;
    if (run[i] < 0)
      t0 = MAX(t0, t);
    else if (run[i] > 0)
      t1 = MIN(t1, t);
  }
  double x = p[0], y = p[1];
  p[0] = x + t0 * dx;
  p[1] = y + t0 * dy;
  p[2] = x + t1 * dx;
  p[3] = y + t1 * dy;
  return t0 <= t1;
}

static void dot(AwRaster *raster, int x, int y, guint32 ink, double cover)
{
  if (x < 0 || y < 0 || x >= raster->width || y >= raster->height || cover <= 0)
    return;
  over(raster->pixels + (gsize)y * raster->stride + x, scale_pixel(ink, (guint32)(cover * 255 + 0.5)));
}

/* Wu 1991: step along the longer axis, share each step between the two nearest pixels. Pixel centres lie at + 0.5. */
void aw_raster_line(AwRaster *raster, double x0, double y0, double x1, double y1, AwInk ink)
{
  double p[4] = { x0 - 0.5, y0 - 0.5, x1 - 0.5, y1 - 0.5 };
  if (!cut_line(raster, p))
    return;
  guint32 a = (guint32)(ink.a * 255 + 0.5);
  guint32 colour =
      a << 24 | (guint32)(ink.r * a + 0.5) << 16 | (guint32)(ink.g * a + 0.5) << 8 | (guint32)(ink.b * a + 0.5);
  gboolean steep = fabs(p[3] - p[1]) > fabs(p[2] - p[0]);
  double from = steep ? p[1] : p[0], to = steep ? p[3] : p[2], at = steep ? p[0] : p[1];
  double slope = to == from ? 0 : ((steep ? p[2] : p[3]) - at) / (to - from);
  int first = (int)floor(MIN(from, to) + 0.5), last = (int)floor(MAX(from, to) + 0.5);
  for (int i = first; i <= last; i++) {
    double other = at + (i - from) * slope;
    int low = (int)floor(other);
    double share = other - low;
    dot(raster, steep ? low : i, steep ? i : low, colour, 1 - share);
    dot(raster, steep ? low + 1 : i, steep ? i : low + 1, colour, share);
  }
}

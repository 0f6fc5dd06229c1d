/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/raster.h"

#include <math.h>
#include <string.h>

#include "base/point.h"

#define SEAM 1.0       /* dark rim of a stamp, px */
#define SMALL_SEAM 0.6 /* of stamps under 2 px */

struct AwRaster {
  cairo_surface_t *surface;
  int width, height;
  gsize stride; /* in pixels */
  guint32 *pixels;
  AwRect touched; /* what was drawn on since the last begin; empty when x0 >= x1 */
};

struct AwStamp {
  int side; /* odd */
  guint32 *pixels;
  int *first, *last; /* of each row: the columns first <= x < last hold ink */
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

static void wipe(AwRaster *raster)
{
  AwRect t = raster->touched;
  cairo_surface_flush(raster->surface);
  for (int y = t.y0; y < t.y1 && t.x0 < t.x1; y++)
    memset(raster->pixels + (gsize)y * raster->stride + t.x0, 0, (gsize)(t.x1 - t.x0) * sizeof(guint32));
  raster->touched = (AwRect){ raster->width, raster->height, 0, 0 };
}

/* Notes that pixels x0 <= x < x1, y0 <= y < y1 may be drawn on; those outside the layer do not count. */
static void touch(AwRaster *raster, double x0, double y0, double x1, double y1)
{
  AwRect *t = &raster->touched;
  t->x0 = MIN(t->x0, (int)MAX(x0, 0));
  t->y0 = MIN(t->y0, (int)MAX(y0, 0));
  t->x1 = MAX(t->x1, (int)MIN(x1, raster->width));
  t->y1 = MAX(t->y1, (int)MIN(y1, raster->height));
}

gboolean aw_raster_begin(AwRaster *raster, int width, int height)
{
  g_return_val_if_fail(raster && width > 0 && height > 0, FALSE);
  if (raster->surface && raster->width == width && raster->height == height) {
    wipe(raster);
    return TRUE;
  }
  g_clear_pointer(&raster->surface, cairo_surface_destroy);
  raster->surface = cairo_image_surface_create(CAIRO_FORMAT_ARGB32, width, height); /* all clear */
  if (cairo_surface_status(raster->surface) != CAIRO_STATUS_SUCCESS) {
    g_clear_pointer(&raster->surface, cairo_surface_destroy);
    return FALSE;
  }
  raster->width = width;
  raster->height = height;
  raster->stride = (gsize)cairo_image_surface_get_stride(raster->surface) / sizeof(guint32);
  cairo_surface_flush(raster->surface);
  raster->pixels = (guint32 *)(void *)cairo_image_surface_get_data(raster->surface);
  raster->touched = (AwRect){ width, height, 0, 0 };
  return TRUE;
}

void aw_raster_paint(const AwRaster *raster, cairo_t *cr)
{
  g_return_if_fail(raster->surface);
  cairo_surface_mark_dirty(raster->surface);
  AwRect t = raster->touched;
  cairo_set_source_surface(cr, raster->surface, 0, 0);
  cairo_rectangle(cr, t.x0, t.y0, MAX(t.x1 - t.x0, 0), MAX(t.y1 - t.y0, 0));
  cairo_fill(cr);
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
  if (*at == 0 || ink >= 0xff000000)
    *at = ink;
  else
    *at = ink + scale_pixel(*at, 255 - (ink >> 24));
}

/* A dark disc behind the glyph; behind a plus, which often stands on another glyph, only a dark shape of it. */
static double seam_of(double r)
{
  return r < 2 ? SMALL_SEAM : SEAM;
}

static void draw_seam(cairo_t *cr, AwGlyph glyph, double middle, double r)
{
  aw_style_set_ink(cr, aw_ink_casing);
  if (glyph != AW_GLYPH_PLUS) {
    cairo_arc(cr, middle, middle, r + seam_of(r), 0, 2 * G_PI);
    cairo_fill(cr);
    return;
  }
  for (int k = 0; k < 4; k++)
    aw_style_draw_glyph(cr, glyph, middle + (k & 1 ? 0.7 : -0.7), middle + (k & 2 ? 0.7 : -0.7), r);
}

static void find_spans(AwStamp *stamp)
{
  stamp->first = g_new0(int, stamp->side);
  stamp->last = g_new0(int, stamp->side);
  for (int y = 0; y < stamp->side; y++) {
    const guint32 *row = stamp->pixels + y * stamp->side;
    int first = 0, last = stamp->side;
    while (first < last && row[first] == 0)
      first++;
    while (last > first && row[last - 1] == 0)
      last--;
    stamp->first[y] = first;
    stamp->last[y] = last;
  }
}

AwStamp *aw_stamp_new(AwGlyph glyph, AwInk ink, double r)
{
  g_return_val_if_fail(r > 0 && r < 100, NULL);
  AwStamp *stamp = g_new0(AwStamp, 1);
  stamp->side = 2 * (int)ceil(r + seam_of(r) - 0.5) + 1;
  cairo_surface_t *surface = cairo_image_surface_create(CAIRO_FORMAT_ARGB32, stamp->side, stamp->side);
  cairo_t *cr = cairo_create(surface);
  double middle = stamp->side / 2.0;
  draw_seam(cr, glyph, middle, r);
  aw_style_set_ink(cr, ink);
  aw_style_draw_glyph(cr, glyph, middle, middle, r);
  cairo_destroy(cr);
  cairo_surface_flush(surface);
  gsize side = (gsize)stamp->side, stride = (gsize)cairo_image_surface_get_stride(surface);
  stamp->pixels = g_new0(guint32, side * side);
  for (gsize y = 0; y < side; y++)
    memcpy(stamp->pixels + y * side, cairo_image_surface_get_data(surface) + y * stride, side * sizeof(guint32));
  cairo_surface_destroy(surface);
  find_spans(stamp);
  return stamp;
}

void aw_stamp_free(AwStamp *stamp)
{
  if (!stamp)
    return;
  g_free(stamp->pixels);
  g_free(stamp->first);
  g_free(stamp->last);
  g_free(stamp);
}

void aw_raster_stamp(AwRaster *raster, const AwStamp *stamp, double x, double y)
{
  if (!(x > -100 && x < raster->width + 100 && y > -100 && y < raster->height + 100))
    return;
  int left = (int)floor(x) - stamp->side / 2, top = (int)floor(y) - stamp->side / 2;
  int y0 = MAX(top, 0), y1 = MIN(top + stamp->side, raster->height);
  touch(raster, left, top, left + stamp->side, top + stamp->side);
  for (int row = y0; row < y1; row++) {
    int x0 = MAX(left + stamp->first[row - top], 0), x1 = MIN(left + stamp->last[row - top], raster->width);
    guint32 *to = raster->pixels + (gsize)row * raster->stride;
    const guint32 *from = stamp->pixels + (row - top) * stamp->side - left;
    for (int column = x0; column < x1; column++)
      over(&to[column], from[column]);
  }
}

/* Cuts the line to the layer and a rim of `rim` px (Liang & Barsky 1984); FALSE when nothing is left. */
static gboolean cut_line(const AwRaster *raster, double rim, double p[4])
{
  double dx = p[2] - p[0], dy = p[3] - p[1], t0 = 0, t1 = 1;
  double run[4] = { -dx, dx, -dy, dy };
  double room[4] = { p[0] + rim, raster->width + rim - p[0], p[1] + rim, raster->height + rim - p[1] };
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

/* A line seen along its longer axis i: it runs through `at` + slope (i - from) across it, first <= i <= last. */
typedef struct {
  gboolean steep;
  double from, at, slope;
  double first, last;
} Track;

static Track track_of(const double p[4])
{
  Track t = { .steep = fabs(p[3] - p[1]) > fabs(p[2] - p[0]) };
  double to = t.steep ? p[3] : p[2], to_across = t.steep ? p[2] : p[3];
  t.from = t.steep ? p[1] : p[0];
  t.at = t.steep ? p[0] : p[1];
  t.slope = to == t.from ? 0 : (to_across - t.at) / (to - t.from);
  t.first = MIN(t.from, to);
  t.last = MAX(t.from, to);
  return t;
}

/* One pixel of a track, when it lies on the layer. */
static guint32 *pixel_on(AwRaster *raster, const Track *track, int i, int across)
{
  int x = track->steep ? across : i, y = track->steep ? i : across;
  if (x < 0 || y < 0 || x >= raster->width || y >= raster->height)
    return NULL;
  return raster->pixels + (gsize)y * raster->stride + x;
}

/* floor() for small numbers, without a call. */
static inline int whole(double v)
{
  int i = (int)v;
  return i - (v < i);
}

/* A pixel is covered by how far its centre lies inside the line's edge, and by how much of its step the line runs
 * through: Wu's hairline (1991) for any width. */
static void cover_step(AwRaster *raster, const Track *track, int i, double half, guint32 ink)
{
  double share = MIN(track->last, i + 0.5) - MAX(track->first, i - 0.5);
  double middle = track->at + (i - track->from) * track->slope;
  int last = whole(middle + half + 0.5);
  for (int across = whole(middle - half + 0.5); across <= last; across++) {
    double cover = MIN(half + 0.5 - fabs(across - middle), 1) * share;
    guint32 *pixel = cover > 0 ? pixel_on(raster, track, i, across) : NULL;
    if (pixel)
      over(pixel, scale_pixel(ink, (guint32)(cover * 255 + 0.5)));
  }
}

static guint32 premultiplied(AwInk ink)
{
  guint32 a = (guint32)(ink.a * 255 + 0.5);
  return a << 24 | (guint32)(ink.r * a + 0.5) << 16 | (guint32)(ink.g * a + 0.5) << 8 | (guint32)(ink.b * a + 0.5);
}

void aw_raster_line(AwRaster *raster, const AwStroke *stroke, double x0, double y0, double x1, double y1)
{
  double p[4] = { x0 - 0.5, y0 - 0.5, x1 - 0.5, y1 - 0.5 }; /* pixel centres lie on whole numbers here */
  if (!cut_line(raster, stroke->width + 2, p))
    return;
  Track track = track_of(p);
  double half = MAX(stroke->width, 1) / 2 * sqrt(1 + track.slope * track.slope);
  guint32 ink = premultiplied(stroke->ink);
  touch(raster, MIN(p[0], p[2]) - half - 1, MIN(p[1], p[3]) - half - 1, MAX(p[0], p[2]) + half + 2,
        MAX(p[1], p[3]) + half + 2);
  int last = whole(track.last + 0.5);
  for (int i = whole(track.first + 0.5); i <= last; i++)
    cover_step(raster, &track, i, half, ink);
}

/* Draws the dashes of one side of an outline; *gone is the length behind it, which tells where in the pattern it is. */
static void dashed_side(AwRaster *raster, const AwStroke *stroke, const double p[4], double *gone)
{
  double length = hypot(p[2] - p[0], p[3] - p[1]), period = 0, done = 0;
  for (int i = 0; i < stroke->n_dash; i++)
    period += stroke->dash[i];
  if (!(period > 0.5) || !(length < 1e5))
    return;
  double at = fmod(*gone, period);
  int k = 0;
  for (; at >= stroke->dash[k] && k < stroke->n_dash - 1; k++)
    at -= stroke->dash[k];
  for (; done < length; k = (k + 1) % stroke->n_dash, at = 0) {
    double end = MIN(length, done + stroke->dash[k] - at), a = done / length, b = end / length;
    if (k % 2 == 0)
      aw_raster_line(raster, stroke, p[0] + (p[2] - p[0]) * a, p[1] + (p[3] - p[1]) * a, p[0] + (p[2] - p[0]) * b,
                     p[1] + (p[3] - p[1]) * b);
    done = end;
  }
  *gone += length;
}

/* A side of a full outline, half a pixel longer at both ends: shares of one pixel laid over each other by two sides
 * would leave a pale bead at every corner. */
static void full_side(AwRaster *raster, const AwStroke *stroke, const double p[4])
{
  double length = hypot(p[2] - p[0], p[3] - p[1]), dx = 0, dy = 0;
  if (length > 0) {
    dx = (p[2] - p[0]) / length / 2;
    dy = (p[3] - p[1]) / length / 2;
  }
  aw_raster_line(raster, stroke, p[0] - dx, p[1] - dy, p[2] + dx, p[3] + dy);
}

void aw_raster_outline(AwRaster *raster, const AwStroke *stroke, const double *xy, gsize n)
{
  double gone = 0;
  for (gsize i = 0; i < n; i++) {
    gsize j = i + 1 < n ? i + 1 : 0;
    double p[4] = { xy[2 * i], xy[2 * i + 1], xy[2 * j], xy[2 * j + 1] };
    if (stroke->dash)
      dashed_side(raster, stroke, p, &gone);
    else
      full_side(raster, stroke, p);
  }
}

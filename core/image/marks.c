/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/marks.h"

#include <math.h>
#include <stdlib.h>

#include "base/error.h"
#include "base/text.h"
#include "image/smooth.h"

#define MIN_CONTRAST 6.0 /* response over the spread of the responses */
#define MIN_LEAD 1.25    /* of the strongest mark over the next */
#define WINDOW_SIGMA 0.5 /* of the centroid's window, diameters */
#define WINDOW_REACH 1.5 /* its radius, diameters */
#define MAD_TO_SIGMA 1.4826
#define MAX_ROUNDS 200
#define CLOSE_ENOUGH_PX 1e-6

static gboolean check_settings(const AwMarkSettings *s, GError **error)
{
  if (s->diameter_px >= 2 && s->diameter_px <= 200)
    return TRUE;
  g_autofree char *diameter = aw_text_from_double(s->diameter_px, 1);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "a mark of %s px cannot be looked for; the limits are 2 to 200 px",
              diameter);
  return FALSE;
}

static AwPlane *plane_of(const AwImage *image, gboolean dark, GError **error)
{
  AwPlane *plane = aw_plane_new(image->width_px, image->height_px, error);
  for (int y = 0; plane && y < image->height_px; y++) {
    float *row = aw_plane_row(plane, y);
    for (int x = 0; x < image->width_px; x++)
      row[x] = (float)(dark ? -aw_image_value(image, x, y) : aw_image_value(image, x, y));
  }
  return plane;
}

/* Minus the Laplacian of the smoothed plane at a pixel that is not at the border. */
static double response(const AwPlane *smooth, int x, int y)
{
  const float *row = aw_plane_row(smooth, y);
  return 4.0 * (double)row[x] - (double)row[x - 1] - (double)row[x + 1] - (double)row[x - smooth->width_px] -
         (double)row[x + smooth->width_px];
}

/* A peak of the response. */
typedef struct {
  int x, y;
  double value;
} Peak;

static gboolean is_peak(const AwPlane *smooth, int x, int y, double value)
{
  for (int dy = -1; dy <= 1; dy++)
    for (int dx = -1; dx <= 1; dx++) {
      int nx = x + dx, ny = y + dy;
      if (nx < 1 || ny < 1 || nx >= smooth->width_px - 1 || ny >= smooth->height_px - 1)
        continue;
      if (response(smooth, nx, ny) > value)
        return FALSE;
    }
  return TRUE;
}

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static double median(GArray *values)
{
  qsort(values->data, values->len, sizeof(double), compare_doubles);
  return values->len ? g_array_index(values, double, values->len / 2) : 0;
}

/* Median and robust spread; the values are left as distances from the median. */
static void spread_of(GArray *values, double *middle, double *sigma)
{
  *middle = median(values);
  for (guint i = 0; i < values->len; i++)
    g_array_index(values, double, i) = fabs(g_array_index(values, double, i) - *middle);
  *sigma = MAD_TO_SIGMA * median(values);
}

/* The robust spread of the response over the image, from at most some 40000 pixels. */
static double response_spread(const AwPlane *smooth)
{
  g_autoptr(GArray) values = g_array_new(FALSE, FALSE, sizeof(double));
  int step = 1 + (int)sqrt((double)smooth->width_px * smooth->height_px / 40000);
  for (int y = 1; y < smooth->height_px - 1; y += step)
    for (int x = 1; x < smooth->width_px - 1; x += step) {
      double v = response(smooth, x, y);
      g_array_append_val(values, v);
    }
  double middle, sigma;
  spread_of(values, &middle, &sigma);
  return sigma;
}

/* A ring round a mark of the other tone also bends that way; a mark itself stands above what lies round it, a Gaussian
 * one by response d^2 / 8. */
static gboolean stands_out(const AwPlane *smooth, const Peak *peak, double diameter)
{
  double reach = WINDOW_REACH * diameter;
  int n_above = 0;
  float need = (float)(peak->value * diameter * diameter / 32), own = aw_plane_row(smooth, peak->y)[peak->x];
  for (int k = 0; k < 8; k++) {
    int x = (int)lround(peak->x + reach * cos(k * G_PI / 4)), y = (int)lround(peak->y + reach * sin(k * G_PI / 4));
    float there = aw_plane_row(smooth, CLAMP(y, 0, smooth->height_px - 1))[CLAMP(x, 0, smooth->width_px - 1)];
    n_above += own - there > need;
  }
  return n_above >= 6;
}

/* All peaks above `least`, and with `near` within reach of it. */
static GArray *peaks_of(const AwPlane *smooth, const AwMarkSettings *s, double least)
{
  GArray *peaks = g_array_new(FALSE, FALSE, sizeof(Peak));
  double reach = s->reach_px > 0 ? s->reach_px : 3 * s->diameter_px;
  for (int y = 1; y < smooth->height_px - 1; y++)
    for (int x = 1; x < smooth->width_px - 1; x++) {
      double v = response(smooth, x, y);
      if (v <= least || (s->near && hypot(x - s->near->x_px, y - s->near->y_px) > reach))
        continue;
      Peak peak = { x, y, v };
      if (is_peak(smooth, x, y, v) && stands_out(smooth, &peak, s->diameter_px))
        g_array_append_val(peaks, peak);
    }
  return peaks;
}

/* Orders peaks: with `near` by distance among those of at least half the best response, else by response. */
static const Peak *choose(GArray *peaks, const AwMarkSettings *s, const Peak **rival)
{
  const Peak *best = &g_array_index(peaks, Peak, 0), *chosen = NULL;
  *rival = NULL;
  for (guint i = 0; i < peaks->len; i++)
    if (g_array_index(peaks, Peak, i).value > best->value)
      best = &g_array_index(peaks, Peak, i);
  for (guint i = 0; i < peaks->len; i++) {
    const Peak *p = &g_array_index(peaks, Peak, i);
    double d = s->near ? hypot(p->x - s->near->x_px, p->y - s->near->y_px) : 0;
    if (s->near && p->value >= best->value / 2 &&
        (!chosen || d < hypot(chosen->x - s->near->x_px, chosen->y - s->near->y_px)))
      chosen = p;
    if (!s->near && hypot(p->x - best->x, p->y - best->y) > s->diameter_px && (!*rival || p->value > (*rival)->value))
      *rival = p;
  }
  return chosen ? chosen : best;
}

/* Median and noise of the ground in a ring round (x, y). */
static void measure_ground(const AwPlane *plane, double x, double y, double diameter, AwMark *mark)
{
  g_autoptr(GArray) values = g_array_new(FALSE, FALSE, sizeof(double));
  double inner = WINDOW_REACH * diameter, outer = inner + fmax(diameter, 3);
  for (int iy = (int)fmax(0, y - outer); iy <= fmin(plane->height_px - 1, y + outer); iy++)
    for (int ix = (int)fmax(0, x - outer); ix <= fmin(plane->width_px - 1, x + outer); ix++) {
      double d = hypot(ix - x, iy - y), v = (double)aw_plane_row(plane, iy)[ix];
      if (d > inner && d <= outer)
        g_array_append_val(values, v);
    }
  spread_of(values, &mark->ground, &mark->noise);
}

/* Sums of one round over the window. */
typedef struct {
  double w, wx, wy; /* weighted light and its first moments about the present place */
  double dx, dy;    /* derivative of wx and wy by a move of the place, negative */
  double xx, yy;    /* squares of what a pixel's noise adds to wx and wy */
} Sums;

static Sums sums_at(const AwPlane *plane, AwPixelPoint c, double diameter, double ground)
{
  Sums s = { 0 };
  double sigma = WINDOW_SIGMA * diameter, reach = WINDOW_REACH * diameter;
  for (int y = (int)ceil(c.y_px - reach); y <= c.y_px + reach; y++)
    for (int x = (int)ceil(c.x_px - reach); x <= c.x_px + reach; x++) {
      double u = x - c.x_px, v = y - c.y_px, w = exp(-(u * u + v * v) / (2 * sigma * sigma));
      double light = (double)aw_plane_row(plane, y)[x] - ground;
      s.w += w * light;
      s.wx += w * light * u;
      s.wy += w * light * v;
      s.dx += w * light * (u * u / (sigma * sigma) - 1);
      s.dy += w * light * (v * v / (sigma * sigma) - 1);
      s.xx += w * w * u * u;
      s.yy += w * w * v * v;
    }
  return s;
}

static gboolean window_fits(const AwPlane *plane, AwPixelPoint c, double diameter)
{
  double reach = WINDOW_REACH * diameter;
  return c.x_px >= reach && c.y_px >= reach && c.x_px <= plane->width_px - 1 - reach &&
         c.y_px <= plane->height_px - 1 - reach;
}

/* Moves the window onto its centroid; the standard error is that of the root of its first moment. */
static gboolean place(const AwPlane *plane, const Peak *peak, double diameter, AwMark *mark, GError **error)
{
  AwPixelPoint c = { peak->x, peak->y };
  Sums s = { 0 };
  double moved = INFINITY;
  for (int round = 0; round < MAX_ROUNDS && moved > CLOSE_ENOUGH_PX && window_fits(plane, c, diameter); round++) {
    s = sums_at(plane, c, diameter, mark->ground);
    double dx = CLAMP(s.wx / s.w, -1, 1), dy = CLAMP(s.wy / s.w, -1, 1);
    c = (AwPixelPoint){ c.x_px + dx, c.y_px + dy };
    moved = hypot(dx, dy);
  }
  if (!window_fits(plane, c, diameter)) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "the mark near pixel (%d, %d) is cut by the image's edge", peak->x,
                peak->y);
    return FALSE;
  }
  if (!(moved <= 1e-3) || hypot(c.x_px - peak->x, c.y_px - peak->y) > diameter) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "what stands at pixel (%d, %d) is no mark of that size", peak->x,
                peak->y);
    return FALSE;
  }
  mark->at = c;
  mark->se_px = mark->noise * sqrt((s.xx / (s.dx * s.dx) + s.yy / (s.dy * s.dy)) / 2);
  mark->height = (double)aw_plane_row(plane, (int)lround(c.y_px))[lround(c.x_px)] - mark->ground;
  return TRUE;
}

static gboolean refuse(GArray *peaks, const AwMarkSettings *s, const Peak *chosen, const Peak *rival, GError **error)
{
  if (peaks->len == 0) {
    g_autofree char *diameter = aw_text_from_double(s->diameter_px, 1);
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "no %s mark of about %s px stands out %s",
                s->dark ? "dark" : "bright", diameter, s->near ? "near that pixel" : "from the image");
    return TRUE;
  }
  if (rival && chosen->value < MIN_LEAD * rival->value) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "two marks stand out alike, at pixels (%d, %d) and (%d, %d); say which one is meant", chosen->x,
                chosen->y, rival->x, rival->y);
    return TRUE;
  }
  return FALSE;
}

gboolean aw_mark_find(const AwImage *image, const AwMarkSettings *settings, AwMark *mark, GError **error)
{
  *mark = (AwMark){ 0 };
  if (!check_settings(settings, error))
    return FALSE;
  g_autoptr(AwPlane) plane = plane_of(image, settings->dark, error);
  g_autoptr(AwPlane) smooth = plane ? aw_smooth_plane(plane, settings->diameter_px / 2 / sqrt(2), error) : NULL;
  if (!smooth)
    return FALSE;
  double least = MIN_CONTRAST * response_spread(smooth) + 1e-9;
  g_autoptr(GArray) peaks = peaks_of(smooth, settings, least);
  const Peak *rival = NULL, *chosen = peaks->len ? choose(peaks, settings, &rival) : NULL;
  if (refuse(peaks, settings, chosen, rival, error) || !chosen)
    return FALSE;
  measure_ground(plane, chosen->x, chosen->y, settings->diameter_px, mark);
  if (!place(plane, chosen, settings->diameter_px, mark, error))
    return FALSE;
  mark->ground = settings->dark ? -mark->ground : mark->ground;
  return TRUE;
}

double aw_mark_spot_error(double s, double a, double n_photons, double b)
{
  double photons = (s * s + a * a / 12) / n_photons;
  return sqrt(photons + 8 * G_PI * pow(s, 4) * b * b / (a * a * n_photons * n_photons));
}

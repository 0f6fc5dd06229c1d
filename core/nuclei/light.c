/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/light.h"

#include <gsl/gsl_statistics_double.h>

#include "nuclei/measure.h"

/*
 * Rays stand at right angles on the outline, evenly spaced along it. Outwards they sample the ring of the local
 * background; across the line they sample the edge profile. Both are cheaper than rasters and follow any shape.
 */
#define N_RAYS 24
#define N_RING 5     /* samples of the ring on each ray */
#define MIN_RING 8   /* free pixels that make a background */
#define REACH_PX 3.5 /* the edge profile runs from -REACH_PX to REACH_PX in steps of 1 px */
#define N_PROFILE 8
#define MIN_CLEAR_RAYS 4
#define SATURATED_LIMIT 0.01
#define MIN_PILE_PX 16

typedef struct {
  double x, y, nx, ny; /* foot on the outline, outward unit normal; px */
} Ray;

static inline double pixel(const AwImage *image, gsize i)
{
  switch (image->sample) {
  case AW_SAMPLE_U8:
    return ((const guint8 *)image->pixels)[i];
  case AW_SAMPLE_U16:
    return ((const guint16 *)image->pixels)[i];
  default:
    return (double)((const float *)image->pixels)[i];
  }
}

static double edge_length(const AwScanPoint *p, gsize n, gsize i)
{
  gsize j = i + 1 == n ? 0 : i + 1;
  double dx = p[j].x_um - p[i].x_um, dy = p[j].y_um - p[i].y_um;
  return sqrt(dx * dx + dy * dy);
}

static void cast_rays(const AwScanPoint *p, gsize n, Ray *rays)
{
  double total = 0, begin = 0;
  for (gsize i = 0; i < n; i++)
    total += edge_length(p, n, i);
  gsize i = 0;
  double length = edge_length(p, n, 0);
  for (int k = 0; k < N_RAYS; k++) {
    double at = (k + 0.5) * total / N_RAYS;
    while (at > begin + length && i + 1 < n) {
      begin += length;
      length = edge_length(p, n, ++i);
    }
    gsize j = i + 1 == n ? 0 : i + 1;
    double ux = (p[j].x_um - p[i].x_um) / length, uy = (p[j].y_um - p[i].y_um) / length;
    rays[k] = (Ray){ p[i].x_um + (at - begin) * ux, p[i].y_um + (at - begin) * uy, uy, -ux };
  }
}

/* Index of the pixel at a distance along a ray, or -1 outside the image. */
static gssize pixel_at(const AwImage *image, Ray ray, double distance)
{
  double x = ray.x + distance * ray.nx + 0.5, y = ray.y + distance * ray.ny + 0.5;
  if (!(x >= 0) || !(y >= 0) || x >= image->width_px || y >= image->height_px)
    return -1;
  return (gssize)(int)y * image->width_px + (int)x;
}

static gsize sample_ring(const AwImage *image, const AwLabels *labels, const Ray *rays, double gap, double width,
                         double *values)
{
  gsize n = 0;
  for (int k = 0; k < N_RAYS; k++)
    for (int j = 0; j < N_RING; j++) {
      gssize at = pixel_at(image, rays[k], gap + (j + 0.5) * width / N_RING);
      if (at >= 0 && labels->label[at] == 0)
        values[n++] = pixel(image, (gsize)at);
    }
  return n;
}

/* The ring begins a quarter radius outside the line (2 to 8 px) and is half a radius wide (3 to 16 px). */
static double ring_background(const AwImage *image, const AwLabels *labels, const Ray *rays, double radius_px)
{
  double values[N_RAYS * N_RING];
  double gap = CLAMP(radius_px / 4, 2, 8), width = CLAMP(radius_px / 2, 3, 16);
  for (int attempt = 0; attempt < 3; attempt++, width *= 2) {
    gsize n = sample_ring(image, labels, rays, gap, width, values);
    if (n >= MIN_RING)
      return gsl_stats_median(values, 1, n);
  }
  return NAN;
}

/* Adds one ray's profile; FALSE when it leaves the image or meets a mask other than `own` (0: any may be met). */
static gboolean add_profile(const AwImage *image, const AwLabels *labels, Ray ray, guint32 own, double *sums)
{
  double values[N_PROFILE];
  for (int k = 0; k < N_PROFILE; k++) {
    gssize at = pixel_at(image, ray, k - REACH_PX);
    if (at < 0 || (own && labels->label[at] && labels->label[at] != own))
      return FALSE;
    values[k] = pixel(image, (gsize)at);
  }
  for (int k = 0; k < N_PROFILE; k++)
    sums[k] += values[k];
  return TRUE;
}

static int mean_profile(const AwImage *image, const AwLabels *labels, const Ray *rays, guint32 own, double *mean)
{
  int n = 0;
  for (int j = 0; j < N_PROFILE; j++)
    mean[j] = 0;
  for (int k = 0; k < N_RAYS; k++)
    n += add_profile(image, labels, rays[k], own, mean);
  for (int j = 0; j < N_PROFILE && n; j++)
    mean[j] /= n;
  return n;
}

/* The steepest fall of the mean profile over one pixel, image units per px. */
static double steepest_slope(const AwImage *image, const AwLabels *labels, const Ray *rays, guint32 own)
{
  double mean[N_PROFILE], steepest = 0;
  if (mean_profile(image, labels, rays, own, mean) < MIN_CLEAR_RAYS)
    mean_profile(image, labels, rays, 0, mean);
  for (int j = 1; j < N_PROFILE; j++)
    steepest = MAX(steepest, mean[j - 1] - mean[j]);
  return steepest;
}

static double sum_run(const AwImage *image, AwRun run, double level, gsize *n_saturated)
{
  gsize row = (gsize)run.y * (gsize)image->width_px;
  double sum = 0;
  for (gsize i = row + (gsize)run.x0; i < row + (gsize)run.x1; i++) {
    double v = pixel(image, i);
    sum += v;
    *n_saturated += level > 0 && v >= level;
  }
  return sum;
}

void aw_light_measure(const AwImage *image, const AwLabels *labels, guint32 label, double saturation_level,
                      AwNucleus *nucleus)
{
  Ray rays[N_RAYS];
  gsize n_saturated = 0;
  double sum = 0;
  for (gsize i = 0; i < nucleus->n_runs; i++)
    sum += sum_run(image, nucleus->runs[i], saturation_level, &n_saturated);
  nucleus->mean = sum / nucleus->area;
  nucleus->integrated = sum;
  nucleus->saturated_frac = (double)n_saturated / nucleus->area;
  if (nucleus->saturated_frac > SATURATED_LIMIT)
    nucleus->flags |= AW_FLAG_SATURATED;
  cast_rays(nucleus->outline, nucleus->n_outline, rays);
  nucleus->background = ring_background(image, labels, rays, nucleus->diameter / 2);
  nucleus->sharpness = steepest_slope(image, labels, rays, label);
}

static double smallest_value(const AwImage *image)
{
  gsize n = (gsize)image->width_px * (gsize)image->height_px;
  double least = INFINITY;
  for (gsize i = 0; i < n; i++)
    least = MIN(least, pixel(image, i));
  return least;
}

static double common_background(const AwImage *image, GPtrArray *nuclei)
{
  g_autofree double *known = g_new(double, nuclei->len + 1);
  gsize n = 0;
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *nucleus = nuclei->pdata[i];
    if (!isnan(nucleus->background))
      known[n++] = nucleus->background;
  }
  return n == nuclei->len ? 0 : n ? gsl_stats_median(known, 1, n) : smallest_value(image);
}

void aw_light_settle(const AwImage *image, GPtrArray *nuclei)
{
  double common = common_background(image, nuclei);
  for (guint i = 0; i < nuclei->len; i++) {
    AwNucleus *nucleus = nuclei->pdata[i];
    if (isnan(nucleus->background))
      nucleus->background = common;
    double contrast = nucleus->mean - nucleus->background;
    nucleus->integrated -= nucleus->area * nucleus->background;
    nucleus->sharpness = contrast > 0 ? nucleus->sharpness / contrast : 0;
  }
}

/* TRUE for 2^k - 1 with k >= 8 and for the same bits at the top of 16: 4095, 16383, 65520 and the like. */
static gboolean is_full_scale(guint value)
{
  if (value >= 1u << 15)
    while (!(value & 1))
      value >>= 1;
  return value >= 255 && (value & (value + 1)) == 0;
}

double aw_saturation_level(const AwImage *image)
{
  gsize n = (gsize)image->width_px * (gsize)image->height_px, at = 0;
  if (!(image->full_scale > 0))
    return 0;
  double largest = 0;
  for (gsize i = 0; i < n; i++)
    largest = MAX(largest, pixel(image, i));
  if (largest >= image->full_scale)
    return largest;
  for (gsize i = 0; i < n; i++)
    at += pixel(image, i) >= largest;
  return image->sample == AW_SAMPLE_U16 && at >= MIN_PILE_PX && is_full_scale((guint)largest) ? largest : 0;
}

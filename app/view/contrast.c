/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "view/contrast.h"

#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics_double.h>

#define MAX_SAMPLED 200000

guint8 aw_contrast_grey(const AwContrast *contrast, double value)
{
  double range = contrast->high - contrast->low, t = value > contrast->low;
  if (range > 0)
    t = CLAMP((value - contrast->low) / range, 0, 1);
  double grey = isnan(t) ? 0 : pow(t, CLAMP(contrast->gamma, AW_MIN_GAMMA, AW_MAX_GAMMA));
  guint8 shown = (guint8)(grey * 255 + 0.5);
  return contrast->inverted ? 255 - shown : shown;
}

static gsize n_pixels(const AwImage *image)
{
  return (gsize)image->width_px * (gsize)image->height_px;
}

static double pixel(const AwImage *image, gsize i)
{
  if (image->sample == AW_SAMPLE_U8)
    return ((const guint8 *)image->pixels)[i];
  if (image->sample == AW_SAMPLE_U16)
    return ((const guint16 *)image->pixels)[i];
  return (double)((const float *)image->pixels)[i];
}

void aw_contrast_set_percentiles(AwContrast *contrast, const AwImage *const *images, gsize n, double low_frac,
                                 double high_frac)
{
  g_return_if_fail(contrast && low_frac >= 0 && low_frac < high_frac && high_frac <= 1);
  gsize total = 0, n_taken = 0;
  for (gsize k = 0; k < n; k++)
    total += n_pixels(images[k]);
  gsize stride = total / MAX_SAMPLED + 1, next = 0;
  double *taken = g_new(double, total / stride + 2);
  for (gsize k = 0; k < n; k++) {
    for (; next < n_pixels(images[k]); next += stride) {
      double value = pixel(images[k], next);
      if (isfinite(value))
        taken[n_taken++] = value;
    }
    next -= n_pixels(images[k]);
  }
  gsl_sort(taken, 1, n_taken);
  if (n_taken > 0) {
    contrast->low = gsl_stats_quantile_from_sorted_data(taken, 1, n_taken, low_frac);
    contrast->high = gsl_stats_quantile_from_sorted_data(taken, 1, n_taken, high_frac);
  }
  g_free(taken);
}

struct AwGreys {
  AwContrast contrast;
  guint8 of_int[65536];
};

AwGreys *aw_greys_new(const AwContrast *contrast)
{
  AwGreys *greys = g_new(AwGreys, 1);
  greys->contrast = *contrast;
  for (int i = 0; i < 65536; i++)
    greys->of_int[i] = aw_contrast_grey(contrast, i);
  return greys;
}

void aw_greys_free(AwGreys *greys)
{
  g_free(greys);
}

static void render_row(const AwGreys *greys, const AwImage *image, gsize first, guint32 *to)
{
  gsize n = (gsize)image->width_px;
  if (image->sample == AW_SAMPLE_U8)
    for (gsize x = 0; x < n; x++)
      to[x] = greys->of_int[((const guint8 *)image->pixels)[first + x]] * 0x010101u;
  else if (image->sample == AW_SAMPLE_U16)
    for (gsize x = 0; x < n; x++)
      to[x] = greys->of_int[((const guint16 *)image->pixels)[first + x]] * 0x010101u;
  else
    for (gsize x = 0; x < n; x++)
      to[x] = aw_contrast_grey(&greys->contrast, (double)((const float *)image->pixels)[first + x]) * 0x010101u;
}

cairo_surface_t *aw_greys_render(const AwGreys *greys, const AwImage *image)
{
  cairo_surface_t *surface = cairo_image_surface_create(CAIRO_FORMAT_RGB24, image->width_px, image->height_px);
  if (cairo_surface_status(surface) != CAIRO_STATUS_SUCCESS) {
    cairo_surface_destroy(surface);
    return NULL;
  }
  cairo_surface_flush(surface);
  guint32 *to = (guint32 *)(void *)cairo_image_surface_get_data(surface);
  gsize stride = (gsize)cairo_image_surface_get_stride(surface) / sizeof(guint32);
  for (gsize y = 0; y < (gsize)image->height_px; y++)
    render_row(greys, image, y * (gsize)image->width_px, to + y * stride);
  cairo_surface_mark_dirty(surface);
  return surface;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/overview.h"

#include <gsl/gsl_statistics_float.h>
#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/limits.h"
#include "image/png_file.h"

#define LOW_FRAC 0.01
#define HIGH_FRAC 0.998
#define BAND_PIXELS (1 << 22)

int aw_overview_factor(int width_px, int height_px, int max_side_px)
{
  g_return_val_if_fail(max_side_px >= 1, 1);
  return MAX((MAX(width_px, height_px) + max_side_px - 1) / max_side_px, 1);
}

static AwImage *new_small(int width_px, int height_px, int k, GError **error)
{
  return aw_image_new((width_px + k - 1) / k, (height_px + k - 1) / k, AW_SAMPLE_F32, error);
}

static void add_row(const AwImage *band, int y, int k, double *sums)
{
  gsize width = (gsize)band->width_px, first = (gsize)y * width;
  for (gsize x0 = 0, i = 0; x0 < width; x0 += (gsize)k, i++) {
    gsize x1 = MIN(x0 + (gsize)k, width);
    double sum = 0;
    if (band->sample == AW_SAMPLE_U16)
      for (gsize x = x0; x < x1; x++)
        sum += ((const guint16 *)band->pixels)[first + x];
    else if (band->sample == AW_SAMPLE_U8)
      for (gsize x = x0; x < x1; x++)
        sum += ((const guint8 *)band->pixels)[first + x];
    else
      for (gsize x = x0; x < x1; x++)
        sum += (double)((const float *)band->pixels)[first + x];
    sums[i] += sum;
  }
}

/* Shrinks the rows of `band`, whose first row is a multiple of k, into the rows of `small` from row_px on. */
static gboolean shrink_band(const AwImage *band, int k, AwImage *small, int row_px, GError **error)
{
  gsize n = (gsize)small->width_px;
  g_autofree double *sums = aw_try_alloc(n, sizeof *sums, "the sums of an overview", error);
  if (!sums)
    return FALSE;
  for (int y0 = 0; y0 < band->height_px; y0 += k, row_px++) {
    int y1 = MIN(y0 + k, band->height_px);
    memset(sums, 0, n * sizeof *sums);
    for (int y = y0; y < y1; y++)
      add_row(band, y, k, sums);
    float *out = (float *)small->pixels + (gsize)row_px * n;
    for (gsize i = 0; i < n; i++) {
      int across = MIN(k, band->width_px - (int)i * k);
      out[i] = (float)(sums[i] / ((double)across * (y1 - y0)));
    }
  }
  return TRUE;
}

AwImage *aw_image_shrink(const AwImage *image, int max_side_px, GError **error)
{
  g_return_val_if_fail(image && max_side_px >= 1, NULL);
  int k = aw_overview_factor(image->width_px, image->height_px, max_side_px);
  g_autoptr(AwImage) small = new_small(image->width_px, image->height_px, k, error);
  if (!small || !shrink_band(image, k, small, 0, error))
    return NULL;
  return g_steal_pointer(&small);
}

AwImage *aw_image_reader_shrink(AwImageReader *reader, int max_side_px, GError **error)
{
  g_return_val_if_fail(reader && max_side_px >= 1, NULL);
  const AwImageInfo *info = aw_image_reader_info(reader);
  int k = aw_overview_factor(info->width_px, info->height_px, max_side_px);
  int rows = MAX(BAND_PIXELS / info->width_px / k, 1) * k;
  g_autoptr(AwImage) small = new_small(info->width_px, info->height_px, k, error);
  for (int y = 0; small && y < info->height_px; y += rows) {
    AwRect rect = { 0, y, info->width_px, MIN(y + rows, info->height_px) };
    g_autoptr(AwImage) band = aw_image_reader_read(reader, rect, error);
    if (!band || !shrink_band(band, k, small, y / k, error))
      return NULL;
  }
  return g_steal_pointer(&small);
}

gboolean aw_image_contrast(const AwImage *image, double *low, double *high, GError **error)
{
  g_return_val_if_fail(image && low && high, FALSE);
  gsize n = (gsize)image->width_px * (gsize)image->height_px;
  g_autofree float *values = aw_try_alloc(n, sizeof *values, "the contrast of a picture", error);
  if (!values)
    return FALSE;
  for (gsize i = 0; i < n; i++)
    values[i] = (float)aw_image_value(image, (int)(i % (gsize)image->width_px), (int)(i / (gsize)image->width_px));
  *low = (double)gsl_stats_float_select(values, 1, n, (gsize)(LOW_FRAC * (double)(n - 1)));
  *high = (double)gsl_stats_float_select(values, 1, n, (gsize)(HIGH_FRAC * (double)(n - 1)));
  return TRUE;
}

static guint8 shade(double value, double low, double high)
{
  if (!(value > low))
    return 0;
  return value >= high ? 255 : (guint8)lround(255 * (value - low) / (high - low));
}

GBytes *aw_image_overview(const AwImage *image, int max_side_px, double low, double high, GError **error)
{
  g_return_val_if_fail(image && max_side_px >= 1, NULL);
  g_autoptr(AwImage) small = aw_image_shrink(image, max_side_px, error);
  g_autoptr(AwImage) grey = small ? aw_image_new(small->width_px, small->height_px, AW_SAMPLE_U8, error) : NULL;
  if (!grey)
    return NULL;
  gsize n = (gsize)grey->width_px * (gsize)grey->height_px;
  for (gsize i = 0; i < n; i++)
    ((guint8 *)grey->pixels)[i] = shade((double)((const float *)small->pixels)[i], low, high);
  return aw_png_encode(grey, error);
}

AwImage *aw_overview_decode(GBytes *png, const char *name, GError **error)
{
  g_return_val_if_fail(png && name, NULL);
  g_autoptr(AwPngFile) file = aw_png_file_open_bytes(png, name, -1, error);
  if (!file)
    return NULL;
  const AwImageInfo *info = aw_png_file_info(file);
  if (info->sample != AW_SAMPLE_U8 || info->full_scale < 255) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s is not an 8-bit picture", name);
    return NULL;
  }
  g_autoptr(AwImage) image = aw_image_new(info->width_px, info->height_px, AW_SAMPLE_U8, error);
  if (!image || !aw_png_file_read(file, (AwRect){ 0, 0, info->width_px, info->height_px }, image, error))
    return NULL;
  return g_steal_pointer(&image);
}

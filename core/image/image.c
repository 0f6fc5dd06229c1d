/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/image.h"

#include "base/error.h"
#include "base/limits.h"

static gboolean check_sides(int width_px, int height_px, GError **error)
{
  if (width_px >= 1 && height_px >= 1 && width_px <= AW_MAX_SIDE_PX && height_px <= AW_MAX_SIDE_PX &&
      (gint64)width_px * height_px <= AW_MAX_PIXELS)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "an image of %d x %d px is outside the limits (1 to %d px a side)",
              width_px, height_px, AW_MAX_SIDE_PX);
  return FALSE;
}

gsize aw_sample_bytes(AwSample sample)
{
  return sample == AW_SAMPLE_U8 ? 1 : sample == AW_SAMPLE_U16 ? 2 : 4;
}

AwImage *aw_image_new(int width_px, int height_px, AwSample sample, GError **error)
{
  if (!check_sides(width_px, height_px, error))
    return NULL;
  void *pixels = aw_try_alloc((gsize)width_px * (gsize)height_px, aw_sample_bytes(sample), "an image plane", error);
  if (!pixels)
    return NULL;
  AwImage *image = g_new0(AwImage, 1);
  *image = (AwImage){ width_px, height_px, sample,
                      sample == AW_SAMPLE_U8    ? 255
                      : sample == AW_SAMPLE_U16 ? 65535
                                                : 0,
                      pixels };
  return image;
}

void aw_image_free(AwImage *image)
{
  if (!image)
    return;
  g_free(image->pixels);
  g_free(image);
}

double aw_image_value(const AwImage *image, int x, int y)
{
  gsize i = (gsize)y * (gsize)image->width_px + (gsize)x;
  switch (image->sample) {
  case AW_SAMPLE_U8:
    return ((const guint8 *)image->pixels)[i];
  case AW_SAMPLE_U16:
    return ((const guint16 *)image->pixels)[i];
  default:
    return (double)((const float *)image->pixels)[i];
  }
}

AwLabels *aw_labels_new(int width_px, int height_px, GError **error)
{
  if (!check_sides(width_px, height_px, error))
    return NULL;
  guint32 *label = aw_try_alloc((gsize)width_px * (gsize)height_px, sizeof *label, "a label image", error);
  if (!label)
    return NULL;
  AwLabels *labels = g_new0(AwLabels, 1);
  *labels = (AwLabels){ width_px, height_px, 0, label };
  return labels;
}

void aw_labels_free(AwLabels *labels)
{
  if (!labels)
    return;
  g_free(labels->label);
  g_free(labels);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/writer.h"

#include "base/output.h"
#include "image/tiff_write.h"

static gboolean write_picture(const AwTiffPicture *picture, const char *path, GError **error)
{
  g_autoptr(GBytes) bytes = aw_tiff_encode(picture, error);
  if (!bytes)
    return FALSE;
  gsize n;
  const char *data = g_bytes_get_data(bytes, &n);
  return aw_output_write(path, data, n, error);
}

gboolean aw_image_write_tiff(const AwImage *image, const char *path, double pixel_um, GError **error)
{
  g_return_val_if_fail(image && path && pixel_um >= 0, FALSE);
  const AwTiffPicture picture = { .width_px = image->width_px,
                                  .height_px = image->height_px,
                                  .sample = image->sample,
                                  .full_scale = image->full_scale,
                                  .pixel_um = pixel_um,
                                  .pixels = image->pixels };
  return write_picture(&picture, path, error);
}

gboolean aw_labels_write_tiff(const AwLabels *labels, const char *path, GError **error)
{
  g_return_val_if_fail(labels && path, FALSE);
  const AwTiffPicture picture = { .width_px = labels->width_px,
                                  .height_px = labels->height_px,
                                  .label = labels->label,
                                  .wide = labels->n_labels > G_MAXUINT16 };
  return write_picture(&picture, path, error);
}

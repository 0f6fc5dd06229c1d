/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_TIFF_WRITE_H
#define AW_IMAGE_TIFF_WRITE_H

#include "image/image.h"

/* One plane to be written, for writer.c alone. */
typedef struct {
  int width_px, height_px;
  AwSample sample;
  double full_scale; /* declared when a 16-bit image uses less; otherwise not written */
  double pixel_um;   /* 0: not written */
  const void *pixels;

  const guint32 *label; /* labels instead of pixels, as 32 bits when wide and 16 when not */
  gboolean wide;
} AwTiffPicture;

/* The picture as a Deflate TIFF, little-endian, BigTIFF from 3.5 GB of pixels on; the same bytes every time. */
GBytes *aw_tiff_encode(const AwTiffPicture *picture, GError **error);

#endif

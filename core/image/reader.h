/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_READER_H
#define AW_IMAGE_READER_H

#include "image/image.h"

/* What one image plane says about itself before its pixels are read. */
typedef struct {
  int width_px, height_px;
  AwSample sample;
  double full_scale;
  double pixel_um;                      /* 0 when the file does not say (TIFF resolution or OME PhysicalSize) */
  double pixel_y_um;                    /* differs from pixel_um only for oblong pixels */
  gboolean has_position;                /* OME Plane PositionX/Y in a length unit */
  AwScanPoint stage;                    /* valid when has_position */
  gboolean position_is_reference_frame; /* OME position present, but without a length unit */
  double taken_at_unix_s;               /* NaN when the file does not say */
} AwImageInfo;

/**
 * AwImageReader: reads grey planes of a TIFF, BigTIFF, OME-TIFF or PNG file, whole or in part.
 *
 * page: counted from 0. channel: counted from 0; -1 asks for the only one and is refused (naming the channel option)
 * where an RGB page's channels differ or an OME file has several.
 * Handles: strips, tiles, pages; 8, 12 in 16, 16-bit and float; none, LZW, Deflate, PackBits, Zstd as libtiff has
 * them; both byte orders, white-is-zero, planar or contiguous samples. Anything else is AW_ERROR_UNSUPPORTED by name.
 * A reader is used by one thread at a time; several readers may work side by side.
 */
typedef struct AwImageReader AwImageReader;

AwImageReader *aw_image_reader_open(const char *path, int page, int channel, GError **error);
void aw_image_reader_free(AwImageReader *reader);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwImageReader, aw_image_reader_free)

const AwImageInfo *aw_image_reader_info(const AwImageReader *reader);

/* The number of planes the file offers: pages x channels; OME planes counted through all files' pages present. */
int aw_image_reader_n_pages(const AwImageReader *reader);

/* Reads the pixels of `rect`, which must lie inside the plane; memory is bounded by the rectangle and one strip row. */
AwImage *aw_image_reader_read(AwImageReader *reader, AwRect rect, GError **error);

/* Opens, reads all, closes. `info` may be NULL. */
AwImage *aw_image_load(const char *path, int page, int channel, AwImageInfo *info, GError **error);

#endif

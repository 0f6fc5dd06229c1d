/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_READER_H
#define AW_IMAGE_READER_H

#include "image/image.h"

/* What one image plane says about itself before its pixels are read. */
typedef struct {
  int width_px, height_px;
  AwSample sample;
  double full_scale;
  double pixel_um;       /* OME PhysicalSize or resolution up to 50 um a pixel; 0 when the file does not say */
  double pixel_y_um;     /* differs from pixel_um only for oblong pixels */
  gboolean has_position; /* OME Plane PositionX/Y in a length unit */
  AwScanPoint stage;     /* valid when has_position */
  gboolean position_is_reference_frame; /* OME position present, but without a length unit */
  double taken_at_unix_s;               /* OME AcquisitionDate + DeltaT; NaN when not said or without a time zone */
} AwImageInfo;

/**
 * AwImageReader: reads grey planes of a TIFF, BigTIFF, OME-TIFF or PNG file, whole or in part.
 *
 * page: counted from 0: a directory of a plain TIFF; in an OME file one pair of focus and time of one Image (focus
 * runs fastest, then time, then the Images), channels apart and counting only planes that are in this file.
 * channel: counted from 0: a sample of the page or an OME channel. -1 asks for the only one and is refused, naming the
 * channel option, where there are several; an RGB page is read as grey as long as its channels agree in the pixels
 * read. Handles: strips, tiles, pages; 8, 10, 12, 14 (packed or in 16), 16-bit and float; none, LZW, Deflate, PackBits,
 * Zstd as libtiff has them; both byte orders, white-is-zero, planar or contiguous samples; PNG of 1 to 16 bits, not
 * interlaced. Anything else is AW_ERROR_UNSUPPORTED by name. Damage is AW_ERROR_FORMAT and never more memory than
 * the file's size can account for.
 * A reader is used by one thread at a time; several readers may work side by side.
 */
typedef struct AwImageReader AwImageReader;

AwImageReader *aw_image_reader_open(const char *path, int page, int channel, GError **error);
void aw_image_reader_free(AwImageReader *reader);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwImageReader, aw_image_reader_free)

const AwImageInfo *aw_image_reader_info(const AwImageReader *reader);

/* How many pages the file offers, and how many channels this page has: `page` and `channel` stay below. */
int aw_image_reader_n_pages(const AwImageReader *reader);
int aw_image_reader_n_channels(const AwImageReader *reader);

/**
 * Reads the pixels of `rect`, which must lie inside the plane; memory is bounded by the rectangle and one strip or tile
 * of at most 128 MiB (a longer strip is read by rows, its compressed bytes then limited to 512 MiB). full_scale of the
 * image is the info's, or that of the file's pixel form where pixels exceed a smaller declared one. A float that is not
 * finite is AW_ERROR_FORMAT.
 */
AwImage *aw_image_reader_read(AwImageReader *reader, AwRect rect, GError **error);

/* Opens, reads all, closes. `info` may be NULL. */
AwImage *aw_image_load(const char *path, int page, int channel, AwImageInfo *info, GError **error);

#endif

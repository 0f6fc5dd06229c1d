/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_LOOSE_H
#define AW_NUCLEI_LOOSE_H

#include "image/reader.h"
#include "nuclei/nucleus.h"
#include "nuclei/segment.h"

/* One image that belongs to no dish. */
typedef struct {
  const char *path;
  int page, channel; /* 0 and -1 for the usual file */
  double pixel_um;   /* > 0 measures in um (q = pixel_um p), 0 in px */
} AwLooseImage;

/* Reads, segments and measures one image of any size; nuclei in row order with ids from 1. `info` tells its size. */
GPtrArray *aw_segment_file(const AwLooseImage *image, const AwSegmentSettings *segment, AwImageInfo *info,
                           GError **error);

/* The masks as a label image: pixel value = id. */
AwLabels *aw_nuclei_paint(GPtrArray *nuclei, int width_px, int height_px, GError **error);

#endif

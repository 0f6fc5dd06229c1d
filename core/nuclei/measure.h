/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_MEASURE_H
#define AW_NUCLEI_MEASURE_H

#include "geometry/pixelmap.h"
#include "image/image.h"
#include "nuclei/nucleus.h"
#include "nuclei/segment.h"

/* Where an image stands: what turns its pixels into scan um. */
typedef struct {
  AwPixelMap map;
  AwScanPoint stage;
  AwPixelPoint centre;          /* of the whole frame, frame px */
  int x_offset_px, y_offset_px; /* of the image's first pixel in its frame (blocks); 0 for whole frames */
  int frame_width_px, frame_height_px;
} AwPlacement;

/* For loose images without a pixel size: A is minus identity about the first pixel, so that q = p. */
AwPlacement aw_placement_loose(int width_px, int height_px);

/**
 * aw_measure_nuclei: masks, outlines and features of all labels, in label order; ids stay 0.
 *
 * info: of the segmentation, or NULL (confidence is then 1). saturation_level: pixel value from which a pixel counts
 * as saturated; 0 means none. Border is judged against the whole frame. Isolation, area_ratio and the focus flag are
 * set for this image alone; aw_scan_segment sets them again over a whole dish.
 * Sources: docs/methods-nuclei.md, "Features".
 */
GPtrArray *aw_measure_nuclei(const AwImage *image, const AwLabels *labels, const AwSegmentInfo *info,
                             const AwPlacement *placement, double saturation_level, GError **error);

/**
 * aw_measure_masks: the same before placing: everything in px of the image itself, no relations between nuclei
 * (isolation stays 0). For callers that fit the pixel map first; follow with aw_nucleus_place and aw_measure_relations.
 */
GPtrArray *aw_measure_masks(const AwImage *image, const AwLabels *labels, const AwSegmentInfo *info,
                            double saturation_level, GError **error);

/* Turns a nucleus of aw_measure_masks into frame px and scan um, and sets its border flag. Once a nucleus,
 * but a placement with the loose map (which only adds the offset) may come before. */
void aw_nucleus_place(AwNucleus *nucleus, const AwPlacement *placement);

/**
 * aw_saturation_level: the pixel value from which pixels of this image count as saturated; 0 when none do.
 *
 * It is the largest value of the image when the pixel form ends there, or when at least 16 pixels of a 16-bit image
 * stand at it and it is the full scale of a camera with fewer bits: 2^k - 1, k >= 8, or those bits at the top of
 * the 16. Float images have no such level.
 */
double aw_saturation_level(const AwImage *image);

/* Sets isolation, area_ratio and the focus flag of every nucleus from all of them. */
void aw_measure_relations(GPtrArray *nuclei);

#endif

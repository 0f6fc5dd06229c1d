/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SEGMENT_H
#define AW_NUCLEI_SEGMENT_H

#include "base/progress.h"
#include "image/image.h"

/* The handles a user turns; all zero is the default. */
typedef struct {
  double nucleus_width_px; /* typical diameter; 0 estimates it from the image */
  double sensitivity;      /* -1 ... 1: above 0 finds dimmer nuclei, below 0 only bright ones */
  double splitting;        /* -1 ... 1: above 0 parts touching nuclei more readily, below 0 less */
} AwSegmentSettings;

/* What the image says about its own nuclei; one per scan so that frames and blocks are judged alike. */
typedef struct {
  double radius_px; /* typical nucleus radius; NaN when no nucleus-like blob was found */
  double height;    /* typical brightness of a nucleus above its background, image units */
  double noise;     /* standard deviation of the pixel noise, image units */
  double weight;    /* how many nuclei the estimate rests on */
} AwSegmentScale;

/* What the pipeline knows of one label. */
typedef struct {
  double confidence; /* 0 ... 1: one whole nucleus, rightly outlined */
  double contrast;   /* plateau over local background, in units of noise */
  double neck_frac;  /* strongest saddle towards a touching neighbour over the lower plateau; 0 when free */
} AwSegmentInfo;

typedef struct {
  AwLabels *labels;
  AwSegmentInfo *info; /* labels->n_labels + 1 entries, entry 0 unused */
  AwSegmentScale scale;
} AwSegmentation;

void aw_segmentation_free(AwSegmentation *s);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwSegmentation, aw_segmentation_free)

/* Checks ranges; AW_ERROR_RANGE names the handle, the value and the limits. */
gboolean aw_segment_settings_check(const AwSegmentSettings *settings, GError **error);

/* Measures the scale of one image or block. Never fails on an empty frame: weight is then 0. */
gboolean aw_segment_measure(const AwImage *image, const AwSegmentSettings *settings, AwSegmentScale *scale,
                            GError **error);

/* One scale for a scan from those of its n frames or blocks, in slot order (weighted medians). */
AwSegmentScale aw_segment_pool_scales(const AwSegmentScale *scales, gsize n);

/**
 * aw_segment_image: finds the nuclei of one plane by local thresholds and watershed (docs/methods-segmentation.md).
 *
 * image: at most AW_MAX_BLOCK_SIDE_PX + margins a side; larger ones go through the blocks of core/nuclei/scan.
 * Blocks of one frame agree best when they start at multiples of 24 px: every reduced grid then lies alike in them.
 * scale: from aw_segment_measure, or NULL to measure here.
 * An image without nuclei gives zero labels, not an error. Same input, same bytes.
 */
AwSegmentation *aw_segment_image(const AwImage *image, const AwSegmentSettings *settings, const AwSegmentScale *scale,
                                 AwProgress *progress, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_SEGMENT_H
#define AW_STEPS_SEGMENT_H

#include "nuclei/scan.h"
#include "steps/common.h"

typedef struct {
  double nucleus_width_um;       /* 0: estimated from the images */
  double sensitivity, splitting; /* as in AwSegmentSettings */
  const AwMatrix *pixel_map;     /* entered A, or NULL: fitted from the overlaps, else assumed */
} AwSegmentStep;

typedef struct {
  gsize n_nuclei, n_border, n_saturated, n_defocused, n_touching;
  double nucleus_width_um;
  gsize n_kept; /* decisions by hand kept on nuclei that are the same */
  GArray *lost; /* gint64 ids whose decision could not be kept; owned by the summary */
  AwPixelMap map;
  char *map_note; /* owned */
  gsize n_overlap_pairs;
  double overlap_rms_um;
} AwSegmentSummary;

void aw_segment_summary_clear(AwSegmentSummary *summary);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwSegmentSummary, aw_segment_summary_clear)

/**
 * aw_step_segment: finds the nuclei of a dish and replaces those of the record. Images are checked by hash first.
 * A nucleus that was there before (its centroid lies in the old outline and the old one's in the new, one to one)
 * keeps its number and what was decided about it. AW_ERROR_EMPTY when no nucleus is found.
 */
gboolean aw_step_segment(const char *path, const AwSegmentStep *step, const AwStepContext *context,
                         AwSegmentSummary *summary, GError **error);

#endif

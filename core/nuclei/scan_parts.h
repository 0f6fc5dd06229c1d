/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SCAN_PARTS_H
#define AW_NUCLEI_SCAN_PARTS_H

#include "nuclei/scan.h"

/* The parts of aw_scan_segment; for core/nuclei/scan*.c alone. */

/* One piece of work: a whole frame or an overlapping block of one. */
typedef struct {
  gsize frame;
  AwRect rect; /* frame px */
} AwScanItem;

/* How much of a nucleus a view may have lost. */
typedef enum {
  AW_VIEW_FREE, /* clear of the edges */
  AW_VIEW_NEAR, /* within a few pixels of one, where its rim may be wrong */
  AW_VIEW_CUT   /* an edge runs through it */
} AwViewEdge;

/* One nucleus as seen in one item (first merging) or one frame (second). */
typedef struct {
  AwNucleus *nucleus; /* owned by whoever holds the array; NULL once handed on */
  gsize source;       /* item or frame: views of one source are never the same nucleus */
  AwViewEdge edge;
  double quality; /* higher is better; compared between sources only */
} AwScanView;

/* Frames whole, or past AW_MAX_BLOCK_SIDE_PX in blocks that overlap by 2 margin_px (AwScanItem), in frame order. */
GArray *aw_scan_items(const AwScanFrame *frames, gsize n_frames, int margin_px);

/* Measures at most 64 items, evenly chosen, and pools their scales. */
gboolean aw_scan_measure_scale(const AwScanFrame *frames, gsize n_frames, const AwScanSettings *settings,
                               AwProgress *progress, AwSegmentScale *scale, GError **error);

/**
 * aw_scan_find: nuclei of all frames in frame px (loose placement), blocks merged: an array of AwScanView by frame.
 * The views' source is the frame.
 */
GArray *aw_scan_find(const AwScanFrame *frames, gsize n_frames, const AwScanSettings *settings,
                     const AwSegmentScale *scale, AwProgress *progress, GError **error);

/* What merging found out. */
typedef struct {
  gsize n_pairs;     /* whole views of one nucleus in two sources */
  double sum_square; /* of their centroid distances, um2 */
  gsize n_cut_dropped;
} AwMergeTally;

/**
 * aw_scan_merge: one view of every nucleus; the others are freed. Sets n_views and spread_um of what is kept.
 *
 * Views of different sources that share more than a third of the smaller one are the same nucleus or disagree about
 * one; of each such group the sources speak in order (see scan_merge.c) and what an earlier one said is not said again.
 * Returns the kept views in their old order and empties `views`.
 */
GArray *aw_scan_merge(GArray *views, AwMergeTally *tally);

/* Frees the nuclei that `views` still holds, then the array. */
void aw_scan_views_free(GArray *views);

#endif

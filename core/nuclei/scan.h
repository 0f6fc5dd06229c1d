/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SCAN_H
#define AW_NUCLEI_SCAN_H

#include "base/progress.h"
#include "geometry/pixelmap.h"
#include "nuclei/measure.h"
#include "nuclei/segment.h"

/* One frame as the scan needs it. */
typedef struct {
  const char *path; /* image file */
  int page, channel;
  int width_px, height_px;
  AwScanPoint stage;
} AwScanFrame;

typedef struct {
  AwSegmentSettings segment;
  guint n_threads;  /* 0: one per processor */
  double pixel_um;  /* pixel size that the files or the user gave */
  gboolean fit_map; /* fit A from the overlaps where they allow; otherwise keep `map` */
  AwPixelMap map;   /* the map to start from */
} AwScanSettings;

typedef struct {
  GPtrArray *nuclei; /* AwNucleus, whole dish, one entry per nucleus, ordered by frame, then row, then column */
  AwPixelMap map;    /* the map used: fitted, entered or assumed */
  AwSegmentScale scale;
  gsize n_overlap_pairs; /* nuclei seen in two frames and matched */
  double overlap_rms_um; /* their disagreement per axis: a lower bound of the scan's error; NaN without overlaps */
  gsize n_cut_dropped;   /* views cut by a frame edge that a whole view in the next frame replaced */
  char *map_note;        /* a sentence on how A was found, or why it is assumed; owned */
} AwScanResult;

void aw_scan_result_free(AwScanResult *result);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwScanResult, aw_scan_result_free)

/**
 * aw_scan_segment: finds every nucleus of a scan once.
 *
 * Frames (and, past AW_MAX_BLOCK_SIDE_PX, overlapping blocks of a frame) are worked in parallel; item order decides
 * every reduction, so the result does not depend on n_threads. Memory stays bounded by a few blocks per thread plus
 * the nuclei. AW_ERROR_RANGE when the overlaps contradict the map to start from (fit_map allows for 15 degrees and
 * 10 %): a mirrored axis or a wrong pixel size is named with the map that would fit. A scan without any nucleus gives
 * an empty result, not an error. ids stay 0. Method: docs/methods-nuclei.md.
 */
AwScanResult *aw_scan_segment(const AwScanFrame *frames, gsize n_frames, const AwScanSettings *settings,
                              AwProgress *progress, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_OVERLAP_H
#define AW_GEOMETRY_OVERLAP_H

#include <glib.h>

#include "geometry/pixelmap.h"

/* Fitting the pixel map A from marks (nuclei) that were seen in the overlaps of a scan's frames. */

/* One mark of a frame: a nucleus that the frame's edge does not cut. */
typedef struct {
  AwPixelPoint p; /* frame px */
  double area_px; /* marks match only when their areas do, within a factor of 1.3 */
} AwOverlapMark;

typedef struct {
  AwScanPoint stage;
  int width_px, height_px;
  const AwOverlapMark *marks; /* borrowed */
  gsize n_marks;
} AwOverlapFrame;

/* What to do with the map that the caller has. */
typedef enum {
  AW_OVERLAP_FIT,  /* replace it by the fitted one where the overlaps allow */
  AW_OVERLAP_CHECK /* keep it; refuse it when the overlaps contradict it */
} AwOverlapMode;

typedef struct {
  AwPixelMap map;      /* fitted, or the caller's */
  gsize n_marks;       /* pairs of views of one mark that the fit rests on */
  gsize n_frame_pairs; /* pairs of frames that they join */
  char *note;          /* a sentence on how the map was found or why it is kept; owned */
} AwOverlapFit;

void aw_overlap_fit_clear(AwOverlapFit *fit);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwOverlapFit, aw_overlap_fit_clear)

/**
 * aw_overlap_fit: the map that makes marks in two frames one, from A (p1 - p2) = S1 - S2 over all pairs.
 *
 * frames: all of one scan, one camera orientation. start: the map assumed or entered; its scale may be wrong by any
 * factor and its axes by any sign, since frames are first joined by their picture shifts alone.
 * AW_OVERLAP_FIT accepts a camera turned by up to 15 degrees and a scale off by up to 10 % against `start`;
 * AW_OVERLAP_CHECK accepts what leaves the marks of the overlaps within half a mark of their partners. Beyond that it
 * is an AW_ERROR_RANGE that names what would fit: an axis that runs the other way, exchanged axes, a pixel size.
 * Without overlaps, with too few marks in them, or with all readings on one line the map is kept and the note says why.
 * Method: docs/methods-nuclei.md, "The pixel map from the overlaps".
 */
gboolean aw_overlap_fit(const AwOverlapFrame *frames, gsize n_frames, const AwPixelMap *start, AwOverlapMode mode,
                        AwOverlapFit *fit, GError **error);

#endif

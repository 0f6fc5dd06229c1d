/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_RUNS_H
#define AW_IMAGE_RUNS_H

#include "image/image.h"

/* One stretch of mask pixels: columns x0 <= x < x1 of row y, part of component `part` (from 0). */
typedef struct {
  gint32 y, x0, x1;
  guint32 part;
} AwMaskRun;

/* A connected part of a mask. */
typedef struct {
  AwRect box;
  gint64 n_px;
} AwMaskPart;

/* A mask as runs in scan order, with its connected parts numbered by their first run. */
typedef struct {
  AwMaskRun *run;
  gsize n_runs;
  AwMaskPart *part;
  guint32 n_parts;
} AwMaskRuns;

void aw_mask_runs_free(AwMaskRuns *runs);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwMaskRuns, aw_mask_runs_free)

/**
 * aw_mask_runs: the runs of the pixels whose byte equals `wanted`, joined into parts.
 * diagonal: whether pixels that touch only at a corner belong together.
 */
AwMaskRuns *aw_mask_runs(const guint8 *mask, int width, int height, guint8 wanted, gboolean diagonal);

/* Sets to 1 every enclosed stretch of 0 (4-connected, not reaching the edge) of at most max_px pixels. */
void aw_mask_fill_holes(guint8 *mask, int width, int height, gint64 max_px);

/* Clears all but the largest 8-connected part (the first of equals); returns its number of pixels. */
gint64 aw_mask_keep_largest(guint8 *mask, int width, int height);

/* Opening of a byte mask with the four neighbours; beyond the edge the mask goes on as it is there.
 * spare: as many bytes as the mask. */
void aw_mask_open(guint8 *mask, int width, int height, guint8 *spare);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_START_H
#define AW_STEPS_START_H

#include "steps/common.h"

typedef struct {
  const char *scan_table;    /* CSV that names the frames, or NULL */
  const char *const *images; /* images that carry OME positions, NULL-terminated, or NULL */
  double pixel_um;           /* 0: as the files say */
  int channel;               /* -1: the only one */
} AwStartSettings;

typedef struct {
  gsize n_frames;
  int width_px, height_px;    /* of the first frame */
  double pixel_um;            /* 0 when nobody said */
  double width_um, height_um; /* extent of the scan */
  gint64 n_bytes;
} AwStartSummary;

/**
 * aw_step_start: makes a new dish record from a scan. Never overwrites.
 * Every image is opened, hashed and given an overview; a missing or unreadable one is an error that names it.
 * Warns of frames that touch no other frame and of table columns that are not known.
 */
gboolean aw_step_start(const char *path, const AwStartSettings *settings, const AwStepContext *context,
                       AwStartSummary *summary, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_STATUS_H
#define AW_STEPS_STATUS_H

#include "steps/common.h"

/* A dish at a glance. */
typedef struct {
  char *name, *created_at; /* owned */
  gsize n_frames;
  AwPixelMap map;
  char *map_note;     /* owned, may be NULL */
  char *origin;       /* two lines on relocation and offset; owned */
  gboolean map_waits; /* a pixel map was calibrated that the nuclei do not rest on */
  gsize n_nuclei;
  gsize n_state[4]; /* by AwState */
  GPtrArray *gates; /* char *, owned */
  gsize n_tour;     /* targets in the tour; 0 when there is none */
  double tour_um;
  gint64 n_particles;
  char *plan_hash; /* owned, NULL without a tour */
  gsize n_journal;
  GPtrArray *changed; /* char *: sentences on images that are missing or changed, owned */
  double scan_age_s;  /* since the oldest taken_at; NaN unknown */
} AwStatus;

void aw_status_free(AwStatus *status);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwStatus, aw_status_free)

/* Reads the status; verify = TRUE hashes every image and runs the record's own check. */
AwStatus *aw_step_status(const char *path, gboolean verify, const AwStepContext *context, GError **error);

/**
 * Looks for images that were moved in `folder` and below it, by name and SHA-256; *n_relinked tells how many were
 * found. Finding none changes nothing.
 */
gboolean aw_step_relink(const char *path, const char *folder, const AwStepContext *context, gsize *n_relinked,
                        GError **error);

#endif

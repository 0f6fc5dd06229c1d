/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_LOOSE_H
#define AW_STEPS_LOOSE_H

#include "nuclei/segment.h"
#include "steps/common.h"

typedef struct {
  const char *const *images; /* NULL-terminated */
  int page, channel;         /* 0 and -1 for the usual file */
  AwSegmentSettings segment;
  double pixel_um;           /* > 0 gives tables in um; 0 takes px */
  const char *labels_folder; /* or NULL */
  const char *table;         /* CSV for all images, or NULL; at least one of the two */
  gboolean gated;            /* only nuclei inside the default gates */
} AwLooseSettings;

/* Segments loose images (no record). n_nuclei gets the number written. Outputs appear whole or not at all, image by
 * image. */
gboolean aw_step_segment_loose(const AwLooseSettings *settings, const AwStepContext *context, gsize *n_nuclei,
                               GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_RELOCATE_NUCLEI_H
#define AW_STEPS_RELOCATE_NUCLEI_H

#include "geometry/match.h"
#include "steps/calibrate.h"

/* Relocation T from nuclei: a few fields of the dish imaged again on the beam stage, matched to the scan's nuclei. */

typedef struct {
  AwFitKind kind;
  const AwMatrix *camera; /* um of beam-stage move per pixel; NULL: the table's pixel size, axes found by trying */
} AwFieldsSettings;

typedef struct {
  guint n_fields, n_nuclei; /* frames of the table; nuclei found in them that no edge cuts */
  AwMatch match;            /* a: the record's nuclei, b: the fields' */
  AwMatrix camera;          /* the map of the beam stage's camera that fits */
  const char *camera_words; /* how it lies against the stage's axes */
  double hours;             /* from the scan to the fields; NaN when either has no times */
  AwMarksSummary marks;     /* T and the sure pairs it rests on, named by the nuclei's numbers */
} AwFieldsSummary;

void aw_fields_summary_clear(AwFieldsSummary *summary);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwFieldsSummary, aw_fields_summary_clear)

/**
 * aw_step_calibrate_fields: segments the frames that source->table (a scan table with beam-stage readings) names as the
 * scan was, matches, fits T to the pairs of confidence 0.95 and more, and stores it as a relocation from marks.
 *
 * AW_ERROR_STATE: no nuclei in the record, no pixel size. AW_ERROR_VERIFY: the match is not sure, or a field does not
 * fit. AW_ERROR_RANGE: all fields at one reading, which cannot tell how the camera lies against the stage.
 */
gboolean aw_step_calibrate_fields(const char *path, const AwCalibrateSource *source, const AwFieldsSettings *settings,
                                  const AwStepContext *context, AwFieldsSummary *summary, GError **error);

#endif

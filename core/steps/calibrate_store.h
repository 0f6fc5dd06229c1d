/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_CALIBRATE_STORE_H
#define AW_STEPS_CALIBRATE_STORE_H

#include "steps/calibrate.h"

/* Building and storing what core/steps/calibrate*.c find. */

/* Appends "key=value" to a key file under construction; numbers so that they read back exactly, NaN left out. */
void aw_store_double(GString *text, const char *key, double value);
void aw_store_text(GString *text, const char *key, const char *value);

/* Four keys PREFIXxx ... PREFIXyy. */
void aw_store_matrix(GString *text, const char *prefix, AwMatrix m);

/* What a relocation is fitted from (AwMarkPair), as aw_calibrated_read wants it. */
void aw_store_marks(GString *text, AwFitKind kind, gboolean mirrored, double localisation_um, const GArray *pairs);

/* Fills places and expected target errors at the record's nuclei from summary->fit. */
gboolean aw_marks_errors(AwRecord *record, AwMarksSummary *summary, GError **error);

/* Adds a calibration of `kind` with the table's hash and commits the action. source->table may be NULL (entered). */
gboolean aw_store_commit(AwRecord *record, const char *kind, const AwCalibrateSource *source, const GString *text,
                         const char *action, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_CALIBRATE_TABLES_H
#define AW_STEPS_CALIBRATE_TABLES_H

#include "steps/calibrate.h"

/* Reading the tables of `aimwell calibrate` (docs/formats.md); errors name file, line, column and value. */

/* AwMarkView from stage_x_um, stage_y_um and either x_px, y_px or file (then marks are looked for). */
GArray *aw_table_views(const AwCalibrateSource *source, GError **error);

/* AwMarkPair from scan_x_um, scan_y_um (or file, stage_x_um, stage_y_um and the record's A), beam_x_um, beam_y_um;
 * *names gets the column `name`, or numbers from 1. */
GArray *aw_table_pairs(const AwCalibrateSource *source, AwRecord *record, GPtrArray **names, GError **error);

/* AwEdgePoint from position_um and either n_full, n_degraded (*counts TRUE) or fraction. */
GArray *aw_table_edge(const char *table, gboolean *counts, GError **error);

/* AwBeadPoint from x_um, y_um, n_full, n_degraded. */
GArray *aw_table_bead(const char *table, GError **error);

#endif

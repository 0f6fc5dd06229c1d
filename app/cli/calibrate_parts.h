/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_CLI_CALIBRATE_PARTS_H
#define AW_CLI_CALIBRATE_PARTS_H

#include "steps/relocate_nuclei.h"

/* What `aimwell calibrate` prints of each measurement; for app/cli/calibrate*.c alone. */
void cli_print_pixel(const AwPixelSummary *s, const char *dish);
void cli_print_marks(const AwMarksSummary *s);
void cli_print_fields(const AwFieldsSummary *s);
void cli_print_edge(const AwEdgeSummary *s, const AwEdgeScan *scan);
void cli_print_bead(const AwBeadSummary *s);
void cli_print_beam(const AwBeamAtNucleus *at);
void cli_print_calibrations(const AwCalibrationView *view);
void cli_print_calibrations_json(const AwCalibrationView *view);

#endif

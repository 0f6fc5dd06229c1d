/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_CALIBRATED_H
#define AW_STEPS_CALIBRATED_H

#include "beam/budget.h"
#include "beam/layers.h"
#include "steps/common.h"

/* What a record's calibrations say at present: the newest of each kind. */
typedef struct {
  gboolean has_map; /* from one mark at several readings; holds from the next segmentation on */
  AwMatrix um_per_px, map_covariance;
  double map_at_unix_s;
  gsize map_n;
  gboolean has_relocation;
  AwRegistration relocation;
  GArray *pairs; /* AwMarkPair behind it; never NULL */
  gboolean has_offset;
  AwOffsetCheck offset;
  const char *offset_how; /* "a bead scan" or "two knife edges" */
  double drift_um2_per_h; /* NaN unknown */
  gboolean is_entered[AW_N_TERMS];
  double entered[AW_N_TERMS];
  AwEstimate sigma_x_um, sigma_y_um; /* beam width by knife edge; NaN unknown */
  AwBeamFile *beam;                  /* NULL unknown */
} AwCalibrated;

void aw_calibrated_clear(AwCalibrated *calibrated);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwCalibrated, aw_calibrated_clear)

/* Reads them; AW_ERROR_FORMAT when a stored one cannot be understood. */
gboolean aw_calibrated_read(AwRecord *record, AwCalibrated *calibrated, GError **error);

/* b = T(q) + o: the beam-stage reading that puts q on the beam. Identity and 0 where nothing is calibrated. */
AwBeamPoint aw_calibrated_place(const AwCalibrated *calibrated, AwScanPoint q);

/* Two lines on relocation and offset with their origins. Free with g_free. */
char *aw_calibrated_origin(const AwCalibrated *calibrated);

/* The budget's input from calibrations, pixel map, overlaps and ages of the record; `now` in unix seconds. */
gboolean aw_calibrated_budget_input(AwRecord *record, const AwCalibrated *calibrated, double now, AwBudgetInput *input,
                                    GError **error);

/* Places of the nuclei in the budget's terms; g_free. */
AwBudgetTarget *aw_calibrated_targets(GPtrArray *nuclei, GPtrArray *frames);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_EXPORT_H
#define AW_STEPS_EXPORT_H

#include "plan/layout.h"
#include "steps/common.h"

/* The target rows of a record in tour order, and what their head says. */
typedef struct {
  AwTargetRow *rows; /* owned */
  gsize n;
  char *plan_hash; /* owned */
  char *origin;    /* owned */
} AwPlan;

void aw_plan_free(AwPlan *plan);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwPlan, aw_plan_free)

/* Reads the plan of a record; AW_ERROR_EMPTY without targets, AW_ERROR_STATE without a tour. */
AwPlan *aw_step_plan(AwRecord *record, GError **error);

typedef struct {
  gsize n_targets;
  char plan_hash[65];
  gboolean checked_in_memory; /* a pipe or device could not be read back */
} AwExportSummary;

/* Writes the verified target list and journals it. layout: "csv", "tsv" or a key file. */
gboolean aw_step_export(const char *path, const char *out, const char *layout, const AwStepContext *context,
                        AwExportSummary *summary, GError **error);

#endif

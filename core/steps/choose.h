/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_CHOOSE_H
#define AW_STEPS_CHOOSE_H

#include "plan/gates.h"
#include "steps/common.h"

typedef struct {
  const char *const *gates;             /* "FEATURE=MIN..MAX" texts, NULL-terminated, or NULL */
  gboolean no_default_gates;            /* only the gates given */
  gboolean propose;                     /* gate all nuclei, even when only decisions are asked for */
  const char *accept, *reject, *forget; /* id lists such as "3,7,10-20", or the word "proposed"; NULL for none */
  const gint64 *n_particles;            /* for every target; NULL leaves it as it is */
} AwChooseSettings;

typedef struct {
  gsize n_nuclei, n_proposed, n_accepted, n_rejected;
  gboolean gated;        /* gates were applied in this step */
  GPtrArray *gate_lines; /* char *: one sentence per gate and how many it removed, owned */
} AwChooseSummary;

void aw_choose_summary_clear(AwChooseSummary *summary);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwChooseSummary, aw_choose_summary_clear)

/**
 * aw_step_choose: proposes every nucleus inside all gates and takes decisions by hand.
 * What a person decided before is kept. The tour is dropped when the set of targets changes.
 * AW_ERROR_NOT_FOUND for an id that does not exist or an unknown feature, AW_ERROR_EMPTY without nuclei.
 */
gboolean aw_step_choose(const char *path, const AwChooseSettings *settings, const AwStepContext *context,
                        AwChooseSummary *summary, GError **error);

#endif

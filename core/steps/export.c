/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/export.h"

#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/text.h"
#include "steps/calibrated.h"

void aw_plan_free(AwPlan *plan)
{
  if (!plan)
    return;
  g_free(plan->rows);
  g_free(plan->plan_hash);
  g_free(plan->origin);
  g_free(plan);
}

static int compare_ids(const void *a, const void *b)
{
  gint64 x = (*(AwNucleus *const *)a)->id, y = (*(AwNucleus *const *)b)->id;
  return (x > y) - (x < y);
}

static const AwNucleus *find_nucleus(GPtrArray *nuclei, gint64 id)
{
  AwNucleus key = { .id = id }, *wanted = &key;
  AwNucleus **found = bsearch(&wanted, nuclei->pdata, nuclei->len, sizeof *nuclei->pdata, compare_ids);
  return found ? *found : NULL;
}

/* One sentence per kind of number that the positions rest on. */
static char *describe_origin(AwRecord *record, const AwCalibrated *calibrated, GError **error)
{
  AwPixelMap map;
  GError *failure = NULL;
  if (!aw_record_pixel_map(record, &map, error))
    return NULL;
  g_autofree char *note = aw_record_fact(record, AW_FACT_MAP_NOTE, &failure);
  if (failure) {
    g_propagate_error(error, failure);
    return NULL;
  }
  g_autofree char *rest = aw_calibrated_origin(calibrated);
  return g_strdup_printf("pixel map %s%s%s\n%s", aw_origin_name(map.origin), note ? ": " : "", note ? note : "", rest);
}

/* b = T(q) + o; until a relocation and an offset are calibrated, b = q. */
static gboolean fill_rows(AwPlan *plan, GPtrArray *nuclei, const GArray *tour, const AwCalibrated *calibrated,
                          GError **error)
{
  plan->n = tour->len;
  plan->rows = g_new0(AwTargetRow, plan->n);
  for (gsize i = 0; i < plan->n; i++) {
    gint64 id = g_array_index(tour, gint64, i);
    const AwNucleus *nucleus = find_nucleus(nuclei, id);
    if (!nucleus) {
      g_set_error(error, AW_ERROR, AW_ERROR_STATE, "the tour names nucleus %" G_GINT64_FORMAT ", which does not exist",
                  id);
      return FALSE;
    }
    plan->rows[i] = (AwTargetRow){ .target = (gint64)i + 1,
                                   .nucleus_id = id,
                                   .at = aw_calibrated_place(calibrated, nucleus->centroid),
                                   .scan = nucleus->centroid,
                                   .arm = "irradiate" };
  }
  return TRUE;
}

static gboolean explain_no_tour(AwRecord *record, GError **error)
{
  g_autoptr(GArray) decisions = aw_record_decisions(record, error);
  if (!decisions)
    return FALSE;
  gsize n_accepted = 0;
  for (guint i = 0; i < decisions->len; i++)
    n_accepted += g_array_index(decisions, AwDecision, i).state == AW_STATE_ACCEPTED;
  if (n_accepted)
    g_set_error(error, AW_ERROR, AW_ERROR_STATE,
                "%s has %" G_GSIZE_FORMAT " targets but no tour; order them first (aimwell route %s)",
                aw_record_path(record), n_accepted, aw_record_path(record));
  else
    g_set_error(error, AW_ERROR, AW_ERROR_EMPTY, "%s has no target: no nucleus is accepted", aw_record_path(record));
  return FALSE;
}

AwPlan *aw_step_plan(AwRecord *record, GError **error)
{
  g_autoptr(GArray) tour = aw_record_tour(record, error);
  if (!tour || (!tour->len && !explain_no_tour(record, error)))
    return NULL;
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(record, FALSE, error);
  g_autoptr(AwPlan) plan = g_new0(AwPlan, 1);
  g_auto(AwCalibrated) calibrated = { 0 };
  gint64 n_particles;
  if (!nuclei || !aw_step_n_particles(record, &n_particles, error) || !aw_calibrated_read(record, &calibrated, error) ||
      !fill_rows(plan, nuclei, tour, &calibrated, error) ||
      !(plan->origin = describe_origin(record, &calibrated, error)))
    return NULL;
  for (gsize i = 0; i < plan->n; i++)
    plan->rows[i].n_particles = n_particles;
  plan->plan_hash = aw_plan_hash(plan->rows, plan->n);
  return g_steal_pointer(&plan);
}

gboolean aw_step_export(const char *path, const char *out, const char *layout_name, const AwStepContext *context,
                        AwExportSummary *summary, GError **error)
{
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  g_autoptr(AwLayout) layout = record ? aw_layout_load(layout_name, error) : NULL;
  g_autoptr(AwPlan) plan = layout ? aw_step_plan(record, error) : NULL;
  if (!plan)
    return FALSE;
  g_autofree char *name = aw_step_name(record);
  g_autofree char *now = aw_text_from_time(floor((double)g_get_real_time() / G_USEC_PER_SEC));
  AwTargetHead head = { name, plan->plan_hash, plan->origin, now };
  if (!aw_target_list_write(layout, &head, plan->rows, plan->n, out, &summary->checked_in_memory, error))
    return FALSE;
  summary->n_targets = plan->n;
  g_strlcpy(summary->plan_hash, plan->plan_hash, sizeof summary->plan_hash);
  g_autofree char *action = g_strdup_printf("exported %" G_GSIZE_FORMAT " targets to %s in layout %s, plan %s", plan->n,
                                            out, layout_name, plan->plan_hash);
  return aw_record_commit(record, action, error);
}

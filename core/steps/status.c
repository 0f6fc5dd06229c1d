/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/status.h"

#include <math.h>

#include "base/text.h"
#include "plan/gates.h"
#include "record/files.h"
#include "steps/calibrated.h"
#include "steps/export.h"

void aw_status_free(AwStatus *status)
{
  if (!status)
    return;
  g_free(status->name);
  g_free(status->created_at);
  g_free(status->map_note);
  g_free(status->origin);
  g_free(status->plan_hash);
  g_clear_pointer(&status->gates, g_ptr_array_unref);
  g_clear_pointer(&status->changed, g_ptr_array_unref);
  g_free(status);
}

static gboolean read_facts(AwRecord *record, AwStatus *s, GError **error)
{
  GError *failure = NULL;
  s->name = aw_step_name(record);
  s->created_at = aw_record_fact(record, AW_FACT_CREATED_AT, &failure);
  if (!failure)
    s->map_note = aw_record_fact(record, AW_FACT_MAP_NOTE, &failure);
  if (failure) {
    g_propagate_error(error, failure);
    return FALSE;
  }
  return aw_record_pixel_map(record, &s->map, error) && aw_step_n_particles(record, &s->n_particles, error) &&
         aw_record_fact_double(record, AW_FACT_TOUR_UM, NAN, &s->tour_um, error);
}

static gboolean same_matrix(AwMatrix a, AwMatrix b)
{
  return a.xx == b.xx && a.xy == b.xy && a.yx == b.yx && a.yy == b.yy;
}

static gboolean read_calibrations(AwRecord *record, AwStatus *s, GError **error)
{
  g_auto(AwCalibrated) c = { 0 };
  if (!aw_calibrated_read(record, &c, error))
    return FALSE;
  s->origin = aw_calibrated_origin(&c);
  s->map_waits = c.has_map && !same_matrix(c.um_per_px, s->map.um_per_px);
  return TRUE;
}

static gboolean count_nuclei(AwRecord *record, AwStatus *s, GError **error)
{
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(record, FALSE, error);
  g_autofree AwState *states = nuclei ? aw_step_states(record, nuclei, error) : NULL;
  if (!states)
    return FALSE;
  s->n_nuclei = nuclei->len;
  for (guint i = 0; i < nuclei->len; i++)
    s->n_state[states[i]]++;
  return TRUE;
}

static gboolean read_gates(AwRecord *record, AwStatus *s, GError **error)
{
  g_autoptr(GArray) rows = aw_record_gates(record, error);
  if (!rows)
    return FALSE;
  s->gates = g_ptr_array_new_with_free_func(g_free);
  for (guint i = 0; i < rows->len; i++) {
    const AwGateRow *row = &g_array_index(rows, AwGateRow, i);
    AwGate gate = { row->feature, row->min, row->max };
    g_ptr_array_add(s->gates, aw_gate_text(&gate));
  }
  return TRUE;
}

static gboolean read_plan(AwRecord *record, AwStatus *s, GError **error)
{
  g_autoptr(GArray) tour = aw_record_tour(record, error);
  if (!tour)
    return FALSE;
  s->n_tour = tour->len;
  if (!tour->len)
    return TRUE;
  g_autoptr(AwPlan) plan = aw_step_plan(record, error);
  if (!plan)
    return FALSE;
  s->plan_hash = g_steal_pointer(&plan->plan_hash);
  return TRUE;
}

static gboolean read_frames(AwRecord *record, AwStatus *s, GError **error)
{
  g_autoptr(GPtrArray) frames = aw_record_frames(record, error);
  if (!frames)
    return FALSE;
  s->n_frames = frames->len;
  double oldest = NAN;
  for (guint i = 0; i < frames->len; i++)
    oldest = fmin(oldest, ((const AwFrame *)frames->pdata[i])->taken_at_unix_s); /* fmin passes NaN over */
  s->scan_age_s = (double)g_get_real_time() / G_USEC_PER_SEC - oldest;
  return TRUE;
}

static gboolean count_journal(AwRecord *record, AwStatus *s, GError **error)
{
  g_autoptr(GPtrArray) journal = aw_record_journal(record, error);
  if (!journal)
    return FALSE;
  s->n_journal = journal->len;
  return TRUE;
}

static gboolean check_images(AwRecord *record, gboolean full, const AwStepContext *context, AwStatus *s, GError **error)
{
  g_autoptr(GPtrArray) checks = aw_record_files_check(record, full, context->n_threads, context->progress, error);
  if (!checks)
    return FALSE;
  s->changed = g_ptr_array_new_with_free_func(g_free);
  for (guint i = 0; i < checks->len; i++) {
    const AwFileCheck *check = checks->pdata[i];
    if (check->problem)
      g_ptr_array_add(s->changed, g_strdup(check->problem));
  }
  return TRUE;
}

gboolean aw_step_relink(const char *path, const char *folder, const AwStepContext *context, gsize *n_relinked,
                        GError **error)
{
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  if (!record || !aw_record_files_relink(record, folder, context->progress, n_relinked, error))
    return FALSE;
  g_autofree char *action = g_strdup_printf("found %" G_GSIZE_FORMAT " moved images in %s", *n_relinked, folder);
  return *n_relinked == 0 || aw_record_commit(record, action, error);
}

AwStatus *aw_step_status(const char *path, gboolean verify, const AwStepContext *context, GError **error)
{
  g_autoptr(AwRecord) record = aw_record_open(path, AW_RECORD_READ, error);
  if (!record || (verify && !aw_record_check(record, error)))
    return NULL;
  g_autoptr(AwStatus) s = g_new0(AwStatus, 1);
  if (!aw_record_read_begin(record, error) || !read_facts(record, s, error) || !read_calibrations(record, s, error) ||
      !read_frames(record, s, error) || !count_nuclei(record, s, error) || !read_gates(record, s, error) ||
      !read_plan(record, s, error) || !count_journal(record, s, error))
    return NULL;
  aw_record_read_end(record); /* hashing takes long and reads no more of the record than the list of files */
  return check_images(record, verify, context, s, error) ? g_steal_pointer(&s) : NULL;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/common.h"

#include <string.h>

#include "nuclei/scan.h"
#include "record/files.h"

void aw_step_warn(const AwStepContext *context, const char *format, ...)
{
  if (!context || !context->warnings)
    return;
  va_list args;
  va_start(args, format);
  g_ptr_array_add(context->warnings, g_strdup_vprintf(format, args));
  va_end(args);
}

AwRecord *aw_step_open(const char *path, const AwStepContext *context, GError **error)
{
  g_autoptr(AwRecord) record = aw_record_open(path, AW_RECORD_WRITE, error);
  if (!record)
    return NULL;
  if (aw_record_warning(record))
    aw_step_warn(context, "%s", aw_record_warning(record));
  if (!aw_record_begin(record, context->who, error))
    return NULL;
  return g_steal_pointer(&record);
}

char *aw_step_name(const AwRecord *record)
{
  char *name = g_path_get_basename(aw_record_path(record));
  if (g_str_has_suffix(name, ".dish"))
    name[strlen(name) - strlen(".dish")] = '\0';
  return name;
}

gboolean aw_step_n_particles(AwRecord *record, gint64 *n_particles, GError **error)
{
  double n;
  if (!aw_record_fact_double(record, AW_FACT_N_PARTICLES, 1, &n, error))
    return FALSE;
  *n_particles = (gint64)n;
  return TRUE;
}

AwState *aw_step_states(AwRecord *record, GPtrArray *nuclei, GError **error)
{
  g_autoptr(GArray) decisions = aw_record_decisions(record, error);
  if (!decisions)
    return NULL;
  AwState *states = g_new0(AwState, nuclei->len + 1);
  guint next = 0; /* both lists rise by id */
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *nucleus = nuclei->pdata[i];
    while (next < decisions->len && g_array_index(decisions, AwDecision, next).nucleus_id < nucleus->id)
      next++;
    if (next < decisions->len && g_array_index(decisions, AwDecision, next).nucleus_id == nucleus->id)
      states[i] = g_array_index(decisions, AwDecision, next).state;
  }
  return states;
}

GArray *aw_step_scan_frames(const AwRecord *record, GPtrArray *frames, GPtrArray **paths)
{
  GArray *list = g_array_new(FALSE, TRUE, sizeof(AwScanFrame));
  *paths = g_ptr_array_new_with_free_func(g_free);
  for (guint i = 0; i < frames->len; i++) {
    const AwFrame *frame = frames->pdata[i];
    char *path = aw_record_file_path(record, frame->file);
    g_ptr_array_add(*paths, path);
    AwScanFrame one = { path, frame->page, frame->channel, frame->width_px, frame->height_px, frame->stage };
    g_array_append_val(list, one);
  }
  return list;
}

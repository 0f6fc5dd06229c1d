/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/calibrate.h"

#include <math.h>
#include <stdlib.h>

#include "base/error.h"
#include "base/text.h"
#include "steps/calibrate_store.h"
#include "steps/calibrate_tables.h"

void aw_pixel_summary_clear(AwPixelSummary *summary)
{
  g_clear_pointer(&summary->views, g_array_unref);
  g_clear_pointer(&summary->words, g_free);
}

static gboolean store_pixel(AwRecord *record, const AwCalibrateSource *source, const AwPixelSummary *s, GError **error)
{
  const AwMarkMap *m = &s->fit;
  g_autoptr(GString) text = g_string_new("[pixel]\n");
  aw_store_double(text, "n", (double)m->n);
  aw_store_matrix(text, "a-", m->map.um_per_px);
  aw_store_matrix(text, "covariance-", m->row_covariance);
  aw_store_double(text, "rms-um", m->map.rms_um);
  g_autofree char *scale = aw_text_from_double(m->scale, 5);
  g_autofree char *action = g_strdup_printf(
      "calibrated the pixel map from one mark at %" G_GSIZE_FORMAT " readings: %s um per pixel", m->n, scale);
  return aw_store_commit(record, "pixel", source, text, action, error);
}

gboolean aw_step_calibrate_pixel(const char *path, const AwCalibrateSource *source, const AwStepContext *context,
                                 AwPixelSummary *s, GError **error)
{
  double pixel_um;
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  g_autoptr(GPtrArray) nuclei = record ? aw_record_nuclei(record, FALSE, error) : NULL;
  if (!nuclei || !aw_record_fact_double(record, AW_FACT_PIXEL_UM, 0, &pixel_um, error) ||
      !(s->views = aw_table_views(source, error)) ||
      !aw_mark_map_fit((const AwMarkView *)(const void *)s->views->data, s->views->len, pixel_um, &s->fit, error))
    return FALSE;
  s->words = aw_mark_map_words(&s->fit);
  s->segmented = nuclei->len > 0;
  return store_pixel(record, source, s, error);
}

void aw_marks_summary_clear(AwMarksSummary *summary)
{
  g_clear_pointer(&summary->pairs, g_array_unref);
  g_clear_pointer(&summary->names, g_ptr_array_unref);
  g_clear_pointer(&summary->places, g_array_unref);
}

/* Units mixed up show in the scale between the stages, a wrong axis sign in a mirrored map that fits far better. */
static gboolean check_marks(const char *table, const AwMarksSummary *s, GError **error)
{
  const AwMarkPair *pairs = (const AwMarkPair *)(const void *)s->pairs->data;
  AwRegistration free_scale;
  if (!aw_registration_fit(pairs, s->pairs->len, AW_FIT_SIMILARITY, s->fit.mirrored, 1, &free_scale, error))
    return FALSE;
  double ratio = aw_registration_scale(&free_scale);
  if (aw_unit_slip(ratio)) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "%s: one stage's readings are 1000 times the other's; the %s columns seem to hold mm", table,
                ratio < 1 ? "beam" : "scan");
    return FALSE;
  }
  if (!s->check.mirror_fits_better)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "%s: the %s map fits far better: an axis of one stage has the wrong sign, or two are exchanged; if the "
              "stages really are mirrored, say %s",
              table, s->fit.mirrored ? "unmirrored" : "mirrored", s->fit.mirrored ? "so no longer" : "--mirrored");
  return FALSE;
}

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

gboolean aw_marks_errors(AwRecord *record, AwMarksSummary *s, GError **error)
{
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(record, FALSE, error);
  if (!nuclei)
    return FALSE;
  g_autofree double *um = g_new(double, nuclei->len + 1);
  s->places = g_array_new(FALSE, FALSE, sizeof(AwScanPoint));
  for (guint i = 0; i < nuclei->len; i++) {
    AwScanPoint q = ((const AwNucleus *)nuclei->pdata[i])->centroid;
    g_array_append_val(s->places, q);
    um[i] = s->fit.widening * aw_registration_error_um(&s->fit, q);
  }
  qsort(um, nuclei->len, sizeof *um, compare_doubles);
  s->min_um = nuclei->len ? um[0] : NAN;
  s->median_um = nuclei->len ? um[(nuclei->len - 1) / 2] : NAN;
  s->max_um = nuclei->len ? um[nuclei->len - 1] : NAN;
  return TRUE;
}

static gboolean store_marks(AwRecord *record, const AwCalibrateSource *source, const AwMarksSettings *settings,
                            const AwMarksSummary *s, GError **error)
{
  g_autoptr(GString) text = g_string_new("[marks]\n");
  aw_store_marks(text, settings->kind, settings->mirrored, settings->localisation_um, s->pairs);
  g_autofree char *rms = aw_text_from_double(s->fit.rms_um, 2);
  g_autofree char *action = g_strdup_printf("calibrated the relocation from %u marks: %s, residual %s um",
                                            s->pairs->len, aw_fit_kind_name(settings->kind), rms);
  return aw_store_commit(record, "marks", source, text, action, error);
}

gboolean aw_step_calibrate_marks(const char *path, const AwCalibrateSource *source, const AwMarksSettings *settings,
                                 const AwStepContext *context, AwMarksSummary *s, GError **error)
{
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  if (!record || !(s->pairs = aw_table_pairs(source, record, &s->names, error)))
    return FALSE;
  const AwMarkPair *pairs = (const AwMarkPair *)(const void *)s->pairs->data;
  if (!aw_registration_fit(pairs, s->pairs->len, settings->kind, settings->mirrored, settings->localisation_um, &s->fit,
                           error))
    return FALSE;
  aw_registration_check(pairs, s->pairs->len, settings->kind, &s->fit, &s->check);
  return check_marks(source->table, s, error) && aw_marks_errors(record, s, error) &&
         store_marks(record, source, settings, s, error);
}

gboolean aw_step_calibrate_error(const char *path, AwTermId term, double value, double at_unix_s,
                                 const AwStepContext *context, GError **error)
{
  const AwCalibrateSource source = { .at_unix_s = at_unix_s };
  if (!(value >= 0 && value <= 1000)) {
    g_autofree char *number = aw_text_from_double_exact(value);
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "the error term %s cannot be %s %s; the limits are 0 to 1000",
                aw_term_name(term), number, aw_term_unit(term));
    return FALSE;
  }
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  if (!record)
    return FALSE;
  g_autoptr(GString) text = g_string_new("[error]\n");
  g_autofree char *kind = g_strconcat("error-", aw_term_name(term), NULL);
  g_autofree char *number = aw_text_from_double_exact(value);
  aw_store_double(text, "value", value);
  g_autofree char *action =
      g_strdup_printf("entered the error term %s: %s %s", aw_term_name(term), number, aw_term_unit(term));
  return aw_store_commit(record, kind, &source, text, action, error);
}

void aw_calibration_view_free(AwCalibrationView *view)
{
  if (!view)
    return;
  g_clear_pointer(&view->calibrations, g_ptr_array_unref);
  aw_calibrated_clear(&view->now);
  g_free(view->origin);
  g_free(view);
}

/* The accepted nuclei, or all when none is accepted. */
static GPtrArray *targets_of(AwRecord *record, GPtrArray *nuclei, GError **error)
{
  g_autofree AwState *states = aw_step_states(record, nuclei, error);
  if (!states)
    return NULL;
  GPtrArray *targets = g_ptr_array_new();
  for (guint i = 0; i < nuclei->len; i++)
    if (states[i] == AW_STATE_ACCEPTED)
      g_ptr_array_add(targets, nuclei->pdata[i]);
  if (targets->len == 0)
    g_ptr_array_extend(targets, nuclei, NULL, NULL);
  return targets;
}

AwCalibrationView *aw_step_calibrations(const char *path, double at_unix_s, GError **error)
{
  AwBudgetInput input;
  double now = isnan(at_unix_s) ? (double)g_get_real_time() / G_USEC_PER_SEC : at_unix_s;
  g_autoptr(AwRecord) record = aw_record_open(path, AW_RECORD_READ, error);
  g_autoptr(AwCalibrationView) view = g_new0(AwCalibrationView, 1);
  if (!record || !aw_record_read_begin(record, error) ||
      !(view->calibrations = aw_record_calibrations(record, error)) || !aw_calibrated_read(record, &view->now, error) ||
      !aw_calibrated_budget_input(record, &view->now, now, &input, error))
    return NULL;
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(record, FALSE, error);
  g_autoptr(GPtrArray) frames = nuclei ? aw_record_frames(record, error) : NULL;
  g_autoptr(GPtrArray) targets = frames ? targets_of(record, nuclei, error) : NULL;
  if (!targets)
    return NULL;
  g_autofree AwBudgetTarget *places = aw_calibrated_targets(targets, frames);
  aw_budget_for_dish(&input, places, targets->len, &view->budget);
  view->n_targets = targets->len;
  view->origin = aw_calibrated_origin(&view->now);
  return g_steal_pointer(&view);
}

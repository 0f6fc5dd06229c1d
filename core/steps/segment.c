/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/segment.h"

#include <string.h>

#include "base/error.h"
#include "base/text.h"
#include "nuclei/same.h"
#include "record/files.h"
#include "steps/calibrated.h"

void aw_segment_summary_clear(AwSegmentSummary *summary)
{
  g_clear_pointer(&summary->lost, g_array_unref);
  g_clear_pointer(&summary->map_note, g_free);
}

/* An entered map wins, then one calibrated from a mark; both are checked against the overlaps, not fitted again. */
static AwPixelMap start_map(const AwSegmentStep *step, const AwCalibrated *calibrated, double pixel_um)
{
  if (step->pixel_map)
    return (AwPixelMap){ *step->pixel_map, AW_ORIGIN_ENTERED, 0 };
  if (calibrated->has_map)
    return (AwPixelMap){ calibrated->um_per_px, AW_ORIGIN_FITTED, 0 };
  return (AwPixelMap){ { pixel_um, 0, 0, pixel_um }, AW_ORIGIN_ASSUMED, 0 };
}

/* The map to start from and whether it may be fitted. */
static gboolean scan_settings(AwRecord *record, const AwSegmentStep *step, const AwStepContext *context,
                              AwScanSettings *s, GError **error)
{
  *s = (AwScanSettings){ .segment = { 0, step->sensitivity, step->splitting }, .n_threads = context->n_threads };
  g_auto(AwCalibrated) calibrated = { 0 };
  if (!aw_calibrated_read(record, &calibrated, error) ||
      !aw_record_fact_double(record, AW_FACT_PIXEL_UM, 0, &s->pixel_um, error))
    return FALSE;
  if (s->pixel_um <= 0 && !step->pixel_map && !calibrated.has_map) {
    g_set_error(error, AW_ERROR, AW_ERROR_STATE,
                "%s: no pixel size is known; start the record again with --pixel-um, or enter --pixel-map",
                aw_record_path(record));
    return FALSE;
  }
  s->map = start_map(step, &calibrated, s->pixel_um);
  s->fit_map = s->map.origin == AW_ORIGIN_ASSUMED;
  s->segment.nucleus_width_px = step->nucleus_width_um / aw_pixel_map_scale(&s->map);
  return TRUE;
}

/* Numbers the nuclei: those that were there before keep their number. */
static gboolean number_nuclei(AwRecord *record, GPtrArray *before, GPtrArray *now, GError **error)
{
  gint64 next;
  if (!aw_record_next_nucleus_id(record, &next, error))
    return FALSE;
  g_autofree gint *same = aw_nuclei_same(before, now);
  for (guint i = 0; i < now->len; i++) {
    AwNucleus *nucleus = now->pdata[i];
    nucleus->id = same[i] >= 0 ? ((const AwNucleus *)before->pdata[same[i]])->id : next++;
  }
  return TRUE;
}

static gboolean has_id(GPtrArray *nuclei, GHashTable *ids, gint64 id)
{
  if (g_hash_table_size(ids) == 0)
    for (guint i = 0; i < nuclei->len; i++)
      g_hash_table_add(ids, &((AwNucleus *)nuclei->pdata[i])->id);
  return g_hash_table_contains(ids, &id);
}

/* Hand-made decisions on nuclei that vanished are named; proposals of the old gates are dropped with the tour. */
static gboolean carry_decisions(AwRecord *record, GPtrArray *now, AwSegmentSummary *summary, GError **error)
{
  g_autoptr(GArray) decisions = aw_record_decisions(record, error);
  g_autoptr(GHashTable) ids = g_hash_table_new(g_int64_hash, g_int64_equal);
  if (!decisions)
    return FALSE;
  for (guint i = 0; i < decisions->len; i++) {
    AwDecision decision = g_array_index(decisions, AwDecision, i);
    if (!decision.by_hand) {
      decision.state = AW_STATE_FOUND;
      if (!aw_record_set_decision(record, &decision, error))
        return FALSE;
    } else if (has_id(now, ids, decision.nucleus_id)) {
      summary->n_kept++;
    } else {
      g_array_append_val(summary->lost, decision.nucleus_id);
    }
  }
  return aw_record_set_tour(record, NULL, 0, error);
}

static gboolean store_facts(AwRecord *record, const AwSegmentStep *step, const AwScanResult *scan, GError **error)
{
  double scale = aw_pixel_map_scale(&scan->map);
  return aw_record_set_pixel_map(record, &scan->map, error) &&
         aw_record_set_fact(record, AW_FACT_MAP_NOTE, scan->map_note, error) &&
         aw_record_set_fact_double(record, AW_FACT_NUCLEUS_WIDTH_UM, 2 * scan->scale.radius_px * scale, error) &&
         aw_record_set_fact_double(record, AW_FACT_RADIUS_PX, scan->scale.radius_px, error) &&
         aw_record_set_fact_double(record, AW_FACT_SENSITIVITY, step->sensitivity, error) &&
         aw_record_set_fact_double(record, AW_FACT_SPLITTING, step->splitting, error) &&
         aw_record_set_fact_double(record, AW_FACT_OVERLAP_RMS_UM, scan->overlap_rms_um, error);
}

static void summarise(const AwScanResult *scan, AwSegmentSummary *s)
{
  s->n_nuclei = scan->nuclei->len;
  for (guint i = 0; i < scan->nuclei->len; i++) {
    guint flags = ((const AwNucleus *)scan->nuclei->pdata[i])->flags;
    s->n_border += (flags & AW_FLAG_BORDER) != 0;
    s->n_saturated += (flags & AW_FLAG_SATURATED) != 0;
    s->n_defocused += (flags & AW_FLAG_DEFOCUSED) != 0;
    s->n_touching += (flags & AW_FLAG_TOUCHING) != 0;
  }
  s->nucleus_width_um = 2 * scan->scale.radius_px * aw_pixel_map_scale(&scan->map);
  s->map = scan->map;
  s->map_note = g_strdup(scan->map_note);
  s->n_overlap_pairs = scan->n_overlap_pairs;
  s->overlap_rms_um = scan->overlap_rms_um;
}

/* The scan takes a map that it may not fit for an entered one. */
static void name_calibration(AwScanResult *scan)
{
  static const char entered[] = "kept as entered; ";
  g_autofree char *note = g_steal_pointer(&scan->map_note);
  const char *rest = g_str_has_prefix(note, entered) ? note + strlen(entered) : note;
  scan->map_note = g_strdup_printf("calibrated from one mark; %s", rest);
}

/* Reads, segments and numbers; the record is still as it was. */
static AwScanResult *find_nuclei(AwRecord *record, const AwSegmentStep *step, const AwStepContext *context,
                                 GError **error)
{
  AwScanSettings settings;
  if (!scan_settings(record, step, context, &settings, error))
    return NULL;
  if (!aw_record_files_require(record, TRUE, context->n_threads, context->progress, error))
    return NULL;
  g_autoptr(GPtrArray) frames = aw_record_frames(record, error);
  if (!frames)
    return NULL;
  g_autoptr(GPtrArray) paths = NULL;
  g_autoptr(GArray) list = aw_step_scan_frames(record, frames, &paths);
  g_autoptr(AwScanResult) scan =
      aw_scan_segment((const AwScanFrame *)(const void *)list->data, list->len, &settings, context->progress, error);
  if (scan && !step->pixel_map && settings.map.origin == AW_ORIGIN_FITTED)
    name_calibration(scan);
  if (scan && !scan->nuclei->len) {
    g_set_error(error, AW_ERROR, AW_ERROR_EMPTY, "%s: no nucleus was found in %u frames", aw_record_path(record),
                list->len);
    return NULL;
  }
  return g_steal_pointer(&scan);
}

gboolean aw_step_segment(const char *path, const AwSegmentStep *step, const AwStepContext *context,
                         AwSegmentSummary *summary, GError **error)
{
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  g_autoptr(GPtrArray) before = record ? aw_record_nuclei(record, TRUE, error) : NULL;
  g_autoptr(AwScanResult) scan = before ? find_nuclei(record, step, context, error) : NULL;
  if (!scan)
    return FALSE;
  summary->lost = g_array_new(FALSE, FALSE, sizeof(gint64));
  if (!number_nuclei(record, before, scan->nuclei, error) || !carry_decisions(record, scan->nuclei, summary, error) ||
      !aw_record_set_nuclei(record, scan->nuclei, error) || !store_facts(record, step, scan, error))
    return FALSE;
  summarise(scan, summary);
  g_autofree char *action =
      g_strdup_printf("found %u nuclei in the scan; %u decisions lost", scan->nuclei->len, summary->lost->len);
  return !aw_progress_stopped(context->progress, error) && aw_record_commit(record, action, error);
}

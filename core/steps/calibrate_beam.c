/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/error.h"
#include "base/limits.h"
#include "base/output.h"
#include "base/text.h"
#include "image/reader.h"
#include "steps/calibrate_store.h"
#include "steps/calibrate_tables.h"

void aw_edge_summary_clear(AwEdgeSummary *summary)
{
  g_clear_pointer(&summary->points, g_array_unref);
}

static gboolean store_edge(AwRecord *record, const AwCalibrateSource *source, const AwEdgeScan *scan,
                           const AwEdgeSummary *s, GError **error)
{
  g_autoptr(GString) text = g_string_new("[edge]\n");
  g_autofree char *kind = g_strdup_printf("edge-%c", scan->axis);
  aw_store_double(text, "centre-um", s->fit.centre_um.value);
  aw_store_double(text, "centre-se-um", s->fit.centre_um.se);
  aw_store_double(text, "sigma-um", s->fit.sigma_um.value);
  aw_store_double(text, "sigma-se-um", s->fit.sigma_um.se);
  aw_store_double(text, "disc-diameter-um", s->fit.disc_diameter_um);
  aw_store_double(text, "p-value", s->fit.p_value);
  aw_store_double(text, "offset-um", s->fit.centre_um.value - scan->crosshair_um);
  g_autofree char *sigma = aw_text_from_double(s->fit.sigma_um.value, 3);
  g_autofree char *action =
      g_strdup_printf("calibrated the beam in %c with a knife edge: sigma %s um", scan->axis, sigma);
  return aw_store_commit(record, kind, source, text, action, error);
}

gboolean aw_step_calibrate_edge(const char *path, const AwCalibrateSource *source, const AwEdgeScan *scan,
                                const AwStepContext *context, AwEdgeSummary *s, GError **error)
{
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  if (!record || !(s->points = aw_table_edge(source->table, &s->counts, error)))
    return FALSE;
  AwEdgeSettings settings = { s->counts, scan->fit_plateaus };
  if (!aw_edge_fit((const AwEdgePoint *)(const void *)s->points->data, s->points->len, &settings, &s->fit, error)) {
    g_prefix_error(error, "%s: ", source->table);
    return FALSE;
  }
  return store_edge(record, source, scan, s, error);
}

void aw_bead_summary_clear(AwBeadSummary *summary)
{
  g_clear_pointer(&summary->points, g_array_unref);
}

/* The reading that puts the bead on the crosshair, the frame's centre, by S - A (p - c). */
static gboolean crosshair_from_image(AwRecord *record, const AwCalibrateSource *source, const AwBeadScan *scan,
                                     AwBeadSummary *s, GError **error)
{
  AwPixelMap map;
  g_autoptr(AwImage) image = aw_image_load(scan->image, 0, -1, NULL, error);
  if (!image || !aw_record_pixel_map(record, &map, error))
    return FALSE;
  if (!aw_mark_find(image, source->marks, &s->mark, error)) {
    g_prefix_error(error, "%s: ", scan->image);
    return FALSE;
  }
  AwScanPoint reading = { scan->reading.bx_um, scan->reading.by_um };
  AwPixelPoint centre = aw_frame_centre(image->width_px, image->height_px);
  AwScanPoint at = aw_pixel_to_scan(&map, reading, centre, s->mark.at);
  s->has_mark = TRUE;
  s->crosshair = (AwBeamPoint){ at.x_um, at.y_um };
  return TRUE;
}

static gboolean find_crosshair(AwRecord *record, const AwCalibrateSource *source, const AwBeadScan *scan,
                               AwBeadSummary *s, GError **error)
{
  s->has_offset = scan->crosshair || scan->image;
  if (scan->image && !crosshair_from_image(record, source, scan, s, error))
    return FALSE;
  if (scan->crosshair)
    s->crosshair = *scan->crosshair;
  return TRUE;
}

static gboolean store_bead(AwRecord *record, const AwCalibrateSource *source, const AwBeadSummary *s, GError **error)
{
  g_autoptr(GString) text = g_string_new("[bead]\n");
  aw_store_double(text, "centre-x-um", s->fit.centre.bx_um);
  aw_store_double(text, "centre-y-um", s->fit.centre.by_um);
  aw_store_double(text, "sigma-x-um", s->fit.sigma_x.value);
  aw_store_double(text, "sigma-y-um", s->fit.sigma_y.value);
  aw_store_double(text, "p-value", s->fit.p_value);
  if (s->has_offset) {
    g_string_append(text, "[offset]\n");
    aw_store_double(text, "x-um", s->offset.x_um);
    aw_store_double(text, "y-um", s->offset.y_um);
    aw_store_matrix(text, "covariance-", s->offset.covariance_um2);
  }
  g_autofree char *x = aw_text_from_double(s->fit.centre.bx_um, 2), *y = aw_text_from_double(s->fit.centre.by_um, 2);
  g_autofree char *action = g_strdup_printf("calibrated the beam's place with a bead: centred at (%s, %s) um", x, y);
  return aw_store_commit(record, "bead", source, text, action, error);
}

gboolean aw_step_calibrate_bead(const char *path, const AwCalibrateSource *source, const AwBeadScan *scan,
                                const AwStepContext *context, AwBeadSummary *s, GError **error)
{
  AwCalibrateSource timed = *source;
  if (isnan(timed.at_unix_s))
    timed.at_unix_s = floor((double)g_get_real_time() / G_USEC_PER_SEC);
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  if (!record || !(s->points = aw_table_bead(source->table, error)))
    return FALSE;
  if (!aw_bead_fit((const AwBeadPoint *)(const void *)s->points->data, s->points->len, scan->elliptical, &s->fit,
                   error)) {
    g_prefix_error(error, "%s: ", source->table);
    return FALSE;
  }
  if (!find_crosshair(record, &timed, scan, s, error))
    return FALSE;
  s->offset = aw_bead_offset(&s->fit, s->crosshair, timed.at_unix_s);
  if (!store_bead(record, &timed, s, error))
    return FALSE;
  g_auto(AwCalibrated) calibrated = { 0 };
  if (!aw_calibrated_read(record, &calibrated, error))
    return FALSE;
  s->drift_um2_per_h = calibrated.drift_um2_per_h;
  return TRUE;
}

gboolean aw_step_calibrate_beam(const char *path, const AwCalibrateSource *source, const AwStepContext *context,
                                AwBeamAtNucleus *at, GError **error)
{
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  g_autofree char *bytes = NULL;
  gsize n_bytes;
  if (!record || !aw_input_read(source->table, AW_MAX_KEYFILE_BYTES, &bytes, &n_bytes, error))
    return FALSE;
  g_autoptr(AwBeamFile) file = aw_beam_file_parse(bytes, n_bytes, source->table, error);
  if (!file)
    return FALSE;
  if (!aw_beam_at_nucleus(file, at, error)) {
    g_prefix_error(error, "%s: ", source->table);
    return FALSE;
  }
  g_autoptr(GString) text = g_string_new_len(bytes, (gssize)n_bytes);
  g_autofree char *energy = aw_text_from_double(at->energy_mev, 3), *let = aw_text_from_double(at->let_kev_per_um, 2);
  g_autofree char *action = g_strdup_printf("entered the beam: %s of %s MeV and %s keV/um at the nucleus",
                                            aw_particle_name(file->particle), energy, let);
  return aw_store_commit(record, "beam", source, text, action, error);
}

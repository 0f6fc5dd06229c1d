/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/calibrated.h"

#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/keyfile.h"
#include "base/text.h"

#define UNLIMITED G_MAXDOUBLE

void aw_calibrated_clear(AwCalibrated *c)
{
  g_clear_pointer(&c->pairs, g_array_unref);
  g_clear_pointer(&c->beam, aw_beam_file_free);
}

static AwKeyFile *numbers_of(const AwCalibration *c, GError **error)
{
  g_autofree char *name = g_strdup_printf("calibration %" G_GINT64_FORMAT " (%s)", c->id, c->kind);
  return aw_keyfile_parse(c->text, strlen(c->text), name, error);
}

static gboolean need_double(AwKeyFile *file, const char *group, const char *key, double *value, GError **error)
{
  g_autofree char *text = aw_keyfile_need_text(file, group, key, error);
  return text && aw_text_to_double(text, key, value, error);
}

static gboolean read_matrix(AwKeyFile *file, const char *group, const char *prefix, AwMatrix *m, GError **error)
{
  double *to[4] = { &m->xx, &m->xy, &m->yx, &m->yy };
  static const char *const ends[4] = { "xx", "xy", "yx", "yy" };
  for (int i = 0; i < 4; i++) {
    g_autofree char *key = g_strconcat(prefix, ends[i], NULL);
    if (!need_double(file, group, key, to[i], error))
      return FALSE;
  }
  return TRUE;
}

static gboolean read_map(const AwCalibration *from, AwCalibrated *c, GError **error)
{
  if (!from)
    return TRUE;
  g_autoptr(AwKeyFile) file = numbers_of(from, error);
  double n = 0;
  if (!file || !read_matrix(file, "pixel", "a-", &c->um_per_px, error) || !need_double(file, "pixel", "n", &n, error))
    return FALSE;
  c->map_covariance = (AwMatrix){ NAN, NAN, NAN, NAN };
  if (aw_keyfile_has(file, "pixel", "covariance-xx") &&
      !read_matrix(file, "pixel", "covariance-", &c->map_covariance, error))
    return FALSE;
  c->has_map = TRUE;
  c->map_n = (gsize)n;
  c->map_at_unix_s = from->at_unix_s;
  return TRUE;
}

static gboolean read_pair(AwKeyFile *file, gsize number, AwMarkPair *pair, GError **error)
{
  g_autofree char *key = g_strdup_printf("mark-%" G_GSIZE_FORMAT, number);
  g_autofree char *text = aw_keyfile_need_text(file, "marks", key, error);
  g_auto(GStrv) part = g_strsplit(text ? text : "", " ", -1);
  double *to[4] = { &pair->scan.x_um, &pair->scan.y_um, &pair->beam.bx_um, &pair->beam.by_um };
  if (!text)
    return FALSE;
  if (g_strv_length(part) != 4) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "a stored relocation cannot be read: %s is \"%s\", not four numbers",
                key, text);
    return FALSE;
  }
  for (int i = 0; i < 4; i++)
    if (!aw_text_to_double(part[i], key, to[i], error))
      return FALSE;
  return TRUE;
}

/* The registration is fitted anew from the stored pairs, so that all it knows about its errors is at hand. */
static gboolean read_relocation(const AwCalibration *from, AwCalibrated *c, GError **error)
{
  if (!from)
    return TRUE;
  g_autoptr(AwKeyFile) file = numbers_of(from, error);
  g_autofree char *name = file ? aw_keyfile_need_text(file, "marks", "fit", error) : NULL;
  AwFitKind kind;
  gboolean mirrored = FALSE;
  double localisation_um = 0, n = 0;
  if (!name || !aw_fit_kind_parse(name, &kind, error) || !need_double(file, "marks", "n", &n, error) ||
      !aw_keyfile_bool(file, "marks", "mirrored", &mirrored, error) ||
      !aw_keyfile_double(file, "marks", "localisation-um", 0, UNLIMITED, &localisation_um, error))
    return FALSE;
  for (gsize i = 1; i <= (gsize)n; i++) {
    AwMarkPair pair;
    if (!read_pair(file, i, &pair, error))
      return FALSE;
    g_array_append_val(c->pairs, pair);
  }
  c->has_relocation = TRUE;
  return aw_registration_fit((const AwMarkPair *)(const void *)c->pairs->data, c->pairs->len, kind, mirrored,
                             localisation_um, &c->relocation, error);
}

static gboolean read_check(const AwCalibration *from, AwOffsetCheck *check, gboolean *has, GError **error)
{
  g_autoptr(AwKeyFile) file = numbers_of(from, error);
  if (!file)
    return FALSE;
  *has = aw_keyfile_has(file, "offset", "x-um");
  check->at_unix_s = from->at_unix_s;
  return !*has || (need_double(file, "offset", "x-um", &check->x_um, error) &&
                   need_double(file, "offset", "y-um", &check->y_um, error) &&
                   read_matrix(file, "offset", "covariance-", &check->covariance_um2, error));
}

/* All bead scans with a crosshair reading: the newest is the offset, together they tell the drift. */
static gboolean read_beads(GPtrArray *all, AwCalibrated *c, GError **error)
{
  g_autoptr(GArray) checks = g_array_new(FALSE, FALSE, sizeof(AwOffsetCheck));
  for (guint i = 0; i < all->len; i++) {
    const AwCalibration *one = all->pdata[i];
    AwOffsetCheck check;
    gboolean has = FALSE;
    if (strcmp(one->kind, "bead") != 0)
      continue;
    if (!read_check(one, &check, &has, error))
      return FALSE;
    if (has)
      g_array_append_val(checks, check);
  }
  c->drift_um2_per_h = aw_offset_drift((const AwOffsetCheck *)(const void *)checks->data, checks->len);
  if (checks->len == 0)
    return TRUE;
  c->has_offset = TRUE;
  c->offset = g_array_index(checks, AwOffsetCheck, checks->len - 1);
  c->offset_how = "a bead scan";
  return TRUE;
}

/* One knife edge: the beam's width, and with a crosshair reading one coordinate of the offset. */
static gboolean read_edge(const AwCalibration *from, AwEstimate *sigma, AwEstimate *offset, GError **error)
{
  *sigma = *offset = (AwEstimate){ NAN, NAN };
  if (!from)
    return TRUE;
  g_autoptr(AwKeyFile) file = numbers_of(from, error);
  return file && need_double(file, "edge", "sigma-um", &sigma->value, error) &&
         need_double(file, "edge", "sigma-se-um", &sigma->se, error) &&
         aw_keyfile_double(file, "edge", "offset-um", -UNLIMITED, UNLIMITED, &offset->value, error) &&
         aw_keyfile_double(file, "edge", "centre-se-um", 0, UNLIMITED, &offset->se, error);
}

static gboolean read_edges(GPtrArray *all, AwCalibrated *c, GError **error)
{
  const AwCalibration *x = aw_calibration_newest(all, "edge-x"), *y = aw_calibration_newest(all, "edge-y");
  AwEstimate ox, oy;
  if (!read_edge(x, &c->sigma_x_um, &ox, error) || !read_edge(y, &c->sigma_y_um, &oy, error))
    return FALSE;
  double at = x && y ? fmax(x->at_unix_s, y->at_unix_s) : NAN;
  if (!isfinite(ox.value) || !isfinite(oy.value) || (c->has_offset && c->offset.at_unix_s >= at))
    return TRUE;
  c->has_offset = TRUE;
  c->offset = (AwOffsetCheck){ at, ox.value, oy.value, { ox.se * ox.se, 0, 0, oy.se * oy.se } };
  c->offset_how = "two knife edges";
  return TRUE;
}

static gboolean read_entered(GPtrArray *all, AwCalibrated *c, GError **error)
{
  for (int i = 0; i < AW_N_TERMS; i++) {
    g_autofree char *kind = g_strconcat("error-", aw_term_name((AwTermId)i), NULL);
    const AwCalibration *from = aw_calibration_newest(all, kind);
    if (!from)
      continue;
    g_autoptr(AwKeyFile) file = numbers_of(from, error);
    if (!file || !need_double(file, "error", "value", &c->entered[i], error))
      return FALSE;
    c->is_entered[i] = TRUE;
  }
  return TRUE;
}

static gboolean read_beam(const AwCalibration *from, AwCalibrated *c, GError **error)
{
  if (!from)
    return TRUE;
  c->beam = aw_beam_file_parse(from->text, strlen(from->text), from->source, error);
  return c->beam != NULL;
}

gboolean aw_calibrated_read(AwRecord *record, AwCalibrated *c, GError **error)
{
  *c = (AwCalibrated){ .drift_um2_per_h = NAN, .pairs = g_array_new(FALSE, FALSE, sizeof(AwMarkPair)) };
  g_autoptr(GPtrArray) all = aw_record_calibrations(record, error);
  return all && read_map(aw_calibration_newest(all, "pixel"), c, error) &&
         read_relocation(aw_calibration_newest(all, "marks"), c, error) && read_beads(all, c, error) &&
         read_edges(all, c, error) && read_entered(all, c, error) &&
         read_beam(aw_calibration_newest(all, "beam"), c, error);
}

AwBeamPoint aw_calibrated_place(const AwCalibrated *c, AwScanPoint q)
{
  AwBeamPoint b = { q.x_um, q.y_um };
  if (c->has_relocation)
    b = aw_registration_apply(&c->relocation, q);
  if (c->has_offset)
    b = (AwBeamPoint){ b.bx_um + c->offset.x_um, b.by_um + c->offset.y_um };
  return b;
}

char *aw_calibrated_origin(const AwCalibrated *c)
{
  g_autofree char *relocation = g_strdup("relocation assumed: one stage serves scan and beam");
  g_autofree char *offset = g_strdup("beam offset assumed 0");
  if (c->has_relocation) {
    const AwRegistration *r = &c->relocation;
    g_autofree char *rms = aw_text_from_double(r->rms_um, 2);
    g_free(relocation);
    relocation = g_strdup_printf("relocation fitted: %s%s from %" G_GSIZE_FORMAT
                                 " marks, residual %s um rms radial; that is no proof of accuracy at a target",
                                 r->mirrored ? "mirrored " : "", aw_fit_kind_name(r->kind), r->n, rms);
  }
  if (c->has_offset) {
    g_autofree char *x = aw_text_from_double(c->offset.x_um, 2), *y = aw_text_from_double(c->offset.y_um, 2);
    g_autofree char *at = aw_text_from_time(c->offset.at_unix_s);
    g_free(offset);
    offset = g_strdup_printf("beam offset fitted: (%s, %s) um from %s at %s", x, y, c->offset_how, at);
  }
  return g_strdup_printf("%s\n%s", relocation, offset);
}

gboolean aw_calibrated_budget_input(AwRecord *record, const AwCalibrated *c, double now, AwBudgetInput *in,
                                    GError **error)
{
  AwPixelMap map;
  double overlap_um;
  g_autoptr(GPtrArray) frames = aw_record_frames(record, error);
  if (!frames || !aw_record_pixel_map(record, &map, error) ||
      !aw_record_fact_double(record, AW_FACT_OVERLAP_RMS_UM, NAN, &overlap_um, error))
    return FALSE;
  double oldest = NAN;
  for (guint i = 0; i < frames->len; i++)
    oldest = fmin(oldest, ((const AwFrame *)frames->pdata[i])->taken_at_unix_s);
  *in = (AwBudgetInput){ .um_per_px = map.um_per_px,
                         .map_covariance = c->has_map ? &c->map_covariance : NULL,
                         .relocation = c->has_relocation ? &c->relocation : NULL,
                         .offset_covariance = c->has_offset ? &c->offset.covariance_um2 : NULL,
                         .drift_um2_per_h = c->drift_um2_per_h,
                         .localisation_um = overlap_um > 0 ? overlap_um / sqrt(2) : NAN,
                         .scan_age_s = now - oldest,
                         .check_age_s = c->has_offset ? now - c->offset.at_unix_s : NAN };
  memcpy(in->is_entered, c->is_entered, sizeof in->is_entered);
  memcpy(in->entered, c->entered, sizeof in->entered);
  return TRUE;
}

AwBudgetTarget *aw_calibrated_targets(GPtrArray *nuclei, GPtrArray *frames)
{
  AwBudgetTarget *targets = g_new(AwBudgetTarget, nuclei->len + 1);
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *nucleus = nuclei->pdata[i];
    const AwFrame *frame = frames->pdata[nucleus->frame];
    AwPixelPoint centre = aw_frame_centre(frame->width_px, frame->height_px);
    targets[i] =
        (AwBudgetTarget){ nucleus->centroid,
                          { nucleus->centroid_px.x_px - centre.x_px, nucleus->centroid_px.y_px - centre.y_px } };
  }
  return targets;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/relocate_nuclei.h"

#include <math.h>

#include "base/error.h"
#include "base/text.h"
#include "image/reader.h"
#include "nuclei/scan.h"
#include "nuclei/scantable.h"
#include "steps/calibrate_store.h"

/*
 * How the camera lies against the beam stage's axes is seldom known. A wrong guess mirrors or turns each field about
 * its reading, so that at best one field can fit the scan; the right one fits them all. The eight ways of laying two
 * axes on two others are tried in turn, the plain one first.
 */
#define PAIR_CONFIDENCE 0.95
#define MIN_PAIRS 6
#define MIN_IN_FIELD 8
#define MIN_SHARE_IN_FIELD 0.25
#define SAME_READING_UM 1.0

static const struct {
  AwMatrix axes;
  const char *words;
} ways[] = { { { 1, 0, 0, 1 }, "camera axes as the stage's" },
             { { -1, 0, 0, -1 }, "camera turned by 180 degrees" },
             { { -1, 0, 0, 1 }, "x axis runs the other way" },
             { { 1, 0, 0, -1 }, "y axis runs the other way" },
             { { 0, 1, 1, 0 }, "x and y exchanged" },
             { { 0, -1, -1, 0 }, "x and y exchanged, both run the other way" },
             { { 0, -1, 1, 0 }, "camera turned by 90 degrees" },
             { { 0, 1, -1, 0 }, "camera turned by -90 degrees" } };

void aw_fields_summary_clear(AwFieldsSummary *summary)
{
  aw_match_clear(&summary->match);
  aw_marks_summary_clear(&summary->marks);
}

/* The fields on their way: frames, what was found in them, and the scan's positions. */
typedef struct {
  GPtrArray *rows; /* AwScanRow */
  GArray *frames;  /* AwScanFrame */
  double pixel_um;
  AwScanResult *found;
  GPtrArray *nuclei; /* AwNucleus of the record */
  GArray *whole;     /* guint: of found->nuclei, those that no edge cuts */
  double *xy_scan, *xy_beam;
} Fields;

static void fields_clear(Fields *f)
{
  g_clear_pointer(&f->rows, g_ptr_array_unref);
  g_clear_pointer(&f->frames, g_array_unref);
  g_clear_pointer(&f->found, aw_scan_result_free);
  g_clear_pointer(&f->nuclei, g_ptr_array_unref);
  g_clear_pointer(&f->whole, g_array_unref);
  g_free(f->xy_scan);
  g_free(f->xy_beam);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Fields, fields_clear)

static gboolean open_frames(Fields *f, GError **error)
{
  f->frames = g_array_new(FALSE, FALSE, sizeof(AwScanFrame));
  for (guint i = 0; i < f->rows->len; i++) {
    const AwScanRow *row = f->rows->pdata[i];
    g_autoptr(AwImageReader) reader = aw_image_reader_open(row->path, row->page, MAX(row->channel, 0), error);
    if (!reader)
      return FALSE;
    const AwImageInfo *info = aw_image_reader_info(reader);
    AwScanFrame frame = { row->path, row->page, MAX(row->channel, 0), info->width_px, info->height_px, row->stage };
    double pixel_um = row->pixel_um > 0 ? row->pixel_um : info->pixel_um;
    g_array_append_val(f->frames, frame);
    if (i > 0 && fabs(pixel_um - f->pixel_um) > 0.001 * f->pixel_um) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s: the frames of one camera have one pixel size; this one differs",
                  row->path);
      return FALSE;
    }
    f->pixel_um = pixel_um;
  }
  return TRUE;
}

/* Fields at one reading look alike under every way the camera may lie. */
static gboolean readings_differ(const Fields *f)
{
  const AwScanFrame *frame = (const AwScanFrame *)(const void *)f->frames->data;
  for (guint i = 1; i < f->frames->len; i++)
    if (hypot(frame[i].stage.x_um - frame[0].stage.x_um, frame[i].stage.y_um - frame[0].stage.y_um) > SAME_READING_UM)
      return TRUE;
  return FALSE;
}

static gboolean scan_settings(AwRecord *record, const Fields *f, const AwFieldsSettings *settings,
                              const AwStepContext *context, AwScanSettings *s, GError **error)
{
  double width_um;
  *s = (AwScanSettings){ .n_threads = context->n_threads, .pixel_um = f->pixel_um, .fit_map = !settings->camera };
  s->map = (AwPixelMap){ { f->pixel_um, 0, 0, f->pixel_um }, AW_ORIGIN_ASSUMED, 0 };
  if (settings->camera)
    s->map = (AwPixelMap){ *settings->camera, AW_ORIGIN_ENTERED, 0 };
  if (!aw_record_fact_double(record, AW_FACT_NUCLEUS_WIDTH_UM, 0, &width_um, error) ||
      !aw_record_fact_double(record, AW_FACT_SENSITIVITY, 0, &s->segment.sensitivity, error) ||
      !aw_record_fact_double(record, AW_FACT_SPLITTING, 0, &s->segment.splitting, error))
    return FALSE;
  s->segment.nucleus_width_px = width_um / aw_pixel_map_scale(&s->map);
  return TRUE;
}

static gboolean read_fields(AwRecord *record, const char *table, const AwFieldsSettings *settings, Fields *f,
                            GError **error)
{
  f->nuclei = aw_record_nuclei(record, FALSE, error);
  if (!f->nuclei || !(f->rows = aw_scan_table_read(table, NULL, error)) || !open_frames(f, error))
    return FALSE;
  if (f->nuclei->len == 0)
    g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s: no nuclei to match the fields with; segment the scan first",
                aw_record_path(record));
  else if (!settings->camera && !(f->pixel_um > 0))
    g_set_error(error, AW_ERROR, AW_ERROR_STATE,
                "%s: the pixel size of the beam stage's camera is not known; give a column pixel_um or --pixel-map",
                table);
  else if (!settings->camera && !readings_differ(f))
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "%s: fields at one stage reading cannot tell how the camera lies against the stage; add a field at "
                "another reading, or give --pixel-map",
                table);
  else
    return TRUE;
  return FALSE;
}

static gboolean find_in_fields(AwRecord *record, const AwFieldsSettings *settings, const AwStepContext *context,
                               Fields *f, GError **error)
{
  AwScanSettings scan;
  if (!scan_settings(record, f, settings, context, &scan, error))
    return FALSE;
  f->found = aw_scan_segment((const AwScanFrame *)(const void *)f->frames->data, f->frames->len, &scan,
                             context->progress, error);
  if (!f->found)
    return FALSE;
  f->whole = g_array_new(FALSE, FALSE, sizeof(guint));
  for (guint i = 0; i < f->found->nuclei->len; i++)
    if (!(((const AwNucleus *)f->found->nuclei->pdata[i])->flags & AW_FLAG_BORDER))
      g_array_append_val(f->whole, i);
  f->xy_beam = g_new0(double, 2 * f->whole->len + 1);
  f->xy_scan = g_new0(double, 2 * f->nuclei->len + 1);
  for (guint i = 0; i < f->nuclei->len; i++) {
    AwScanPoint q = ((const AwNucleus *)f->nuclei->pdata[i])->centroid;
    f->xy_scan[2 * i] = q.x_um;
    f->xy_scan[2 * i + 1] = q.y_um;
  }
  return TRUE;
}

static const AwNucleus *whole_nucleus(const Fields *f, guint j)
{
  return f->found->nuclei->pdata[g_array_index(f->whole, guint, j)];
}

/* Beam-stage positions under a camera map: each nucleus by its best frame. */
static void place(Fields *f, const AwMatrix *camera)
{
  const AwPixelMap map = { *camera, AW_ORIGIN_ASSUMED, 0 };
  for (guint j = 0; j < f->whole->len; j++) {
    const AwNucleus *nucleus = whole_nucleus(f, j);
    const AwScanFrame *frame = &g_array_index(f->frames, AwScanFrame, nucleus->frame);
    AwPixelPoint centre = aw_frame_centre(frame->width_px, frame->height_px);
    AwScanPoint b = aw_pixel_to_scan(&map, frame->stage, centre, nucleus->centroid_px);
    f->xy_beam[2 * j] = b.x_um;
    f->xy_beam[2 * j + 1] = b.y_um;
  }
}

/* The first field whose nuclei the map does not find in the scan, or -1. */
static int misfit(const Fields *f, const AwMatch *match)
{
  g_autofree guint *n = g_new0(guint, f->frames->len), *found = g_new0(guint, f->frames->len);
  for (guint j = 0; j < f->whole->len; j++) {
    int frame = whole_nucleus(f, j)->frame;
    n[frame]++;
    found[frame] += match->of_b[j].partner >= 0;
  }
  for (guint i = 0; i < f->frames->len; i++)
    if (n[i] >= MIN_IN_FIELD && found[i] < MIN_SHARE_IN_FIELD * n[i])
      return (int)i;
  return -1;
}

/* Tries the ways until one is sure and fits every field. */
static gboolean match_fields(Fields *f, const char *table, const AwFieldsSettings *settings,
                             const AwStepContext *context, AwFieldsSummary *s, GError **error)
{
  AwMatchSettings how;
  aw_match_settings_init(&how);
  how.kind = settings->kind;
  how.progress = context->progress;
  gsize n_ways = f->found->map.origin == AW_ORIGIN_ASSUMED ? G_N_ELEMENTS(ways) : 1;
  int bad = -1;
  for (gsize k = 0; k < n_ways; k++) {
    aw_match_clear(&s->match);
    s->camera = aw_matrix_multiply(f->found->map.um_per_px, ways[k].axes);
    s->camera_words = n_ways > 1 ? ways[k].words : "as given or fitted";
    place(f, &s->camera);
    AwMatchPattern a = { f->xy_scan, f->nuclei->len, "the scan" }, b = { f->xy_beam, f->whole->len, "the fields" };
    if (!aw_match_find(a, b, &how, &s->match, error))
      return FALSE;
    int now = s->match.sure ? misfit(f, &s->match) : -1;
    if (s->match.sure && now < 0)
      return TRUE;
    bad = s->match.sure ? now : bad;
  }
  if (bad >= 0)
    g_set_error(error, AW_ERROR, AW_ERROR_VERIFY,
                "%s: %s does not fit the scan as the other fields do; is its reading right, and the camera's map?",
                table, ((const AwScanRow *)f->rows->pdata[bad])->path);
  else
    g_set_error(error, AW_ERROR, AW_ERROR_VERIFY, "%s: the fields cannot be found in the scan. %s", table,
                s->match.note);
  return FALSE;
}

/* Between the middle frames' times. */
static gboolean count_hours(AwRecord *record, const Fields *f, double *hours, GError **error)
{
  g_autoptr(GPtrArray) frames = aw_record_frames(record, error);
  if (!frames)
    return FALSE;
  const AwFrame *scan = frames->pdata[frames->len / 2];
  const AwScanRow *field = f->rows->pdata[f->rows->len / 2];
  *hours = (field->taken_at_unix_s - scan->taken_at_unix_s) / 3600;
  return TRUE;
}

static void take_sure_pairs(const Fields *f, const AwMatch *match, AwMarksSummary *marks)
{
  marks->pairs = g_array_new(FALSE, FALSE, sizeof(AwMarkPair));
  marks->names = g_ptr_array_new_with_free_func(g_free);
  for (guint j = 0; j < f->whole->len; j++) {
    const AwMatchPoint *p = &match->of_b[j];
    if (p->partner < 0 || p->confidence < PAIR_CONFIDENCE)
      continue;
    const AwNucleus *nucleus = f->nuclei->pdata[p->partner];
    AwMarkPair pair = { nucleus->centroid, { f->xy_beam[2 * j], f->xy_beam[2 * j + 1] } };
    g_array_append_val(marks->pairs, pair);
    g_ptr_array_add(marks->names, g_strdup_printf("%" G_GINT64_FORMAT, nucleus->id));
  }
}

static gboolean fit_relocation(const Fields *f, const char *table, AwFitKind kind, AwFieldsSummary *s, GError **error)
{
  take_sure_pairs(f, &s->match, &s->marks);
  const GArray *pairs = s->marks.pairs;
  if (pairs->len < MIN_PAIRS) {
    g_set_error(error, AW_ERROR, AW_ERROR_VERIFY,
                "%s: %u nuclei have a sure partner in the scan; at least %d are needed for a relocation", table,
                pairs->len, MIN_PAIRS);
    return FALSE;
  }
  s->marks.check.suspect = s->marks.check.partner = -1;
  return aw_registration_fit((const AwMarkPair *)(const void *)pairs->data, pairs->len, kind, s->match.mirrored, 0,
                             &s->marks.fit, error);
}

static gboolean store(AwRecord *record, const AwCalibrateSource *source, const AwFieldsSummary *s, GError **error)
{
  const AwRegistration *fit = &s->marks.fit;
  g_autoptr(GString) text = g_string_new("[marks]\n");
  aw_store_text(text, "from", "nuclei");
  aw_store_marks(text, fit->kind, fit->mirrored, 0, s->marks.pairs);
  aw_store_double(text, "movement-um", s->match.movement_um);
  aw_store_double(text, "movement-se-um", s->match.movement_se_um);
  aw_store_matrix(text, "camera-", s->camera);
  g_autofree char *rms = aw_text_from_double(fit->rms_um, 2);
  g_autofree char *action = g_strdup_printf("calibrated the relocation from %u nuclei in %u fields: %s, residual %s um",
                                            s->marks.pairs->len, s->n_fields, aw_fit_kind_name(fit->kind), rms);
  return aw_store_commit(record, "marks", source, text, action, error);
}

gboolean aw_step_calibrate_fields(const char *path, const AwCalibrateSource *source, const AwFieldsSettings *settings,
                                  const AwStepContext *context, AwFieldsSummary *s, GError **error)
{
  g_auto(Fields) f = { 0 };
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  if (!record || !read_fields(record, source->table, settings, &f, error) ||
      !find_in_fields(record, settings, context, &f, error) ||
      !match_fields(&f, source->table, settings, context, s, error))
    return FALSE;
  s->n_fields = f.frames->len;
  s->n_nuclei = f.whole->len;
  return count_hours(record, &f, &s->hours, error) && fit_relocation(&f, source->table, settings->kind, s, error) &&
         aw_marks_errors(record, &s->marks, error) && store(record, source, s, error);
}

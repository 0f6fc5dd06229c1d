/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "support/dish.h"

#include <math.h>
#include <unistd.h>

void aw_test_use_memory(void)
{
  if (access("/dev/shm", W_OK | X_OK) == 0)
    g_setenv("TMPDIR", "/dev/shm", TRUE);
}

GPtrArray *aw_test_frames(guint n)
{
  GPtrArray *frames = g_ptr_array_new_with_free_func((GDestroyNotify)aw_frame_free);
  for (guint i = 0; i < n; i++) {
    AwFrame *frame = aw_frame_new();
    frame->file = g_strdup_printf("images/frame_%u.tif", i);
    frame->width_px = 640;
    frame->height_px = 480;
    frame->full_scale = 4095;
    frame->stage = (AwScanPoint){ 1000.25 + 100 * i, -37.5 };
    frame->pixel_um = 0.65;
    frame->taken_at_unix_s = i == 1 ? NAN : 1.9e9 + i;
    frame->size_bytes = 614400 + i;
    frame->mtime_ns = G_GINT64_CONSTANT(1900000000123456789) + i;
    frame->sha256 = g_strdup_printf("%064x", 0xabc0 + i);
    frame->overview = i == 2 ? NULL : g_bytes_new("\x89PNG overview", 13);
    g_ptr_array_add(frames, frame);
  }
  return frames;
}

/* A disc of radius r pixels around column cx, row cy. */
static void add_shape(AwNucleus *nucleus, int cx, int cy, int r)
{
  nucleus->n_runs = (gsize)(2 * r + 1);
  nucleus->runs = g_new(AwRun, nucleus->n_runs);
  for (int dy = -r; dy <= r; dy++) {
    int half = (int)sqrt((double)(r * r - dy * dy));
    nucleus->runs[dy + r] = (AwRun){ cy + dy, cx - half, cx + half + 1 };
  }
  nucleus->n_outline = 48;
  nucleus->outline = g_new(AwScanPoint, nucleus->n_outline);
  for (gsize i = 0; i < nucleus->n_outline; i++) {
    double turn = 2 * G_PI * (double)i / (double)nucleus->n_outline;
    nucleus->outline[i].x_um = nucleus->centroid.x_um + 0.65 * r * cos(turn);
    nucleus->outline[i].y_um = nucleus->centroid.y_um + 0.65 * r * sin(turn);
  }
}

GPtrArray *aw_test_nuclei(guint n, gint64 first_id, int n_frames)
{
  gsize n_features;
  const AwFeature *features = aw_features(&n_features);
  GPtrArray *nuclei = aw_nuclei_new();
  for (guint i = 0; i < n; i++) {
    AwNucleus *nucleus = g_new0(AwNucleus, 1);
    nucleus->id = first_id + i;
    nucleus->frame = (int)(i % (guint)n_frames);
    nucleus->centroid_px = (AwPixelPoint){ 30 + (i * 37) % 580 + 0.125, 30 + (i * 53) % 420 + 0.0625 };
    nucleus->centroid = (AwScanPoint){ 1000 + 0.1 * i, -37.5 - 0.7 * (i % 1000) };
    nucleus->n_views = 1 + (int)(i % 2);
    nucleus->flags = i % 16;
    for (gsize f = 0; f < n_features; f++)
      *(double *)(void *)((char *)nucleus + features[f].offset) = 1.0 / 3.0 + (double)i * 0.37 + 100.0 * (double)f;
    nucleus->isolation = i == 0 ? INFINITY : nucleus->isolation;
    add_shape(nucleus, (int)nucleus->centroid_px.x_px, (int)nucleus->centroid_px.y_px, 9 + (int)(i % 3));
    g_ptr_array_add(nuclei, nucleus);
  }
  return nuclei;
}

AwRecord *aw_test_dish_new(const char *folder)
{
  GError *error = NULL;
  g_autofree char *path = g_build_filename(folder, "dish.dish", NULL);
  g_autoptr(GPtrArray) frames = aw_test_frames(3);
  const AwPixelMap map = { { 0.65, 0.01, -0.02, 0.66 }, AW_ORIGIN_FITTED, 0.0625 };
  AwRecord *record = aw_record_create(path, &error);
  g_assert_no_error(error);
  g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_set_frames(record, frames, &error) &&
                aw_record_set_fact(record, "name", "dish", &error) && aw_record_set_pixel_map(record, &map, &error) &&
                aw_record_commit(record, "start", &error));
  g_assert_no_error(error);
  return record;
}

void aw_test_dish_segment(AwRecord *record, guint n)
{
  GError *error = NULL;
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(n, 1, 3);
  g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_set_nuclei(record, nuclei, &error) &&
                aw_record_commit(record, "segment", &error));
  g_assert_no_error(error);
}

void aw_test_dish_accept(AwRecord *record, gint64 id)
{
  GError *error = NULL;
  g_autofree char *action = g_strdup_printf("accept %" G_GINT64_FORMAT, id);
  const AwDecision decision = { id, AW_STATE_ACCEPTED, TRUE };
  g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_set_decision(record, &decision, &error) &&
                aw_record_commit(record, action, &error));
  g_assert_no_error(error);
}

static void dump_nuclei(AwRecord *record, GString *text)
{
  GError *error = NULL;
  gsize n_features;
  const AwFeature *features = aw_features(&n_features);
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(record, TRUE, &error);
  g_assert_no_error(error);
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *nucleus = g_ptr_array_index(nuclei, i);
    g_string_append_printf(text, "nucleus %" G_GINT64_FORMAT " %d %a %a %a %a %d %u", nucleus->id, nucleus->frame,
                           nucleus->centroid_px.x_px, nucleus->centroid_px.y_px, nucleus->centroid.x_um,
                           nucleus->centroid.y_um, nucleus->n_views, nucleus->flags);
    for (gsize f = 0; f < n_features; f++)
      g_string_append_printf(text, " %a", aw_feature_value(&features[f], nucleus));
    for (gsize r = 0; r < nucleus->n_runs; r++)
      g_string_append_printf(text, " %d:%d-%d", nucleus->runs[r].y, nucleus->runs[r].x0, nucleus->runs[r].x1);
    for (gsize p = 0; p < nucleus->n_outline; p++)
      g_string_append_printf(text, " %a,%a", nucleus->outline[p].x_um, nucleus->outline[p].y_um);
    g_string_append_c(text, '\n');
  }
}

static void dump_choices(AwRecord *record, GString *text)
{
  GError *error = NULL;
  g_autoptr(GArray) decisions = aw_record_decisions(record, &error);
  g_autoptr(GArray) gates = aw_record_gates(record, &error);
  g_autoptr(GArray) tour = aw_record_tour(record, &error);
  g_assert_no_error(error);
  for (guint i = 0; i < decisions->len; i++) {
    AwDecision d = g_array_index(decisions, AwDecision, i);
    g_string_append_printf(text, "decision %" G_GINT64_FORMAT " %s %d\n", d.nucleus_id, aw_state_name(d.state),
                           d.by_hand);
  }
  for (guint i = 0; i < gates->len; i++) {
    AwGateRow g = g_array_index(gates, AwGateRow, i);
    g_string_append_printf(text, "gate %s %a %a\n", g.feature->stem, g.min, g.max);
  }
  for (guint i = 0; i < tour->len; i++)
    g_string_append_printf(text, "stop %" G_GINT64_FORMAT "\n", g_array_index(tour, gint64, i));
}

static void dump_calibrations(AwRecord *record, GString *text)
{
  GError *error = NULL;
  g_autoptr(GPtrArray) all = aw_record_calibrations(record, &error);
  g_assert_no_error(error);
  for (guint i = 0; i < all->len; i++) {
    const AwCalibration *c = all->pdata[i];
    g_string_append_printf(text, "calibration %" G_GINT64_FORMAT " %s %a %s %s %d %s\n", c->id, c->kind, c->at_unix_s,
                           c->source, c->sha256, (int)c->origin, c->text);
  }
}

char *aw_test_dish_dump(AwRecord *record)
{
  GError *error = NULL;
  GString *text = g_string_new(NULL);
  g_autoptr(GPtrArray) frames = aw_record_frames(record, &error);
  AwPixelMap map;
  g_assert_true(aw_record_pixel_map(record, &map, &error));
  g_autofree char *name = aw_record_fact(record, "name", &error);
  g_assert_no_error(error);
  g_string_append_printf(text, "%s %a %a %a %a %d %a\n", name, map.um_per_px.xx, map.um_per_px.xy, map.um_per_px.yx,
                         map.um_per_px.yy, (int)map.origin, map.rms_um);
  for (guint i = 0; i < frames->len; i++) {
    const AwFrame *f = g_ptr_array_index(frames, i);
    g_string_append_printf(text, "frame %s %d %d %dx%d %a %a %a %a %a %" G_GINT64_FORMAT " %s %zu\n", f->file, f->page,
                           f->channel, f->width_px, f->height_px, f->full_scale, f->stage.x_um, f->stage.y_um,
                           f->pixel_um, isnan(f->taken_at_unix_s) ? -1 : f->taken_at_unix_s, f->size_bytes, f->sha256,
                           f->overview ? g_bytes_get_size(f->overview) : 0);
  }
  dump_nuclei(record, text);
  dump_choices(record, text);
  dump_calibrations(record, text);
  return g_string_free(text, FALSE);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Writes the sample dish, checks that it still comes out the same, or writes large scans for load tests. */
#include <stdlib.h>

#include "base/error.h"
#include "base/limits.h"
#include "base/output.h"
#include "base/pool.h"
#include "calibration.h"
#include "image/reader.h"
#include "image/writer.h"
#include "large.h"
#include "tables.h"

typedef struct {
  gboolean check, outlines;
  int n_stress, bigtiff_side, per_frame, side, n_threads;
  char *channel;
  char **rest;
} Options;

typedef struct {
  const SampleDish *dish;
  AwImage *image[SAMPLE_N_FRAMES];
} Drawing;

static gboolean draw_item(gsize item, guint worker, gpointer data, GError **error)
{
  (void)worker;
  Drawing *drawing = data;
  const SampleDish *dish = drawing->dish;
  drawing->image[item] = aw_render_frame(dish->truths, &dish->frame[item].view, &dish->channel->camera, error);
  return drawing->image[item] != NULL;
}

static void drawing_clear(Drawing *drawing)
{
  for (int i = 0; i < SAMPLE_N_FRAMES; i++)
    aw_image_free(drawing->image[i]);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Drawing, drawing_clear)

static gboolean differs(const char *path, const char *how, GError **error)
{
  g_set_error(error, AW_ERROR, AW_ERROR_VERIFY, "%s: %s", path, how);
  return FALSE;
}

/* Compares the pixels, not the file's bytes, which depend on the version of the compressor. */
static gboolean same_image(const AwImage *image, const char *path, GError **error)
{
  g_autoptr(AwImage) there = aw_image_load(path, 0, -1, NULL, error);
  if (!there)
    return FALSE;
  if (there->width_px != image->width_px || there->height_px != image->height_px || there->sample != image->sample)
    return differs(path, "has another size or pixel form than the one drawn now", error);
  for (int y = 0; y < image->height_px; y++)
    for (int x = 0; x < image->width_px; x++)
      if (aw_image_value(image, x, y) != aw_image_value(there, x, y)) {
        g_autofree char *how = g_strdup_printf("pixel (%d, %d) is %.0f, drawn now %.0f", x, y,
                                               aw_image_value(there, x, y), aw_image_value(image, x, y));
        return differs(path, how, error);
      }
  return TRUE;
}

static gboolean same_text(const char *text, const char *path, GError **error)
{
  g_autofree char *there = NULL;
  gsize n = 0;
  if (!aw_input_read(path, G_MAXINT32, &there, &n, error))
    return FALSE;
  return (n == strlen(text) && !memcmp(there, text, n)) || differs(path, "is not what is written now", error);
}

static gboolean put_text(const Options *o, const char *name, const char *text, GError **error)
{
  g_autofree char *path = g_build_filename(o->rest[0], name, NULL);
  return o->check ? same_text(text, path, error) : aw_output_write(path, text, strlen(text), error);
}

static gboolean put_tables(const Options *o, const Drawing *drawing, GError **error)
{
  g_autofree char *scan = sample_scan_table(drawing->dish);
  g_autofree char *truth = sample_truth_table(drawing->dish, drawing->image);
  g_autofree char *views = sample_views_table(drawing->dish);
  g_autofree char *outlines = o->outlines ? sample_outline_table(drawing->dish->truths) : NULL;
  return put_text(o, "scan.csv", scan, error) && put_text(o, "truth.csv", truth, error) &&
         put_text(o, "truth_views.csv", views, error) &&
         (!outlines || put_text(o, "truth_outlines.csv", outlines, error));
}

static gboolean put_calibrations(const Options *o, GError **error)
{
  g_autofree char *folder = g_build_filename(o->rest[0], "calibration", NULL);
  if (!o->check && g_mkdir_with_parents(folder, 0777) != 0)
    return differs(folder, "could not be made", error);
  for (int i = 0; i < SAMPLE_N_CALIBRATIONS; i++) {
    g_autofree char *text = sample_calibration_text(i);
    if (!put_text(o, sample_calibration_name(i), text, error))
      return FALSE;
  }
  return TRUE;
}

static gboolean put_sample(const Options *o, GError **error)
{
  const SampleChannel *channel = sample_channel(o->channel);
  if (!channel) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "no channel is named '%s'; there is 'nuclei'", o->channel);
    return FALSE;
  }
  g_autoptr(SampleDish) dish = sample_dish_new(channel, error);
  if (!dish)
    return FALSE;
  g_autofree char *frames = g_build_filename(o->rest[0], "frames", NULL);
  if (!o->check && g_mkdir_with_parents(frames, 0777) != 0)
    return differs(frames, "could not be made", error);
  g_auto(Drawing) drawing = { dish, { NULL } };
  if (!aw_pool_run((guint)o->n_threads, SAMPLE_N_FRAMES, draw_item, &drawing, "drawing frames", NULL, error))
    return FALSE;
  for (int i = 0; i < SAMPLE_N_FRAMES; i++) {
    g_autofree char *path = g_build_filename(o->rest[0], dish->frame[i].file, NULL);
    if (!(o->check ? same_image(drawing.image[i], path, error)
                   : aw_image_write_tiff(drawing.image[i], path, SAMPLE_NOMINAL_PIXEL_UM, error)))
      return FALSE;
  }
  return put_tables(o, &drawing, error) && put_calibrations(o, error);
}

static gboolean run(const Options *o, GError **error)
{
  if (!o->rest || !o->rest[0] || o->rest[1]) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "name one folder (with --bigtiff: one file)");
    return FALSE;
  }
  if (o->side < 64 || o->side > 8192 || o->bigtiff_side < 0 || o->bigtiff_side > AW_MAX_SIDE_PX || o->n_stress < 0 ||
      o->n_stress > AW_MAX_FRAMES || o->per_frame < 0 || o->per_frame > 100000) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "out of range: --side 64 to 8192 px, --bigtiff up to %d px, --stress up to %d frames, "
                "--nuclei-per-frame up to 100000",
                AW_MAX_SIDE_PX, AW_MAX_FRAMES);
    return FALSE;
  }
  if (o->bigtiff_side)
    return sample_write_bigtiff(o->rest[0], o->bigtiff_side, o->per_frame, (guint)o->n_threads, error);
  if (o->n_stress)
    return sample_write_stress(o->rest[0], o->n_stress, o->side, o->per_frame, (guint)o->n_threads, error);
  return put_sample(o, error);
}

int main(int argc, char **argv)
{
  Options o = { .per_frame = 1500, .side = 2048 };
  const GOptionEntry entries[] = {
    { "check", 0, 0, G_OPTION_ARG_NONE, &o.check, "compare with what is in DIR instead of writing", NULL },
    { "outlines", 0, 0, G_OPTION_ARG_NONE, &o.outlines, "also truth_outlines.csv, the true outlines", NULL },
    { "channel", 0, 0, G_OPTION_ARG_STRING, &o.channel, "what to draw (nuclei)", "NAME" },
    { "stress", 0, 0, G_OPTION_ARG_INT, &o.n_stress, "a scan of N large frames for load tests", "N" },
    { "nuclei-per-frame", 0, 0, G_OPTION_ARG_INT, &o.per_frame, "or per 2048 x 2048 px of a BigTIFF (1500)", "K" },
    { "side", 0, 0, G_OPTION_ARG_INT, &o.side, "of a frame in px, with --stress (2048)", "PX" },
    { "bigtiff", 0, 0, G_OPTION_ARG_INT, &o.bigtiff_side, "one tiled BigTIFF of SIDE x SIDE px", "SIDE" },
    { "threads", 0, 0, G_OPTION_ARG_INT, &o.n_threads, "0: one per processor", "N" },
    { G_OPTION_REMAINING, 0, 0, G_OPTION_ARG_FILENAME_ARRAY, &o.rest, NULL, "DIR" },
    { NULL, 0, 0, G_OPTION_ARG_NONE, NULL, NULL, NULL },
  };
  g_autoptr(GOptionContext) context = g_option_context_new("- draw the sample dish");
  g_option_context_add_main_entries(context, entries, NULL);
  g_autoptr(GError) error = NULL;
  gboolean ok = g_option_context_parse(context, &argc, &argv, &error);
  if (!o.channel)
    o.channel = g_strdup("nuclei");
  ok = ok && run(&o, &error);
  if (!ok)
    g_printerr("generate-sample: %s\n", error->message);
  g_free(o.channel);
  g_strfreev(o.rest);
  return ok ? EXIT_SUCCESS : EXIT_FAILURE;
}

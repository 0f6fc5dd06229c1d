/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/segment.h"

#include <string.h>

#include "cli/cli.h"
#include "cli/text.h"
#include "steps/loose.h"

/* What the command line can say, for dishes and loose images alike. */
typedef struct {
  char *labels, *table, *width, *sensitivity, *splitting, *pixel, *map;
  gboolean gated;
  gint page, channel;
} Options;

static void options_clear(Options *o)
{
  g_free(o->labels);
  g_free(o->table);
  g_free(o->width);
  g_free(o->sensitivity);
  g_free(o->splitting);
  g_free(o->pixel);
  g_free(o->map);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Options, options_clear)

static gboolean optional_number(const char *name, const char *text, double min, double max, double *value)
{
  return !text || cli_parse_number("segment", name, text, min, max, value);
}

static void report_lost(const AwSegmentSummary *s)
{
  if (s->n_kept)
    cli_print("%" G_GSIZE_FORMAT " decisions were kept on nuclei that are the same.\n", s->n_kept);
  if (!s->lost->len)
    return;
  cli_print("%u decisions could not be kept; the nuclei had the numbers", s->lost->len);
  for (guint i = 0; i < s->lost->len; i++)
    cli_print("%s %" G_GINT64_FORMAT, i ? "," : "", g_array_index(s->lost, gint64, i));
  cli_print(".\n");
}

static void report(const char *path, const AwSegmentSummary *s)
{
  g_autofree char *width = cli_number(s->nucleus_width_um, 1), *rms = cli_number(s->overlap_rms_um, 2);
  cli_print("%" G_GSIZE_FORMAT " nuclei, typically %s um wide; %" G_GSIZE_FORMAT " cut by the border, %" G_GSIZE_FORMAT
            " touching, %" G_GSIZE_FORMAT " saturated, %" G_GSIZE_FORMAT " out of focus.\n",
            s->n_nuclei, width, s->n_border, s->n_touching, s->n_saturated, s->n_defocused);
  if (s->n_overlap_pairs)
    cli_print("%" G_GSIZE_FORMAT " nuclei were seen in more than one frame; the views differ by %s um rms per axis.\n",
              s->n_overlap_pairs, rms);
  cli_print("Pixel map (%s): %s\n", aw_origin_name(s->map.origin), s->map_note);
  report_lost(s);
  cli_print("Next: aimwell choose %s\n", path);
}

static int segment_dish(const CliCommon *common, const Options *o)
{
  if (o->labels || o->table || o->gated || o->pixel || o->page || o->channel != -1)
    return cli_usage("segment", "--labels, --table, --gated, --pixel-um, --page and --channel are for loose images");
  AwSegmentStep step = { 0 };
  AwMatrix map;
  if (!optional_number("--nucleus-width-um", o->width, 0.5, 1000, &step.nucleus_width_um) ||
      !optional_number("--sensitivity", o->sensitivity, -1, 1, &step.sensitivity) ||
      !optional_number("--splitting", o->splitting, -1, 1, &step.splitting) ||
      (o->map && !cli_parse_matrix("segment", "--pixel-map", o->map, &map)))
    return CLI_USAGE;
  step.pixel_map = o->map ? &map : NULL;
  AwStepContext context;
  g_auto(AwSegmentSummary) summary = { 0 };
  GError *error = NULL;
  cli_context_init(&context, common);
  gboolean ok = aw_step_segment(common->words[0], &step, &context, &summary, &error);
  cli_context_finish(&context);
  if (!ok)
    return cli_fail("segment", error);
  report(common->words[0], &summary);
  return CLI_OK;
}

/* The width handle is in um where the pixel size is given. */
static gboolean loose_handles(const Options *o, AwLooseSettings *loose)
{
  double width = 0;
  if (!optional_number("--pixel-um", o->pixel, 0.001, 1000, &loose->pixel_um) ||
      !optional_number("--nucleus-width-um", o->width, 0.5, 1000, &width) ||
      !optional_number("--sensitivity", o->sensitivity, -1, 1, &loose->segment.sensitivity) ||
      !optional_number("--splitting", o->splitting, -1, 1, &loose->segment.splitting))
    return FALSE;
  if (width > 0 && loose->pixel_um <= 0) {
    cli_usage("segment", "--nucleus-width-um needs --pixel-um for loose images");
    return FALSE;
  }
  loose->segment.nucleus_width_px = width > 0 ? width / loose->pixel_um : 0;
  return TRUE;
}

static int segment_loose(const CliCommon *common, const Options *o)
{
  AwLooseSettings loose = { .images = (const char *const *)common->words,
                            .page = o->page,
                            .channel = o->channel,
                            .labels_folder = o->labels,
                            .table = o->table,
                            .gated = o->gated };
  if (!o->labels && !o->table)
    return cli_usage("segment", "loose images need --labels DIR or --table FILE.csv (or both)");
  if (o->map)
    return cli_usage("segment", "--pixel-map is for dishes; loose images take --pixel-um");
  if (!loose_handles(o, &loose))
    return CLI_USAGE;
  AwStepContext context;
  gsize n_nuclei = 0;
  GError *error = NULL;
  cli_context_init(&context, common);
  gboolean ok = aw_step_segment_loose(&loose, &context, &n_nuclei, &error);
  cli_context_finish(&context);
  if (!ok)
    return cli_fail("segment", error);
  cli_print("%" G_GSIZE_FORMAT " nuclei in %u images.\n", n_nuclei, common->n_words);
  return CLI_OK;
}

static int segment_anything(const CliCommon *common, const Options *o)
{
  if (common->n_words < 1)
    return cli_usage("segment", "NAME.dish or an image is missing");
  if (common->n_words == 1 && g_str_has_suffix(common->words[0], ".dish"))
    return segment_dish(common, o);
  for (guint i = 0; i < common->n_words; i++)
    if (g_str_has_suffix(common->words[i], ".dish"))
      return cli_usage("segment", "\"%s\" is a dish record; segment one dish at a time", common->words[i]);
  return segment_loose(common, o);
}

int cli_segment(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_auto(Options) o = { .channel = -1 };
  const GOptionEntry own[] = {
    { "labels", 0, 0, G_OPTION_ARG_FILENAME, &o.labels, "Loose images: write DIR/<image name>.tif labels", "DIR" },
    { "table", 0, 0, G_OPTION_ARG_FILENAME, &o.table, "Loose images: write one table of all nuclei", "FILE.csv" },
    { "gated", 0, 0, G_OPTION_ARG_NONE, &o.gated, "Loose images: only nuclei inside the default gates", NULL },
    { "pixel-um", 0, 0, G_OPTION_ARG_STRING, &o.pixel, "Loose images: pixel size, for tables in um", "UM" },
    { "page", 0, 0, G_OPTION_ARG_INT, &o.page, "Loose images: page of the file, from 0", "K" },
    { "channel", 0, 0, G_OPTION_ARG_INT, &o.channel, "Loose images: channel, from 0", "K" },
    { "nucleus-width-um", 0, 0, G_OPTION_ARG_STRING, &o.width, "Typical nucleus diameter (default: estimated)", "UM" },
    { "sensitivity", 0, 0, G_OPTION_ARG_STRING, &o.sensitivity, "-1 to 1: above 0 finds dimmer nuclei", "S" },
    { "splitting", 0, 0, G_OPTION_ARG_STRING, &o.splitting, "-1 to 1: above 0 parts touching nuclei more readily",
      "S" },
    { "pixel-map", 0, 0, G_OPTION_ARG_STRING, &o.map, "Dish: enter the map A, um per px, instead of fitting it",
      "AXX,AXY,AYX,AYY" },
    { 0 }
  };
  if (!cli_parse(argc, argv, "NAME.dish | IMAGE… [--labels DIR] [--table FILE.csv] [--gated]",
                 "Finds the nuclei of a dish, or of loose images, by local thresholds and watershed.", own,
                 CLI_WHO | CLI_THREADS, &common))
    return CLI_USAGE;
  return segment_anything(&common, &o);
}

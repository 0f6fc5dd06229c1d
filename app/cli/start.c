/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/start.h"

#include "cli/cli.h"
#include "cli/text.h"

static void report(const char *path, const AwStartSummary *s)
{
  g_autofree char *pixel = cli_number(s->pixel_um, 4);
  g_autofree char *width = cli_length(s->width_um), *height = cli_length(s->height_um);
  cli_print("%s: %" G_GSIZE_FORMAT " frames, the first %d x %d px", path, s->n_frames, s->width_px, s->height_px);
  if (s->pixel_um > 0)
    cli_print(", %s um per pixel; the scan spans %s x %s.\n", pixel, width, height);
  else
    cli_print("; no pixel size known.\n");
  cli_print("Next: aimwell segment %s\n", path);
}

int cli_start(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_autofree char *table = NULL, *pixel_text = NULL;
  AwStartSettings settings = { .channel = -1 };
  const GOptionEntry own[] = {
    { "scan", 0, 0, G_OPTION_ARG_FILENAME, &table, "Scan table: file,stage_x_um,stage_y_um and more", "TABLE.csv" },
    { "pixel-um", 0, 0, G_OPTION_ARG_STRING, &pixel_text, "Pixel size where the files do not say", "UM" },
    { "channel", 0, 0, G_OPTION_ARG_INT, &settings.channel, "Channel to use, from 0, where a file has several", "K" },
    { 0 }
  };
  if (!cli_parse(argc, argv, "NAME.dish --scan TABLE.csv | NAME.dish IMAGE…",
                 "Makes a dish record from a scan table, or from images that carry OME positions. Never overwrites.",
                 own, CLI_WHO | CLI_THREADS, &common))
    return CLI_USAGE;
  if (common.n_words < 1)
    return cli_usage("start", "NAME.dish is missing");
  if ((table != NULL) == (common.n_words > 1))
    return cli_usage("start", "give either --scan TABLE.csv or images");
  if (pixel_text && !cli_parse_number("start", "--pixel-um", pixel_text, 0.001, 1000, &settings.pixel_um))
    return CLI_USAGE;
  settings.scan_table = table;
  settings.images = table ? NULL : (const char *const *)common.words + 1;
  AwStepContext context;
  AwStartSummary summary;
  GError *error = NULL;
  cli_context_init(&context, &common);
  gboolean ok = aw_step_start(common.words[0], &settings, &context, &summary, &error);
  cli_context_finish(&context);
  if (!ok)
    return cli_fail("start", error);
  report(common.words[0], &summary);
  return CLI_OK;
}

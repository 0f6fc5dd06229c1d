/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/map.h"

#include "cli/cli.h"
#include "steps/view.h"

int cli_map(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_autofree char *out = NULL;
  gint width = 2400, height = 1800;
  const GOptionEntry own[] = { { "output", 'o', 0, G_OPTION_ARG_FILENAME, &out,
                                 "Where the map goes; .png, .svg or .pdf", "FILE.png" },
                               { "width", 0, 0, G_OPTION_ARG_INT, &width, "Width in pixels (default 2400)", "PX" },
                               { "height", 0, 0, G_OPTION_ARG_INT, &height, "Height in pixels (default 1800)", "PX" },
                               { 0 } };
  if (!cli_parse(argc, argv, "NAME.dish -o FILE.png", "Draws frames, nuclei by state, and the tour.", own,
                 CLI_NO_SHARED, &common) ||
      !cli_need_words("map", &common, 1, "NAME.dish"))
    return CLI_USAGE;
  if (!out)
    return cli_usage("map", "-o FILE.png is missing");
  if (width < 400 || width > 20000 || height < 300 || height > 20000)
    return cli_usage("map", "a map of %d x %d px is outside 400 x 300 to 20000 x 20000", width, height);
  GError *error = NULL;
  g_autoptr(AwDishView) view = aw_step_view(common.words[0], &error);
  if (!view)
    return cli_fail("map", error);
  AwMapContent content = { .title = view->name,
                           .subtitle = view->summary,
                           .frames = view->frames,
                           .map = view->map,
                           .nuclei = view->nuclei,
                           .state = view->state,
                           .tour = (const gint64 *)(const void *)view->tour->data,
                           .n_tour = view->tour->len,
                           .notes = (const char *const *)view->notes->pdata };
  if (!aw_map_write(&content, out, width, height, &error))
    return cli_fail("map", error);
  return CLI_OK;
}

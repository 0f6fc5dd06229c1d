/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/export.h"

#include <stdio.h>

#include "cli/cli.h"

int cli_export(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_autofree char *out = NULL, *layout = NULL;
  const GOptionEntry own[] = { { "output", 'o', 0, G_OPTION_ARG_FILENAME, &out, "Where the target list goes", "FILE" },
                               { "layout", 0, 0, G_OPTION_ARG_FILENAME, &layout, "csv (default), tsv, or a layout file",
                                 "NAME|FILE" },
                               { 0 } };
  if (!cli_parse(argc, argv, "NAME.dish -o FILE [--layout NAME|FILE]",
                 "Writes the target list, reads it back and compares every position with the plan.", own, CLI_WHO,
                 &common) ||
      !cli_need_words("export", &common, 1, "NAME.dish"))
    return CLI_USAGE;
  if (!out)
    return cli_usage("export", "-o FILE is missing");
  AwStepContext context;
  AwExportSummary summary;
  GError *error = NULL;
  cli_context_init(&context, &common);
  gboolean ok = aw_step_export(common.words[0], out, layout ? layout : "csv", &context, &summary, &error);
  cli_context_finish(&context);
  if (!ok)
    return cli_fail("export", error);
  /* The list itself may be on stdout, so this goes to stderr. */
  fprintf(stderr, "%" G_GSIZE_FORMAT " targets written to %s, %s. Plan %.12s…\n", summary.n_targets, out,
          summary.checked_in_memory ? "checked in memory only (a pipe or device cannot be read back)"
                                    : "read back and compared with the plan",
          summary.plan_hash);
  return CLI_OK;
}

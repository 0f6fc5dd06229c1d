/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/cli.h"

static gboolean take_back(const char *path, const char *who, gboolean redo, char **what, GError **error)
{
  g_autoptr(AwRecord) record = aw_record_open(path, AW_RECORD_WRITE, error);
  if (!record)
    return FALSE;
  return redo ? aw_record_redo(record, who, what, error) : aw_record_undo(record, who, what, error);
}

int cli_undo(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_autofree char *what = NULL;
  gboolean redo = FALSE;
  const GOptionEntry own[] = { { "redo", 0, 0, G_OPTION_ARG_NONE, &redo, "Do the newest undone action again", NULL },
                               { 0 } };
  if (!cli_parse(argc, argv, "NAME.dish [--redo]", "Takes the newest action back, as a new journalled action.", own,
                 CLI_WHO, &common) ||
      !cli_need_words("undo", &common, 1, "NAME.dish"))
    return CLI_USAGE;
  GError *error = NULL;
  if (!take_back(common.words[0], common.who ? common.who : g_get_user_name(), redo, &what, &error))
    return cli_fail("undo", error);
  cli_print("%s: %s\n", redo ? "Done again" : "Taken back", what);
  return CLI_OK;
}

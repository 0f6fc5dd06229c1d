/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"
#include "cli/cli.h"
#include "cli/text.h"

static void print_json(const AwJournalEntry *e, const char *when, gboolean last)
{
  g_autoptr(GString) json = g_string_new("{");
  cli_json_int(json, "id", e->id);
  cli_json_text(json, "at", when);
  cli_json_text(json, "who", e->operator_name);
  cli_json_text(json, "action", e->action);
  cli_print("  %s, \"undone\": %s}%s\n", json->str, e->undone ? "true" : "false", last ? "" : ",");
}

static void print_entry(const AwJournalEntry *e, const char *when)
{
  cli_print("%4" G_GINT64_FORMAT "  %s  %s  %s%s\n", e->id, when, e->operator_name, e->action,
            e->undone ? "  (undone)" : "");
}

static void print_all(GPtrArray *entries, gboolean json)
{
  if (json)
    cli_print("[\n");
  for (guint i = 0; i < entries->len; i++) {
    const AwJournalEntry *e = entries->pdata[i];
    g_autofree char *when = aw_text_from_time(e->at_unix_s);
    if (json)
      print_json(e, when, i + 1 == entries->len);
    else
      print_entry(e, when);
  }
  if (json)
    cli_print("]\n");
}

int cli_journal(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  gboolean json = FALSE;
  const GOptionEntry own[] = { { "json", 0, 0, G_OPTION_ARG_NONE, &json, "Print as JSON", NULL }, { 0 } };
  if (!cli_parse(argc, argv, "NAME.dish [--json]", "Lists who did what to a dish, and when, oldest first.", own,
                 CLI_NO_SHARED, &common) ||
      !cli_need_words("journal", &common, 1, "NAME.dish"))
    return CLI_USAGE;
  GError *error = NULL;
  g_autoptr(AwRecord) record = aw_record_open(common.words[0], AW_RECORD_READ, &error);
  g_autoptr(GPtrArray) entries = record ? aw_record_journal(record, &error) : NULL;
  if (!entries)
    return cli_fail("journal", error);
  print_all(entries, json);
  return CLI_OK;
}

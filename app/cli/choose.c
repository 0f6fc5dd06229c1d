/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/choose.h"

#include "cli/cli.h"

static void report(const char *path, const AwChooseSummary *s)
{
  for (guint i = 0; s->gate_lines && i < s->gate_lines->len; i++)
    cli_print("  %s\n", (const char *)s->gate_lines->pdata[i]);
  cli_print("%" G_GSIZE_FORMAT " nuclei: %" G_GSIZE_FORMAT " proposed, %" G_GSIZE_FORMAT " accepted, %" G_GSIZE_FORMAT
            " rejected.\n",
            s->n_nuclei, s->n_proposed, s->n_accepted, s->n_rejected);
  if (s->n_accepted)
    cli_print("Next: aimwell route %s\n", path);
  else if (s->n_proposed)
    cli_print("Next: look at them (aimwell map %s -o map.png), then aimwell choose %s --accept proposed\n", path, path);
}

int cli_choose(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_auto(GStrv) gates = NULL;
  g_autofree char *accept = NULL, *reject = NULL, *forget = NULL;
  AwChooseSettings settings = { 0 };
  gint64 n_particles = G_MININT64; /* not given */
  const GOptionEntry own[] = {
    { "gate", 0, 0, G_OPTION_ARG_STRING_ARRAY, &gates, "Range on a feature; either end may be left open; may repeat",
      "FEATURE=MIN..MAX" },
    { "no-default-gates", 0, 0, G_OPTION_ARG_NONE, &settings.no_default_gates, "Only the gates given", NULL },
    { "accept", 0, 0, G_OPTION_ARG_STRING, &accept, "Accept nuclei: numbers, ranges, or the word proposed", "ID…" },
    { "reject", 0, 0, G_OPTION_ARG_STRING, &reject, "Reject nuclei", "ID…" },
    { "forget", 0, 0, G_OPTION_ARG_STRING, &forget, "Forget what was decided by hand about nuclei", "ID…" },
    { "particles", 0, 0, G_OPTION_ARG_INT64, &n_particles, "Particles for every target (default 1)", "N" },
    { 0 }
  };
  const char *const lists[] = { "--accept", "--reject", "--forget" };
  for (gsize i = 0; i < G_N_ELEMENTS(lists); i++)
    argc = cli_join_ids(argc, argv, lists[i]);
  if (!cli_parse(argc, argv, "NAME.dish [--gate FEATURE=MIN..MAX]… [--accept ID…] [--reject ID…]",
                 "Proposes every nucleus inside all gates; takes decisions by hand.", own, CLI_WHO, &common) ||
      !cli_need_words("choose", &common, 1, "NAME.dish"))
    return CLI_USAGE;
  settings.gates = (const char *const *)gates;
  settings.accept = accept;
  settings.reject = reject;
  settings.forget = forget;
  settings.n_particles = n_particles == G_MININT64 ? NULL : &n_particles;
  settings.propose = gates || settings.no_default_gates || !(accept || reject || forget || settings.n_particles);
  AwStepContext context;
  g_auto(AwChooseSummary) summary = { 0 };
  GError *error = NULL;
  cli_context_init(&context, &common);
  gboolean ok = aw_step_choose(common.words[0], &settings, &context, &summary, &error);
  cli_context_finish(&context);
  if (!ok)
    return cli_fail("choose", error);
  report(common.words[0], &summary);
  return CLI_OK;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <cairo.h>
#include <glib.h>
#include <locale.h>
#include <pango/pango.h>
#include <stdio.h>
#include <string.h>

#include "base/limits.h"
#include "base/output.h"
#include "cli/cli.h"
#include "steps/versions.h"

static const CliCommand commands[] = {
  { "start", "make a dish record from a scan", cli_start },
  { "segment", "find the nuclei of a dish, or of loose images", cli_segment },
  { "calibrate", "say where the beam is, how wide, how far off it may be", cli_calibrate },
  { "choose", "propose targets by gates, accept and reject", cli_choose },
  { "route", "order the targets, or any points, to save stage travel", cli_route },
  { "export", "write the verified target list", cli_export },
  { "map", "draw the dish", cli_map },
  { "status", "show a dish at a glance, check its images", cli_status },
  { "undo", "take the newest action back", cli_undo },
  { "journal", "list who did what, and when", cli_journal },
};

static void print_help(void)
{
  cli_print("Usage: aimwell COMMAND [NAME.dish] [OPTION…]\n\n"
            "From a fluorescence dish scan to a verified target list for a charged-particle microbeam.\n\n");
  for (gsize i = 0; i < G_N_ELEMENTS(commands); i++)
    cli_print("  %-9s %s\n", commands[i].name, commands[i].summary);
  cli_print("\n`aimwell COMMAND --help` tells each command's options; `aimwell --version` the versions in use.\n"
            "Exit status: 0 done, 1 failed (nothing was changed), 2 wrong usage.\n");
}

static int print_version(void)
{
  g_autofree char *core = aw_versions_text();
  cli_print("%scairo %s, pango %s\n", core, cairo_version_string(), pango_version_string());
  return CLI_OK;
}

static int run(int argc, char **argv)
{
  if (argc < 2) {
    fprintf(stderr, "aimwell: a command is missing; `aimwell --help` lists them\n");
    return CLI_USAGE;
  }
  if (strcmp(argv[1], "--version") == 0)
    return print_version();
  if (strcmp(argv[1], "--help") == 0 || strcmp(argv[1], "-h") == 0 || strcmp(argv[1], "help") == 0) {
    print_help();
    return CLI_OK;
  }
  for (gsize i = 0; i < G_N_ELEMENTS(commands); i++) {
    if (strcmp(argv[1], commands[i].name) != 0)
      continue;
    if (argc > 2 && strcmp(argv[2], "--version") == 0)
      return print_version();
    return commands[i].run(argc - 1, argv + 1);
  }
  fprintf(stderr, "aimwell: there is no command \"%s\"; `aimwell --help` lists them\n", argv[1]);
  return CLI_USAGE;
}

int main(int argc, char **argv)
{
  setlocale(LC_ALL, "");
  aw_output_prepare_process();
  aw_memory_prepare_process();
  setlocale(LC_MESSAGES, "C"); /* the libraries' words match ours */
  return cli_finish_stdout(run(argc, argv));
}

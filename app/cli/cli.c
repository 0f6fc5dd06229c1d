/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/cli.h"

#include <errno.h>
#include <signal.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "base/error.h"
#include "base/limits.h"
#include "base/text.h"

static AwProgress progress; /* reached by the signal handler */
static gboolean line_shown;

void cli_common_clear(CliCommon *common)
{
  g_clear_pointer(&common->who, g_free);
  g_clear_pointer(&common->words, g_strfreev);
}

/* The words after the options; a lone "--" only ends the options. */
static void take_words(int argc, char **argv, CliCommon *common)
{
  int first = argc > 1 && strcmp(argv[1], "--") == 0 ? 2 : 1;
  common->n_words = (guint)MAX(0, argc - first);
  common->words = g_new0(char *, common->n_words + 1);
  for (guint i = 0; i < common->n_words; i++)
    common->words[i] = g_strdup(argv[first + (int)i]);
}

static gboolean check_common(const char *command, const CliCommon *common)
{
  if (common->n_threads < 0 || common->n_threads > AW_MAX_THREADS) {
    cli_usage(command, "--threads %d is outside 0 to %d", common->n_threads, AW_MAX_THREADS);
    return FALSE;
  }
  if (common->who && !*common->who) {
    cli_usage(command, "--who needs a name");
    return FALSE;
  }
  return TRUE;
}

gboolean cli_parse(int argc, char **argv, const char *usage, const char *summary, const GOptionEntry *own, guint shared,
                   CliCommon *common)
{
  const GOptionEntry who[] = {
    { "who", 0, 0, G_OPTION_ARG_STRING, &common->who, "Operator for the journal (default: the login)", "NAME" }, { 0 }
  };
  const GOptionEntry threads[] = { { "threads", 0, 0, G_OPTION_ARG_INT, &common->n_threads,
                                     "Threads to use (default 0: one per processor)", "N" },
                                   { 0 } };
  g_autoptr(GOptionContext) context = g_option_context_new(usage);
  g_autoptr(GError) error = NULL;
  const char *command = argv[0];
  g_autofree char *shown = g_strconcat("aimwell ", command, NULL);
  g_option_context_set_summary(context, summary);
  if (own)
    g_option_context_add_main_entries(context, own, NULL);
  if (shared & CLI_WHO)
    g_option_context_add_main_entries(context, who, NULL);
  if (shared & CLI_THREADS)
    g_option_context_add_main_entries(context, threads, NULL);
  g_set_prgname(shown);
  if (!g_option_context_parse(context, &argc, &argv, &error)) {
    cli_usage(command, "%s", error->message);
    return FALSE;
  }
  take_words(argc, argv, common);
  return check_common(command, common);
}

static void stop_on_signal(int number)
{
  (void)number;
  aw_progress_cancel(&progress);
}

static void show_progress(const char *what, double done_frac, gpointer data)
{
  (void)data;
  fprintf(stderr, "\r\033[K%s %d %%", what, (int)(100.0 * done_frac));
  fflush(stderr);
  line_shown = TRUE;
}

static void end_progress_line(void)
{
  if (line_shown)
    fputs("\r\033[K", stderr);
  line_shown = FALSE;
}

void cli_context_init(AwStepContext *context, const CliCommon *common)
{
  struct sigaction action = { .sa_handler = stop_on_signal, .sa_flags = SA_RESTART };
  sigaction(SIGINT, &action, NULL);
  sigaction(SIGTERM, &action, NULL);
  sigaction(SIGHUP, &action, NULL);
  if (isatty(STDERR_FILENO))
    progress.report = show_progress;
  *context = (AwStepContext){ .who = common->who ? common->who : g_get_user_name(),
                              .n_threads = (guint)common->n_threads,
                              .progress = &progress,
                              .warnings = g_ptr_array_new_with_free_func(g_free) };
}

void cli_context_finish(AwStepContext *context)
{
  end_progress_line();
  for (guint i = 0; i < context->warnings->len; i++)
    fprintf(stderr, "warning: %s\n", (const char *)context->warnings->pdata[i]);
  g_clear_pointer(&context->warnings, g_ptr_array_unref);
}

int cli_fail(const char *command, GError *error)
{
  end_progress_line();
  fprintf(stderr, "aimwell %s: %s\n", command, error->message);
  g_error_free(error);
  return CLI_FAILED;
}

int cli_usage(const char *command, const char *format, ...)
{
  va_list args;
  va_start(args, format);
  fprintf(stderr, "aimwell %s: ", command);
  vfprintf(stderr, format, args);
  fprintf(stderr, "; `aimwell %s --help` tells more\n", command);
  va_end(args);
  return CLI_USAGE;
}

gboolean cli_need_words(const char *command, const CliCommon *common, guint n, const char *what)
{
  if (common->n_words == n)
    return TRUE;
  if (common->n_words < n)
    cli_usage(command, "%s is missing", what);
  else
    cli_usage(command, "\"%s\" is one word too many", common->words[n]);
  return FALSE;
}

void cli_print(const char *format, ...)
{
  va_list args;
  va_start(args, format);
  vfprintf(stdout, format, args);
  va_end(args);
}

int cli_finish_stdout(int status)
{
  if (fflush(stdout) == 0 && !ferror(stdout))
    return status;
  fprintf(stderr, "aimwell: standard output could not be written: %s\n", g_strerror(errno));
  return CLI_FAILED;
}

static gboolean is_id_word(const char *word)
{
  if (strcmp(word, "proposed") == 0)
    return TRUE;
  return g_ascii_isdigit(word[0]) && strspn(word, "0123456789,-") == strlen(word);
}

int cli_join_ids(int argc, char **argv, const char *option)
{
  int out = 1;
  for (int i = 1; i < argc; i++) {
    argv[out++] = argv[i];
    if (strcmp(argv[i], option) != 0 || i + 1 >= argc)
      continue;
    g_autoptr(GString) joined = g_string_new(argv[++i]);
    while (i + 1 < argc && is_id_word(argv[i + 1]))
      g_string_append_printf(joined, ",%s", argv[++i]);
    argv[out++] = (char *)(guintptr)g_intern_string(joined->str); /* lives as long as argv */
  }
  argv[out] = NULL;
  return out;
}

gboolean cli_parse_number(const char *command, const char *name, const char *text, double min, double max,
                          double *value)
{
  g_autoptr(GError) error = NULL;
  if (!aw_text_to_double(text, name, value, &error)) {
    cli_usage(command, "%s", error->message);
    return FALSE;
  }
  if (*value >= min && *value <= max)
    return TRUE;
  g_autofree char *low = aw_text_from_double_exact(min), *high = aw_text_from_double_exact(max);
  cli_usage(command, "%s %s is outside %s to %s", name, text, low, high);
  return FALSE;
}

gboolean cli_parse_pair(const char *command, const char *name, const char *text, double *x, double *y)
{
  g_auto(GStrv) parts = g_strsplit(text, ",", -1);
  g_autoptr(GError) error = NULL;
  if (g_strv_length(parts) == 2 && aw_text_to_double(parts[0], name, x, &error) &&
      aw_text_to_double(parts[1], name, y, &error))
    return TRUE;
  cli_usage(command, "%s takes two numbers X,Y in um, not \"%s\"", name, text);
  return FALSE;
}

gboolean cli_parse_matrix(const char *command, const char *name, const char *text, AwMatrix *map)
{
  g_auto(GStrv) part = g_strsplit(text, ",", -1);
  double *const slot[] = { &map->xx, &map->xy, &map->yx, &map->yy };
  if (g_strv_length(part) != 4) {
    cli_usage(command, "%s takes four numbers AXX,AXY,AYX,AYY in um per px, not \"%s\"", name, text);
    return FALSE;
  }
  for (guint i = 0; i < 4; i++)
    if (!cli_parse_number(command, name, part[i], -1000, 1000, slot[i]))
      return FALSE;
  if (fabs(aw_matrix_det(*map)) > 1e-9)
    return TRUE;
  cli_usage(command, "%s %s cannot be inverted", name, text);
  return FALSE;
}

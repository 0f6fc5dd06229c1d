/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_CLI_CLI_H
#define AW_CLI_CLI_H

#include <glib.h>

#include "steps/common.h"

/* Exit status of every command. */
enum { CLI_OK = 0, CLI_FAILED = 1, CLI_USAGE = 2 };

/* One command; `run` gets its own words with argv[0] the command's name and returns the exit status. */
typedef struct {
  const char *name, *summary;
  int (*run)(int argc, char **argv);
} CliCommand;

int cli_start(int argc, char **argv);
int cli_segment(int argc, char **argv);
int cli_calibrate(int argc, char **argv);
int cli_choose(int argc, char **argv);
int cli_route(int argc, char **argv);
int cli_export(int argc, char **argv);
int cli_map(int argc, char **argv);
int cli_status(int argc, char **argv);
int cli_undo(int argc, char **argv);
int cli_journal(int argc, char **argv);

/* What a command parses into besides its own options. */
typedef struct {
  char *who;      /* --who */
  gint n_threads; /* --threads */
  char **words;   /* what is left after the options, NULL-terminated */
  guint n_words;
} CliCommon;

void cli_common_clear(CliCommon *common);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(CliCommon, cli_common_clear)

/* Which of the common options a command has. */
typedef enum { CLI_NO_SHARED = 0, CLI_WHO = 1 << 0, CLI_THREADS = 1 << 1 } CliShared;

/**
 * Parses options by GOption. `usage` follows the command's name in the help ("NAME.dish [--json]"), `summary` is
 * its text. FALSE after a message on stderr; the caller then returns CLI_USAGE.
 */
gboolean cli_parse(int argc, char **argv, const char *usage, const char *summary, const GOptionEntry *own, guint shared,
                   CliCommon *common);

/* A step's context with the terminal's progress line and Ctrl-C wired up. Ends with cli_context_finish. */
void cli_context_init(AwStepContext *context, const CliCommon *common);

/* Prints the warnings; frees what cli_context_init made. */
void cli_context_finish(AwStepContext *context);

/* Prints "aimwell COMMAND: message" on stderr and returns CLI_FAILED; takes `error`. */
int cli_fail(const char *command, GError *error);

/* Prints a usage fault with a hint at --help and returns CLI_USAGE. */
int cli_usage(const char *command, const char *format, ...) G_GNUC_PRINTF(2, 3);

/* Exactly `n` words are left; otherwise prints which was expected (`what`) and gives FALSE. */
gboolean cli_need_words(const char *command, const CliCommon *common, guint n, const char *what);

/* Prints to stdout; what is lost there is found by cli_finish_stdout. */
void cli_print(const char *format, ...) G_GNUC_PRINTF(1, 2);

/* Flushes stdout; CLI_FAILED with a message when some of it was lost, otherwise `status`. */
int cli_finish_stdout(int status);

/**
 * Joins the id words that follow `option` into one comma-separated value, so that "--accept 3 5 7-9" reads like
 * "--accept 3,5,7-9". Works on argv in place and returns the new argc.
 */
int cli_join_ids(int argc, char **argv, const char *option);

/* A number of option `name` within min ... max; FALSE after a message. */
gboolean cli_parse_number(const char *command, const char *name, const char *text, double min, double max,
                          double *value);

/* "XX,XY,YX,YY" of option `name`, um per px, into a matrix that can be inverted; FALSE after a message. */
gboolean cli_parse_matrix(const char *command, const char *name, const char *text, AwMatrix *map);

/* "X,Y" of option `name` into two numbers; FALSE after a message. */
gboolean cli_parse_pair(const char *command, const char *name, const char *text, double *x, double *y);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Every system call that reads, writes, syncs, locks or names files is in turn made to fail, or to kill the process,
 * while it works on a record (fault injection of strace). Afterwards the record opens, passes its check and holds
 * either the state before or the state after the action; after, whenever the process said that it was done. Prints TAP.
 */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "record/record.h"
#include "support/check.h"
#include "support/dish.h"

#define N_NUCLEI 400
#define REFUSED 3    /* exit status of a victim that met an error and said so */
#define NO_START 127 /* exit status when the fault met the dynamic loader, before our first line */

static const char *const actions[] = { "create", "segment", "undo" };
/* A call and what becomes of it, by strace's names. KILL ends the process in that call. */
static const struct {
  const char *fault;
  gboolean create_only;
} faults[] = { { "pwrite64:error=ENOSPC", FALSE }, { "pwrite64:error=EIO", FALSE },
               { "pwrite64:signal=KILL", FALSE },  { "fdatasync:error=EIO", FALSE },
               { "fdatasync:signal=KILL", FALSE }, { "ftruncate:error=EIO", FALSE },
               { "unlink:error=EIO", FALSE },      { "unlink:signal=KILL", FALSE },
               { "openat:error=EACCES", FALSE },   { "pread64:error=EIO", FALSE },
               { "fcntl:error=EAGAIN", FALSE },    { "fsync:error=EIO", TRUE },
               { "renameat2:error=EIO", TRUE },    { "renameat2:signal=KILL", TRUE },
               { "renameat2:error=EINVAL", TRUE } /* a file system that cannot do it: a link instead */ };

/* --- the process that is hurt --- */

static gboolean segment(AwRecord *record)
{
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(N_NUCLEI, 1, 3);
  return aw_record_begin(record, "ada", NULL) && aw_record_set_nuclei(record, nuclei, NULL) &&
         aw_record_commit(record, "segment", NULL);
}

static gboolean create(const char *path)
{
  const AwPixelMap map = { { 0.65, 0, 0, 0.65 }, AW_ORIGIN_ASSUMED, 0 };
  g_autoptr(GPtrArray) frames = aw_test_frames(3);
  g_autoptr(AwRecord) record = aw_record_create(path, NULL);
  return record && aw_record_begin(record, "ada", NULL) && aw_record_set_frames(record, frames, NULL) &&
         aw_record_set_fact(record, "name", "dish", NULL) && aw_record_set_pixel_map(record, &map, NULL) &&
         aw_record_commit(record, "start", NULL);
}

static int be_victim(const char *action, const char *path)
{
  if (g_str_equal(action, "create"))
    return create(path) ? 0 : REFUSED;
  g_autoptr(AwRecord) record = aw_record_open(path, AW_RECORD_WRITE, NULL);
  if (!record)
    return REFUSED;
  return (g_str_equal(action, "undo") ? aw_record_undo(record, "ada", NULL, NULL) : segment(record)) ? 0 : REFUSED;
}

/* --- the process that looks --- */

typedef struct {
  const char *self, *action, *fault;
  char *folder, *path, *log, *reason;
} Trial;

/* The record before the action: none, three frames, or three frames and nuclei. */
static void prepare(const Trial *trial)
{
  if (g_str_equal(trial->action, "create"))
    return;
  AwRecord *record = aw_test_dish_new(trial->folder);
  if (g_str_equal(trial->action, "undo"))
    segment(record);
  aw_record_free(record);
}

/* Runs the victim with the nth call of the fault's kind failing; its exit status, -1 when it was killed. *hit: there
 * was an nth. */
static int hurt(const Trial *trial, int nth, gboolean *hit)
{
  g_autofree char *inject = g_strdup_printf("inject=%s:when=%d", trial->fault, nth);
  g_autofree char *call = g_strndup(trial->fault, strcspn(trial->fault, ":"));
  g_autofree char *trace = g_strconcat("trace=", call, NULL);
  g_autofree char *log = NULL;
  const char *argv[] = { "strace", "-f",   "-qq",       "-o",          trial->log,  "-e", trace,
                         "-e",     inject, trial->self, trial->action, trial->path, NULL };
  int status = 0;
  if (!g_spawn_sync(NULL, (char **)(gpointer)argv, NULL, G_SPAWN_SEARCH_PATH | G_SPAWN_STDERR_TO_DEV_NULL, NULL, NULL,
                    NULL, NULL, &status, NULL) ||
      !g_file_get_contents(trial->log, &log, NULL, NULL))
    return -1;
  *hit = strstr(log, "(INJECTED)") || strstr(log, "killed by SIGKILL");
  return WIFEXITED(status) ? WEXITSTATUS(status) : -1;
}

static gboolean is_after(const char *action, guint n_nuclei)
{
  return g_str_equal(action, "segment") ? n_nuclei == N_NUCLEI : n_nuclei == 0;
}

static gboolean is_before(const char *action, guint n_nuclei)
{
  return g_str_equal(action, "undo") ? n_nuclei == N_NUCLEI : n_nuclei == 0;
}

/* NULL when the record is as it must be, else what is wrong. */
static char *look(const Trial *trial, gboolean done)
{
  g_autoptr(GError) error = NULL;
  if (g_str_equal(trial->action, "create") && !g_file_test(trial->path, G_FILE_TEST_EXISTS))
    return done ? g_strdup("said done, but there is no record") : NULL;
  g_autoptr(AwRecord) record = aw_record_open(trial->path, AW_RECORD_WRITE, &error);
  if (!record || !aw_record_check(record, &error))
    return g_strdup(error->message);
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(record, TRUE, &error);
  g_autoptr(GPtrArray) frames = aw_record_frames(record, &error);
  if (!nuclei || !frames)
    return g_strdup(error->message);
  if (frames->len != 3 || !(is_after(trial->action, nuclei->len) || (!done && is_before(trial->action, nuclei->len))))
    return g_strdup_printf("%s, but the record holds %u frames and %u nuclei", done ? "said done" : "said refused",
                           frames->len, nuclei->len);
  return NULL;
}

/* One call made to fail. FALSE when there is no such call any more or the outcome is wrong (trial->reason). */
static gboolean try_one(Trial *trial, int nth)
{
  gboolean hit = FALSE;
  trial->folder = aw_scratch_new();
  trial->path = g_build_filename(trial->folder, "dish.dish", NULL);
  prepare(trial);
  int status = hurt(trial, nth, &hit);
  gboolean may_die = strstr(trial->fault, "KILL") != NULL;
  if (hit && status != 0 && status != REFUSED && status != NO_START && !(may_die && status == -1))
    trial->reason = g_strdup_printf("call %d: the process ended with status %d", nth, status);
  else if (hit)
    trial->reason = look(trial, status == 0);
  aw_scratch_remove(trial->folder);
  g_free(trial->path);
  return hit && !trial->reason;
}

/* Small numbers one by one, then in growing steps: a commit writes hundreds of pages alike. */
static int next_number(int nth)
{
  return nth + 1 + nth / 8;
}

static void report(int number, Trial *trial)
{
  int n_runs = 0;
  for (int nth = 1; try_one(trial, nth); nth = next_number(nth))
    n_runs++;
  if (n_runs == 0 && !trial->reason)
    trial->reason = g_strdup("no such call was made, so nothing is shown");
  printf("%s %d - record %s, %s in %d places%s%s\n", trial->reason ? "not ok" : "ok", number, trial->action,
         trial->fault, n_runs, trial->reason ? ": " : "", trial->reason ? trial->reason : "");
  fflush(stdout);
  g_clear_pointer(&trial->reason, g_free);
}

static gboolean strace_works(void)
{
  const char *argv[] = { "strace", "-qq", "-o", "/dev/null", "-e", "inject=fsync:error=EIO", "true", NULL };
  int status = 1;
  return g_spawn_sync(NULL, (char **)(gpointer)argv, NULL, G_SPAWN_SEARCH_PATH | G_SPAWN_STDERR_TO_DEV_NULL, NULL, NULL,
                      NULL, NULL, &status, NULL) &&
         status == 0;
}

int main(int argc, char **argv)
{
  if (argc == 3)
    return be_victim(argv[1], argv[2]);
  aw_test_use_memory();
  gboolean possible = strace_works();
  char *logs = aw_scratch_new();
  g_autofree char *log = g_build_filename(logs, "strace.log", NULL);
  int n = 0;
  for (gsize a = 0; a < G_N_ELEMENTS(actions); a++)
    for (gsize f = 0; f < G_N_ELEMENTS(faults); f++) {
      Trial trial = { .self = argv[0], .action = actions[a], .fault = faults[f].fault, .log = log };
      if (faults[f].create_only && a > 0)
        continue;
      if (possible)
        report(++n, &trial);
      else
        printf("ok %d - record %s, %s # SKIP strace cannot inject faults here\n", ++n, trial.action, trial.fault);
    }
  printf("1..%d\n", n);
  aw_scratch_remove(logs);
  return 0;
}

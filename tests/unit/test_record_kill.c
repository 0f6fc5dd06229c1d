/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Writers killed at random moments: all that they reported is there, and the record is whole. */
#include <signal.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include "base/random.h"
#include "record/private.h"
#include "support/check.h"
#include "support/dish.h"

#define N_KILLS 25

typedef struct {
  char *folder, *path;
} Place;

static void set_up(Place *place, gconstpointer ignored)
{
  (void)ignored;
  place->folder = aw_scratch_new();
  place->path = g_build_filename(place->folder, "dish.dish", NULL);
}

static void tear_down(Place *place, gconstpointer ignored)
{
  (void)ignored;
  aw_scratch_remove(place->folder);
  g_free(place->path);
}

static AwRecord *open_or_fail(const char *path, AwRecordMode mode)
{
  GError *error = NULL;
  AwRecord *record = aw_record_open(path, mode, &error);
  g_assert_no_error(error);
  return record;
}

static gboolean one_action(AwRecord *record, gint64 n)
{
  if (n % 5 == 3)
    return aw_record_undo(record, "ada", NULL, NULL);
  if (n % 5 == 4)
    return aw_record_redo(record, "ada", NULL, NULL);
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(30 + (guint)(n % 50), 1 + n % 7, 3);
  g_autofree char *name = g_strdup_printf("dish %d", (int)n);
  return aw_record_begin(record, "ada", NULL) && aw_record_set_nuclei(record, nuclei, NULL) &&
         aw_record_set_fact(record, "name", name, NULL) && aw_record_commit(record, name, NULL);
}

/* Acts until killed, and reports the number of the journal entry after each commit. */
static void act_for_ever(const char *path, int report)
{
  g_autoptr(AwRecord) record = open_or_fail(path, AW_RECORD_WRITE);
  gint64 n = 0;
  g_assert_true(aw_journal_next_id(record, &n, NULL));
  for (;; n++)
    if (!one_action(record, n) || write(report, &n, sizeof n) != (gssize)sizeof n)
      _exit(1);
}

/* Creates record after record until killed, and reports each. */
static void create_for_ever(const char *folder, int report)
{
  for (gint64 n = 0;; n++) {
    g_autofree char *sub = g_strdup_printf("%s/%d", folder, (int)n);
    if (mkdir(sub, 0777) != 0)
      continue; /* made in an earlier round */
    aw_record_free(aw_test_dish_new(sub));
    if (write(report, &n, sizeof n) != (gssize)sizeof n)
      _exit(1);
  }
}

/* Runs `work` in a child, kills it after a random time and gives the last number it reported, or 0. */
static gint64 kill_midway(void (*work)(const char *, int), const char *path, AwRandom *random)
{
  int ends[2];
  g_assert_cmpint(pipe(ends), ==, 0);
  pid_t child = fork();
  g_assert_cmpint(child, >=, 0);
  if (child == 0) {
    close(ends[0]);
    work(path, ends[1]);
    _exit(1);
  }
  close(ends[1]);
  gint64 last = 0, n;
  g_assert_cmpint(read(ends[0], &n, sizeof n), ==, sizeof n); /* it runs: now any moment will do */
  last = n;
  g_usleep(aw_random_below(random, 150000));
  g_assert_cmpint(kill(child, SIGKILL), ==, 0);
  while (read(ends[0], &n, sizeof n) == (gssize)sizeof n)
    last = n;
  close(ends[0]);
  int status;
  g_assert_cmpint(waitpid(child, &status, 0), ==, child);
  g_assert_true(WIFSIGNALED(status));
  return last;
}

static void test_kill(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRandom random = aw_random_stream(g_test_rand_int() & 0xff, 0);
  aw_record_free(aw_test_dish_new(place->folder));
  for (int round = 0; round < N_KILLS; round++) {
    gint64 reported = kill_midway(act_for_ever, place->path, &random);
    g_autoptr(AwRecord) record = open_or_fail(place->path, round % 2 ? AW_RECORD_WRITE : AW_RECORD_READ);
    g_assert_true(aw_record_check(record, &error));
    g_assert_no_error(error);
    g_autoptr(GPtrArray) journal = aw_record_journal(record, &error);
    g_assert_no_error(error);
    /* All that was reported is there, and at most the one action that was not yet reported. */
    g_assert_cmpint(journal->len, >=, reported);
    g_assert_cmpint(journal->len, <=, reported + 1);
    g_autofree char *dump = aw_test_dish_dump(record);
  }
}

static void test_kill_creating(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRandom random = aw_random_stream(g_test_rand_int() & 0xff, 1);
  guint n_found = 0;
  for (int round = 0; round < 8; round++) {
    gint64 reported = kill_midway(create_for_ever, place->folder, &random);
    for (gint64 n = 0;; n++) {
      g_autofree char *sub = g_strdup_printf("%s/%d", place->folder, (int)n);
      g_autofree char *path = g_build_filename(sub, "dish.dish", NULL);
      if (!g_file_test(sub, G_FILE_TEST_IS_DIR))
        break;
      gboolean exists = g_file_test(path, G_FILE_TEST_EXISTS);
      g_assert_true(exists || n != reported);
      if (!exists) { /* killed before the first commit: starting anew works */
        aw_record_free(aw_test_dish_new(sub));
        continue;
      }
      n_found++;
      g_autoptr(AwRecord) record = open_or_fail(path, AW_RECORD_READ);
      g_assert_true(aw_record_check(record, &error));
      g_autofree char *name = aw_record_fact(record, "name", &error);
      g_assert_cmpstr(name, ==, "dish");
    }
  }
  g_assert_cmpuint(n_found, >, 8);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add("/record/kill/acting", Place, NULL, set_up, test_kill, tear_down);
  g_test_add("/record/kill/creating", Place, NULL, set_up, test_kill_creating, tear_down);
  return g_test_run();
}

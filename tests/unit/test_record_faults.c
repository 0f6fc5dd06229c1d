/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Half-written records, several processes at once, read-only places, full disks. */
#include <grp.h>
#include <signal.h>
#include <string.h>
#include <sys/mount.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include "record/private.h"
#include "support/check.h"
#include "support/dish.h"

#define NOBODY 65534

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

/* Runs `work` in a child and gives its wait status: 0 when all went well. */
static int run_child(void (*work)(const char *), const char *path)
{
  pid_t child = fork();
  if (child == 0) {
    work(path);
    _exit(0);
  }
  int status = 0;
  g_assert_cmpint(waitpid(child, &status, 0), ==, child);
  return status;
}

/* --- stopped while writing: test_record_kill.c does it at random moments --- */

/* Stops in the middle of writing an action larger than the page cache: the file is half-written and the rollback
 * journal stands beside it. */
static void stop_half_way(const char *path)
{
  AwRecord *record = open_or_fail(path, AW_RECORD_WRITE);
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(3000, 1, 3);
  g_assert_true(aw_sql_exec(record, "PRAGMA cache_size = 4", NULL) && aw_record_begin(record, "ada", NULL) &&
                aw_record_set_nuclei(record, nuclei, NULL));
  _exit(0);
}

/* Whoever opens next, even for reading, brings back the last commit. */
static void test_half_written(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_autofree char *journal = g_strconcat(place->path, "-journal", NULL);
  AwRecord *record = aw_test_dish_new(place->folder);
  g_autofree char *before = aw_test_dish_dump(record);
  aw_record_free(record);
  g_assert_cmpint(run_child(stop_half_way, place->path), ==, 0);
  g_assert_true(g_file_test(journal, G_FILE_TEST_EXISTS));
  record = open_or_fail(place->path, AW_RECORD_READ);
  g_autofree char *after = aw_test_dish_dump(record);
  g_assert_cmpstr(before, ==, after);
  g_assert_true(aw_record_check(record, &error));
  aw_record_free(record);
  g_assert_false(g_file_test(journal, G_FILE_TEST_EXISTS));
}

/* --- several at once --- */

static void test_two_writers(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRecord *first = aw_test_dish_new(place->folder);
  g_autofree char *holder =
      g_strdup_printf("dish.dish is open for writing elsewhere|%s|process %ld", g_get_user_name(), (long)getpid());
  g_assert_null(aw_record_open(place->path, AW_RECORD_WRITE, &error));
  aw_check_error(&error, AW_ERROR_LOCKED, holder);
  aw_record_free(open_or_fail(place->path, AW_RECORD_READ));
  aw_record_free(first);
  aw_record_free(open_or_fail(place->path, AW_RECORD_WRITE));
  g_assert_cmpint(aw_scratch_count(place->folder), ==, 1);
}

/* Adds 1 to a fact, 25 times, each time as a writer of its own; waits while another holds the record. */
static void count_up(const char *path)
{
  for (int done = 0; done < 25;) {
    GError *error = NULL;
    double value = 0;
    g_autoptr(AwRecord) record = aw_record_open(path, AW_RECORD_WRITE, &error);
    if (!record) {
      aw_check_error(&error, AW_ERROR_LOCKED, "dish.dish");
      g_usleep(300);
      continue;
    }
    g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_fact_double(record, "n", 0, &value, &error) &&
                  aw_record_set_fact_double(record, "n", value + 1, &error) && aw_record_commit(record, "add", &error));
    done++;
  }
}

/* The lock file comes and goes while four processes compete for it: none may slip in beside another. */
static void test_lock_changes_hands(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  pid_t children[4];
  double n = 0;
  aw_record_free(aw_test_dish_new(place->folder));
  for (gsize i = 0; i < G_N_ELEMENTS(children); i++)
    if ((children[i] = fork()) == 0) {
      count_up(place->path);
      _exit(0);
    }
  for (gsize i = 0; i < G_N_ELEMENTS(children); i++) {
    int status = 1;
    g_assert_cmpint(waitpid(children[i], &status, 0), ==, children[i]);
    g_assert_cmpint(status, ==, 0);
  }
  g_autoptr(AwRecord) record = open_or_fail(place->path, AW_RECORD_READ);
  g_assert_true(aw_record_fact_double(record, "n", 0, &n, &error));
  g_assert_cmpfloat(n, ==, 100);
  g_assert_cmpint(aw_scratch_count(place->folder), ==, 1);
}

static void test_two_creators(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_autoptr(AwRecord) first = aw_record_create(place->path, &error);
  g_assert_null(aw_record_create(place->path, &error));
  aw_check_error(&error, AW_ERROR_LOCKED, "dish.dish");
  g_assert_true(aw_record_begin(first, "ada", &error) && aw_record_commit(first, "start", &error));
}

static void test_reader_sees_last_commit(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_autoptr(AwRecord) writer = aw_test_dish_new(place->folder);
  g_autoptr(AwRecord) reader = open_or_fail(place->path, AW_RECORD_READ);
  g_assert_true(aw_record_begin(writer, "ada", &error) && aw_record_set_fact(writer, "name", "new", &error));
  g_autofree char *before = aw_record_fact(reader, "name", &error);
  g_assert_cmpstr(before, ==, "dish");
  g_assert_true(aw_record_commit(writer, "rename", &error));
  g_autofree char *after = aw_record_fact(reader, "name", &error);
  g_assert_cmpstr(after, ==, "new");
}

/* A reader that never ends makes the commit fail, not hang, and the action is rolled back whole. */
static void test_stubborn_reader(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_autoptr(AwRecord) writer = aw_test_dish_new(place->folder);
  g_autoptr(AwRecord) reader = open_or_fail(place->path, AW_RECORD_READ);
  sqlite3_busy_timeout(writer->db, 50);
  g_assert_true(aw_record_read_begin(reader, &error));
  g_assert_true(aw_record_begin(writer, "ada", &error) && aw_record_set_fact(writer, "name", "new", &error));
  g_assert_false(aw_record_commit(writer, "rename", &error));
  aw_check_error(&error, AW_ERROR_LOCKED, "kept it busy for too long");
  aw_record_read_end(reader);
  g_autofree char *name = aw_record_fact(writer, "name", &error);
  g_assert_cmpstr(name, ==, "dish");
  g_assert_true(aw_record_begin(writer, "ada", &error) && aw_record_set_fact(writer, "name", "new", &error) &&
                aw_record_commit(writer, "rename", &error));
}

static void write_pairs(const char *path)
{
  g_autoptr(AwRecord) record = open_or_fail(path, AW_RECORD_WRITE);
  for (int i = 0; i < 40; i++) {
    g_autofree char *value = g_strdup_printf("%d", i);
    if (!aw_record_begin(record, "ada", NULL) || !aw_record_set_fact(record, "a", value, NULL) ||
        !aw_record_set_fact(record, "b", value, NULL) || !aw_record_commit(record, "pair", NULL))
      _exit(1);
    g_usleep(3000);
  }
}

/* While another process commits, two reads within one transaction always fit together. */
static void test_reading_while_writing(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  aw_record_free(aw_test_dish_new(place->folder));
  g_autoptr(AwRecord) reader = NULL;
  pid_t child = fork();
  if (child == 0) {
    write_pairs(place->path);
    _exit(0);
  }
  reader = open_or_fail(place->path, AW_RECORD_READ);
  int status = 0, n_reads = 0;
  for (; waitpid(child, &status, WNOHANG) == 0; n_reads++) {
    g_assert_true(aw_record_read_begin(reader, &error));
    g_autofree char *a = aw_record_fact(reader, "a", &error);
    g_autofree char *b = aw_record_fact(reader, "b", &error);
    aw_record_read_end(reader);
    g_assert_no_error(error);
    g_assert_cmpstr(a, ==, b);
    g_usleep(500);
  }
  g_assert_cmpint(status, ==, 0);
  g_assert_cmpint(n_reads, >, 3);
  g_autofree char *last = aw_record_fact(reader, "a", &error);
  g_assert_cmpstr(last, ==, "39");
}

/* --- read-only places, as an ordinary user --- */

/* Root may write anywhere, so a root run continues as nobody. */
static void become_ordinary(void)
{
  if (geteuid() == 0 && (setgroups(0, NULL) != 0 || setgid(NOBODY) != 0 || setuid(NOBODY) != 0))
    _exit(1);
}

static void give_away(const char *path, mode_t mode)
{
  g_assert_cmpint(chmod(path, mode), ==, 0);
  if (geteuid() == 0)
    g_assert_cmpint(chown(path, NOBODY, NOBODY), ==, 0);
}

static void read_it(const char *path)
{
  g_autoptr(AwRecord) record = open_or_fail(path, AW_RECORD_READ);
  g_autofree char *dump = aw_test_dish_dump(record);
  g_assert_true(strlen(dump) > 100);
}

static void try_read_only_folder(const char *path)
{
  GError *error = NULL;
  become_ordinary();
  read_it(path);
  g_assert_null(aw_record_open(path, AW_RECORD_WRITE, &error));
  aw_check_error(&error, AW_ERROR_IO, "cannot write|does not take a lock file|Permission denied");
  g_autofree char *folder = g_path_get_dirname(path);
  g_autofree char *other = g_build_filename(folder, "other.dish", NULL);
  g_assert_null(aw_record_create(other, &error));
  aw_check_error(&error, AW_ERROR_IO, "other.dish|Permission denied");
}

static void test_read_only_folder(Place *place, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(aw_test_dish_new(place->folder));
  give_away(place->path, 0644);
  give_away(place->folder, 0555);
  g_assert_cmpint(run_child(try_read_only_folder, place->path), ==, 0);
  g_assert_cmpint(chmod(place->folder, 0755), ==, 0);
}

static void try_read_only_file(const char *path)
{
  GError *error = NULL;
  become_ordinary();
  read_it(path);
  g_assert_null(aw_record_open(path, AW_RECORD_WRITE, &error));
  aw_check_error(&error, AW_ERROR_IO, "cannot write|the file is read-only for you");
}

static void test_read_only_file(Place *place, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(aw_test_dish_new(place->folder));
  give_away(place->path, 0444);
  give_away(place->folder, 0755);
  g_assert_cmpint(run_child(try_read_only_file, place->path), ==, 0);
  g_assert_cmpint(aw_scratch_count(place->folder), ==, 1);
}

static void try_half_written(const char *path)
{
  GError *error = NULL;
  become_ordinary();
  g_assert_null(aw_record_open(path, AW_RECORD_READ, &error));
  aw_check_error(&error, AW_ERROR_IO, "dish.dish|was left half-written|where it can be written");
}

/* Who may not write cannot bring back the last commit either, and is told so. */
static void test_half_written_read_only(Place *place, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(aw_test_dish_new(place->folder));
  g_assert_cmpint(run_child(stop_half_way, place->path), ==, 0);
  g_autofree char *journal = g_strconcat(place->path, "-journal", NULL);
  give_away(place->path, 0444);
  give_away(journal, 0444);
  give_away(place->folder, 0555);
  g_assert_cmpint(run_child(try_half_written, place->path), ==, 0);
  g_assert_cmpint(chmod(place->folder, 0755), ==, 0);
}

static void try_writing(const char *path)
{
  become_ordinary();
  g_autoptr(AwRecord) record = open_or_fail(path, AW_RECORD_WRITE);
  aw_test_dish_segment(record, 1);
}

/* A lock file that a killed process of someone else left behind holds nobody up. */
static void test_stale_lock_of_another(Place *place, gconstpointer ignored)
{
  (void)ignored;
  g_autofree char *lock = g_strconcat(place->path, ".lock", NULL);
  aw_record_free(aw_test_dish_new(place->folder));
  g_assert_true(g_file_set_contents(lock, "someone\n", -1, NULL));
  g_assert_cmpint(chmod(lock, 0444), ==, 0);
  give_away(place->path, 0644);
  give_away(place->folder, 0755);
  g_assert_cmpint(run_child(try_writing, place->path), ==, 0);
}

/* --- no room --- */

/* Tries an action too large for the disk; afterwards the record is as it was and takes smaller ones. */
static void overfill(AwRecord *record, const char *expected)
{
  GError *error = NULL;
  g_autofree char *before = aw_test_dish_dump(record);
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(20000, 1, 3);
  gboolean ok = aw_record_begin(record, "ada", &error) && aw_record_set_nuclei(record, nuclei, &error) &&
                aw_record_commit(record, "segment", &error);
  g_assert_false(ok);
  aw_record_rollback(record);
  aw_check_error(&error, AW_ERROR_IO, expected);
  g_autofree char *after = aw_test_dish_dump(record);
  g_assert_cmpstr(before, ==, after);
  g_assert_true(aw_record_check(record, &error));
  aw_test_dish_segment(record, 2);
}

static void overfill_limited(const char *path)
{
  const struct rlimit limit = { 1 << 20, RLIM_INFINITY };
  g_autoptr(AwRecord) record = open_or_fail(path, AW_RECORD_WRITE);
  signal(SIGXFSZ, SIG_IGN);
  g_assert_cmpint(setrlimit(RLIMIT_FSIZE, &limit), ==, 0);
  overfill(record, "cannot write|dish.dish|disk I/O error");
}

static void test_file_size_limit(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  aw_record_free(aw_test_dish_new(place->folder));
  g_assert_cmpint(run_child(overfill_limited, place->path), ==, 0);
  g_autoptr(AwRecord) record = open_or_fail(place->path, AW_RECORD_READ);
  g_assert_true(aw_record_check(record, &error));
}

static void test_full_disk(Place *place, gconstpointer ignored)
{
  (void)ignored;
  if (geteuid() != 0 || mount("tmpfs", place->folder, "tmpfs", 0, "size=1m") != 0) {
    g_test_skip("a small file system cannot be mounted here");
    return;
  }
  AwRecord *record = aw_test_dish_new(place->folder);
  overfill(record, "cannot write|dish.dish|the disk is full");
  aw_record_free(record);
  g_assert_cmpint(umount(place->folder), ==, 0);
}

/* No room for the very first commit: nothing appears under the name. */
static void create_limited(const char *path)
{
  GError *error = NULL;
  const struct rlimit limit = { 1 << 17, RLIM_INFINITY };
  signal(SIGXFSZ, SIG_IGN);
  g_assert_cmpint(setrlimit(RLIMIT_FSIZE, &limit), ==, 0);
  g_autoptr(AwRecord) record = aw_record_create(path, &error);
  g_assert_no_error(error);
  g_autofree char *text = g_strnfill(1 << 18, 'x');
  g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_set_fact(record, "name", text, &error));
  g_assert_false(aw_record_commit(record, "start", &error));
  aw_check_error(&error, AW_ERROR_IO, "dish.dish");
}

static void test_no_room_to_create(Place *place, gconstpointer ignored)
{
  (void)ignored;
  g_assert_cmpint(run_child(create_limited, place->path), ==, 0);
  g_assert_cmpint(aw_scratch_count(place->folder), ==, 0);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
#define ADD(name, fn) g_test_add("/record/faults/" name, Place, NULL, set_up, fn, tear_down)
  ADD("half-written", test_half_written);
  ADD("half-written-read-only", test_half_written_read_only);
  ADD("two-writers", test_two_writers);
  ADD("lock-changes-hands", test_lock_changes_hands);
  ADD("two-creators", test_two_creators);
  ADD("reader-sees-last-commit", test_reader_sees_last_commit);
  ADD("stubborn-reader", test_stubborn_reader);
  ADD("reading-while-writing", test_reading_while_writing);
  ADD("read-only-folder", test_read_only_folder);
  ADD("read-only-file", test_read_only_file);
  ADD("stale-lock-of-another", test_stale_lock_of_another);
  ADD("file-size-limit", test_file_size_limit);
  ADD("full-disk", test_full_disk);
  ADD("no-room-to-create", test_no_room_to_create);
  return g_test_run();
}

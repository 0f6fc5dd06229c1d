/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Images of a record: same, changed, missing, moved. */
#include <fcntl.h>
#include <glib/gstdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>
#include <utime.h>

#include "record/files.h"
#include "support/check.h"
#include "support/dish.h"

/* A folder with images/a.tif (two pages), images/b.tif, images/c.tif and a record of them. */
typedef struct {
  char *folder, *a, *b;
  AwRecord *record;
} Dish;

static const char *const files[] = { "images/a.tif", "images/a.tif", "images/b.tif", "images/c.tif" };

static char *below(const Dish *dish, const char *file)
{
  return g_build_filename(dish->folder, file, NULL);
}

static void make_folder(const Dish *dish, const char *name)
{
  g_autofree char *path = below(dish, name);
  g_assert_cmpint(g_mkdir_with_parents(path, 0777), ==, 0);
}

static void write_image(const Dish *dish, const char *file, const char *text)
{
  g_autofree char *path = below(dish, file);
  g_assert_true(g_file_set_contents(path, text, -1, NULL));
}

static void set_up(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  dish->folder = aw_scratch_new();
  make_folder(dish, "images");
  write_image(dish, files[0], "contents of a");
  write_image(dish, files[2], "contents of b");
  write_image(dish, files[3], "contents of c");
  dish->a = below(dish, files[0]);
  dish->b = below(dish, files[2]);
  dish->record = aw_test_dish_new(dish->folder);
  g_autoptr(GPtrArray) frames = aw_test_frames(4);
  for (guint i = 0; i < 4; i++) {
    AwFrame *frame = g_ptr_array_index(frames, i);
    g_autofree char *path = below(dish, files[i]);
    g_free(frame->file);
    frame->file = g_strdup(files[i]);
    frame->page = i == 1;
    g_assert_true(aw_frame_identify(frame, path, &error));
  }
  g_assert_true(aw_record_begin(dish->record, "ada", &error) && aw_record_set_frames(dish->record, frames, &error) &&
                aw_record_commit(dish->record, "frames", &error));
}

static void tear_down(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(dish->record);
  aw_scratch_remove(dish->folder);
  g_free(dish->a);
  g_free(dish->b);
}

static void set_time(const char *path, time_t at)
{
  const struct utimbuf times = { at, at };
  g_assert_cmpint(utime(path, &times), ==, 0);
}

/* Asserts one verdict of a check; `problem` is part of the sentence, NULL for none. */
static void expect(AwRecord *record, gboolean full, guint at, AwFileState state, guint differs, const char *problem)
{
  GError *error = NULL;
  g_autoptr(GPtrArray) checks = aw_record_files_check(record, full, 2, NULL, &error);
  g_assert_no_error(error);
  g_assert_cmpuint(checks->len, ==, 3);
  const AwFileCheck *check = g_ptr_array_index(checks, at);
  g_assert_cmpstr(check->file, ==, files[at + 1]);
  g_assert_cmpint(check->state, ==, state);
  g_assert_cmpuint(check->differs, ==, differs);
  if (problem)
    g_assert_nonnull(strstr(check->problem, problem));
  else
    g_assert_null(check->problem);
}

static void test_same(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  for (guint at = 0; at < 3; at++)
    for (int full = 0; full < 2; full++)
      expect(dish->record, full, at, AW_FILE_SAME, 0, NULL);
  g_assert_true(aw_record_files_require(dish->record, TRUE, 1, NULL, &error));
  g_assert_no_error(error);
}

static void test_size(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  struct stat st;
  g_assert_cmpint(stat(dish->b, &st), ==, 0);
  write_image(dish, files[2], "contents of b, and more");
  set_time(dish->b, st.st_mtime + 9);
  expect(dish->record, FALSE, 1, AW_FILE_CHANGED, AW_FILE_SIZE | AW_FILE_TIME, "it had 13 bytes and has 23 now");
  g_assert_false(aw_record_files_require(dish->record, FALSE, 1, NULL, &error));
  aw_check_error(&error, AW_ERROR_VERIFY, "images/b.tif has changed|13 bytes");
}

static void test_contents(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  write_image(dish, files[2], "contents of B");
  set_time(dish->b, 1000000000);
  expect(dish->record, FALSE, 1, AW_FILE_CHANGED, AW_FILE_TIME | AW_FILE_HASH, "SHA-256");
}

/* Same size, same time, other contents: only the full check can see it. */
static void test_contents_behind_time(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  struct stat st;
  g_assert_cmpint(stat(dish->a, &st), ==, 0);
  write_image(dish, files[0], "contents of A");
  const struct timespec times[2] = { st.st_atim, st.st_mtim };
  g_assert_cmpint(utimensat(AT_FDCWD, dish->a, times, 0), ==, 0);
  expect(dish->record, FALSE, 0, AW_FILE_SAME, 0, NULL);
  expect(dish->record, TRUE, 0, AW_FILE_CHANGED, AW_FILE_HASH, "images/a.tif");
}

static gint64 recorded_time(AwRecord *record, guint frame)
{
  g_autoptr(GPtrArray) frames = aw_record_frames(record, NULL);
  return ((AwFrame *)g_ptr_array_index(frames, frame))->mtime_ns;
}

static void test_touched(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  set_time(dish->a, 1000000000);
  expect(dish->record, FALSE, 0, AW_FILE_SAME, AW_FILE_TIME, NULL);
  g_assert_cmpint(recorded_time(dish->record, 0), !=, G_GINT64_CONSTANT(1000000000000000000));
  g_assert_true(aw_record_begin(dish->record, "ada", &error) && aw_record_commit(dish->record, "export", &error));
  g_assert_cmpint(recorded_time(dish->record, 0), ==, G_GINT64_CONSTANT(1000000000000000000));
  g_assert_cmpint(recorded_time(dish->record, 1), ==, G_GINT64_CONSTANT(1000000000000000000));
  expect(dish->record, FALSE, 0, AW_FILE_SAME, 0, NULL);
  g_autofree char *what = NULL; /* the export changed no data, so undo reaches past it */
  g_assert_true(aw_record_undo(dish->record, "ada", &what, &error));
  g_assert_cmpstr(what, ==, "frames");
}

static void test_missing(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_assert_cmpint(unlink(dish->b), ==, 0);
  expect(dish->record, FALSE, 1, AW_FILE_MISSING, 0, "images/b.tif is missing");
  g_assert_false(aw_record_files_require(dish->record, FALSE, 1, NULL, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "images/b.tif is missing");
  g_assert_cmpint(g_mkdir(dish->b, 0777), ==, 0);
  expect(dish->record, FALSE, 1, AW_FILE_MISSING, 0, "images/b.tif cannot be used");
}

static void test_cancelled(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwProgress progress = { 0 };
  aw_progress_cancel(&progress);
  g_assert_null(aw_record_files_check(dish->record, TRUE, 1, &progress, &error));
  aw_check_error(&error, AW_ERROR_CANCELLED, "");
}

static gsize relink(Dish *dish, const char *name)
{
  GError *error = NULL;
  gsize n = 99;
  g_autofree char *folder = below(dish, name);
  g_assert_true(aw_record_begin(dish->record, "ada", &error));
  g_assert_true(aw_record_files_relink(dish->record, folder, NULL, &n, &error));
  g_assert_true(aw_record_commit(dish->record, "relink", &error));
  g_assert_no_error(error);
  return n;
}

static void move(Dish *dish, const char *from, const char *to)
{
  g_autofree char *source = below(dish, from);
  g_autofree char *target = below(dish, to);
  g_assert_cmpint(rename(source, target), ==, 0);
}

static void expect_file(AwRecord *record, guint frame, const char *file)
{
  g_autoptr(GPtrArray) frames = aw_record_frames(record, NULL);
  g_assert_cmpstr(((AwFrame *)g_ptr_array_index(frames, frame))->file, ==, file);
}

static void test_relink(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  make_folder(dish, "moved/deep/deeper");
  make_folder(dish, "moved/decoy");
  move(dish, "images/a.tif", "moved/deep/deeper/a.tif");
  move(dish, "images/c.tif", "moved/c.tif");
  write_image(dish, "moved/decoy/a.tif", "contents of X"); /* right name and size, wrong contents, sorted first */
  write_image(dish, "moved/decoy/c.tif", "short");
  g_assert_cmpuint(relink(dish, "moved"), ==, 2);
  expect_file(dish->record, 0, "moved/deep/deeper/a.tif");
  expect_file(dish->record, 1, "moved/deep/deeper/a.tif");
  expect_file(dish->record, 2, "images/b.tif");
  expect_file(dish->record, 3, "moved/c.tif");
  g_assert_true(aw_record_files_require(dish->record, FALSE, 1, NULL, &error));
  g_assert_true(aw_record_undo(dish->record, "ada", NULL, &error));
  expect_file(dish->record, 0, "images/a.tif");
}

static void test_relink_fails(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  gsize n;
  g_assert_cmpint(unlink(dish->b), ==, 0);
  make_folder(dish, "empty");
  g_assert_cmpuint(relink(dish, "empty"), ==, 0);
  expect_file(dish->record, 2, "images/b.tif");
  g_assert_true(aw_record_begin(dish->record, "ada", &error));
  g_assert_false(aw_record_files_relink(dish->record, "/nowhere/at/all", NULL, &n, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "no folder /nowhere/at/all");
}

/* Record and images moved together need no relinking. */
static void test_moved_together(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_autofree char *to = below(dish, "elsewhere");
  g_autofree char *record = below(dish, "elsewhere/dish.dish");
  make_folder(dish, "elsewhere");
  aw_record_free(g_steal_pointer(&dish->record));
  move(dish, "images", "elsewhere/images");
  move(dish, "dish.dish", "elsewhere/dish.dish");
  dish->record = aw_record_open(record, AW_RECORD_WRITE, &error);
  g_assert_no_error(error);
  g_assert_true(aw_record_files_require(dish->record, TRUE, 0, NULL, &error));
}

static void expect_relative(const Dish *dish, const char *path, const char *file)
{
  g_autofree char *whole = below(dish, path);
  g_autofree char *named = aw_record_file_relative(dish->record, whole);
  g_autofree char *back = aw_record_file_path(dish->record, named);
  g_assert_cmpstr(named, ==, file);
  g_assert_cmpstr(back, ==, whole);
}

static void test_relative(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  g_autofree char *folder_name = g_path_get_basename(dish->folder);
  g_autofree char *outside = g_strdup_printf("../%s-not-there/x.tif", folder_name);
  expect_relative(dish, "images/a.tif", "images/a.tif");
  expect_relative(dish, "x.tif", "x.tif");
  g_autofree char *whole = g_canonicalize_filename(outside, dish->folder);
  g_autofree char *named = aw_record_file_relative(dish->record, whole);
  g_assert_cmpstr(named, ==, outside);
  g_assert_cmpstr(aw_record_folder(dish->record), ==, dish->folder);
  g_autofree char *absolute = aw_record_file_path(dish->record, "/data/x.tif");
  g_assert_cmpstr(absolute, ==, "/data/x.tif");
}

/* A record reached through a link in another folder still finds its images beside itself. */
static void test_linked_record(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  make_folder(dish, "desk");
  g_autofree char *link = below(dish, "desk/today.dish");
  g_assert_cmpint(symlink("../dish.dish", link), ==, 0);
  g_autoptr(AwRecord) record = aw_record_open(link, AW_RECORD_READ, &error);
  g_assert_no_error(error);
  g_assert_true(aw_record_files_require(record, TRUE, 0, NULL, &error));
  g_autofree char *named = aw_record_file_relative(record, dish->a);
  g_assert_cmpstr(named, ==, "images/a.tif");
  g_assert_null(aw_record_open(link, AW_RECORD_WRITE, &error)); /* the same lock, whatever the name */
  aw_check_error(&error, AW_ERROR_LOCKED, "open for writing elsewhere");
}

static void test_identify(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_autoptr(AwFrame) frame = aw_frame_new();
  write_image(dish, "abc", "abc"); /* FIPS 180-2, appendix B.1 */
  g_autofree char *path = below(dish, "abc");
  g_assert_true(aw_frame_identify(frame, path, &error));
  g_assert_cmpstr(frame->sha256, ==, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  g_assert_cmpint(frame->size_bytes, ==, 3);
  g_assert_false(aw_frame_identify(frame, "/nowhere.tif", &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "/nowhere.tif");
  g_assert_false(aw_frame_identify(frame, dish->folder, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "folder");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_test_use_memory();
#define ADD(name, fn) g_test_add("/record/files/" name, Dish, NULL, set_up, fn, tear_down)
  ADD("same", test_same);
  ADD("size", test_size);
  ADD("contents", test_contents);
  ADD("contents-behind-time", test_contents_behind_time);
  ADD("touched", test_touched);
  ADD("missing", test_missing);
  ADD("cancelled", test_cancelled);
  ADD("relink", test_relink);
  ADD("relink-fails", test_relink_fails);
  ADD("moved-together", test_moved_together);
  ADD("relative", test_relative);
  ADD("linked-record", test_linked_record);
  ADD("identify", test_identify);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/output.h"

#include <errno.h>
#include <fcntl.h>
#include <glib/gstdio.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include "../support/check.h"

static char *folder;

static char *in_folder(const char *name)
{
  return g_build_filename(folder, name, NULL);
}

static void assert_holds(const char *path, const char *expected)
{
  g_autofree char *text = NULL;
  g_assert_true(g_file_get_contents(path, &text, NULL, NULL));
  g_assert_cmpstr(text, ==, expected);
}

static guint mode_of(const char *path)
{
  struct stat st;
  g_assert_cmpint(stat(path, &st), ==, 0);
  return st.st_mode & 07777;
}

static void setup(void)
{
  folder = aw_scratch_new();
}

static void finish(void)
{
  aw_scratch_remove(g_steal_pointer(&folder));
}

static void appears_when_whole(void)
{
  setup();
  GError *error = NULL;
  g_autofree char *path = in_folder("list.csv");
  AwOutput *out = aw_output_open(path, &error);
  g_assert_no_error(error);
  g_assert_false(aw_output_is_direct(out));
  fputs("one\n", aw_output_stream(out));
  g_assert_false(g_file_test(path, G_FILE_TEST_EXISTS));
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  g_assert_true(aw_output_commit(out, &error));
  g_assert_null(aw_output_stream(out));
  assert_holds(path, "one\n");
  aw_output_free(out);
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  finish();
}

static void not_committed_leaves_nothing(void)
{
  setup();
  g_autofree char *path = aw_scratch_write(folder, "list.csv", "old");
  AwOutput *out = aw_output_open(path, NULL);
  fputs("new", aw_output_stream(out));
  aw_output_free(out);
  assert_holds(path, "old");
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  finish();
}

static void permissions(void)
{
  setup();
  g_autofree char *path = in_folder("list.csv");
  mode_t old = umask(027);
  g_assert_true(aw_output_write(path, "a", 1, NULL));
  umask(old);
  g_assert_cmphex(mode_of(path), ==, 0640);
  g_assert_cmpint(g_chmod(path, 0604), ==, 0);
  g_assert_true(aw_output_write(path, "b", 1, NULL));
  g_assert_cmphex(mode_of(path), ==, 0604);
  finish();
}

static void links_are_kept(void)
{
  setup();
  g_autofree char *inner = in_folder("inner");
  g_autofree char *link = in_folder("link.csv");
  g_autofree char *target = g_build_filename(inner, "real.csv", NULL);
  g_assert_cmpint(g_mkdir(inner, 0700), ==, 0);
  g_assert_cmpint(symlink("inner/real.csv", link), ==, 0);
  g_assert_true(aw_output_write(link, "first", 5, NULL)); /* the link dangles at first */
  assert_holds(target, "first");
  g_assert_true(aw_output_write(link, "second", 6, NULL));
  assert_holds(target, "second");
  g_assert_true(g_file_test(link, G_FILE_TEST_IS_SYMLINK));
  g_assert_cmpint(aw_scratch_count(inner), ==, 1);
  finish();
}

static void longest_name(void)
{
  setup();
  g_autofree char *name = g_strnfill(255, 'n');
  g_autofree char *path = in_folder(name);
  g_assert_true(aw_output_write(path, "a", 1, NULL));
  assert_holds(path, "a");
  finish();
}

static void refused(void)
{
  setup();
  GError *error = NULL;
  g_autofree char *missing = in_folder("none/list.csv");
  g_assert_false(aw_output_write(missing, "a", 1, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "none/list.csv|there is no folder|/none");
  g_assert_false(aw_output_write(folder, "a", 1, &error));
  aw_check_error(&error, AW_ERROR_IO, "it is a folder");
  g_autofree char *loop = in_folder("loop");
  g_assert_cmpint(symlink("loop", loop), ==, 0);
  g_assert_false(aw_output_write(loop, "a", 1, &error));
  aw_check_error(&error, AW_ERROR_IO, "loop");
  finish();
}

/* Somebody makes a folder of that name while the file is being written. */
static void name_taken_by_a_folder(void)
{
  setup();
  GError *error = NULL;
  g_autofree char *path = in_folder("list.csv");
  AwOutput *out = aw_output_open(path, &error);
  g_assert_cmpint(g_mkdir(path, 0700), ==, 0);
  g_assert_false(aw_output_commit(out, &error));
  aw_check_error(&error, AW_ERROR_IO, "cannot give its name to|list.csv");
  aw_output_free(out);
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  finish();
}

/* Root may write anywhere, so the case needs another user: a child process that gives its rights up. */
static void read_only_folder(void)
{
  setup();
  g_autofree char *path = in_folder("list.csv");
  g_assert_cmpint(g_chmod(folder, 0555), ==, 0);
  pid_t pid = fork();
  if (pid == 0) {
    GError *error = NULL;
    if (getuid() == 0 && setuid(65534) != 0)
      _exit(3);
    gboolean ok = aw_output_write(path, "a", 1, &error);
    _exit(!ok && error->code == AW_ERROR_IO && strstr(error->message, folder) ? 0 : 1);
  }
  int status = 0;
  waitpid(pid, &status, 0);
  g_assert_cmpint(WEXITSTATUS(status), ==, 0);
  g_chmod(folder, 0755);
  finish();
}

static void full_device(void)
{
  g_autofree char *block = g_strnfill(100000, 'x');
  const gsize sizes[] = { 3, 100000 };
  for (gsize i = 0; i < G_N_ELEMENTS(sizes); i++) {
    GError *error = NULL;
    g_autoptr(AwOutput) out = aw_output_open("/dev/full", &error);
    g_assert_no_error(error);
    g_assert_true(aw_output_is_direct(out));
    g_assert_cmpstr(aw_output_path(out), ==, "/dev/full");
    fwrite(block, 1, sizes[i], aw_output_stream(out));
    g_assert_false(aw_output_commit(out, &error));
    aw_check_error(&error, AW_ERROR_IO, "cannot write all of /dev/full: ");
  }
  g_assert_true(g_file_test("/dev/full", G_FILE_TEST_EXISTS));
}

/* A quota or file-size limit: the write fails, the old file stays, nothing is left beside it. */
static void file_size_limit(void)
{
  setup();
  g_autofree char *path = aw_scratch_write(folder, "list.csv", "old");
  g_autofree char *block = g_strnfill(100000, 'x');
  pid_t pid = fork();
  if (pid == 0) {
    GError *error = NULL;
    const struct rlimit limit = { 20000, 20000 };
    aw_output_prepare_process();
    if (setrlimit(RLIMIT_FSIZE, &limit) != 0)
      _exit(3);
    gboolean ok = aw_output_write(path, block, 100000, &error);
    _exit(!ok && error->code == AW_ERROR_IO && strstr(error->message, "write all of") ? 0 : 1);
  }
  int status = 0;
  waitpid(pid, &status, 0);
  g_assert_true(WIFEXITED(status));
  g_assert_cmpint(WEXITSTATUS(status), ==, 0);
  assert_holds(path, "old");
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  finish();
}

static void pipe_is_written_directly(void)
{
  setup();
  int ends[2];
  char got[8] = "";
  GError *error = NULL;
  g_assert_cmpint(pipe(ends), ==, 0);
  g_autofree char *path = g_strdup_printf("/dev/fd/%d", ends[1]);
  g_assert_true(aw_output_write(path, "hello", 5, &error));
  g_assert_no_error(error);
  g_assert_cmpint(read(ends[0], got, sizeof got), ==, 5);
  g_assert_cmpstr(got, ==, "hello");
  close(ends[0]);
  close(ends[1]);
  g_assert_false(aw_output_write(path, "hello", 5, &error));
  aw_check_error(&error, AW_ERROR_IO, path);
  finish();
}

/* What stands in the file already must survive `>>` with /dev/stdout as the output. */
static void standing_file_is_appended_to(void)
{
  setup();
  g_autofree char *path = aw_scratch_write(folder, "log", "old ");
  int fd = open(path, O_WRONLY | O_APPEND);
  g_assert_cmpint(fd, >=, 0);
  g_autofree char *name = g_strdup_printf("/proc/self/fd/%d", fd);
  g_assert_true(aw_output_write(name, "new", 3, NULL));
  close(fd);
  assert_holds(path, "old new");
  finish();
}

static void closed_pipe(void)
{
  int ends[2];
  GError *error = NULL;
  g_assert_cmpint(pipe(ends), ==, 0);
  close(ends[0]);
  aw_output_prepare_process();
  g_autofree char *path = g_strdup_printf("/dev/fd/%d", ends[1]);
  g_assert_false(aw_output_write(path, "hello", 5, &error));
  aw_check_error(&error, AW_ERROR_IO, "write all of");
  close(ends[1]);
}

static void input_read(void)
{
  setup();
  GError *error = NULL;
  char *bytes = NULL;
  gsize n = 0;
  g_autofree char *path = aw_scratch_write(folder, "in", "0123456789");
  g_assert_true(aw_input_read(path, 10, &bytes, &n, &error));
  g_assert_cmpuint(n, ==, 10);
  g_assert_cmpstr(bytes, ==, "0123456789");
  g_clear_pointer(&bytes, g_free);
  g_assert_false(aw_input_read(path, 9, &bytes, &n, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "in is larger than 9 bytes");
  g_assert_false(aw_input_read("/dev/zero", 100000, &bytes, &n, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "/dev/zero is larger than 100000 bytes");
  g_assert_true(aw_input_read("/dev/null", 9, &bytes, &n, &error));
  g_assert_cmpuint(n, ==, 0);
  g_assert_cmpstr(bytes, ==, "");
  g_clear_pointer(&bytes, g_free);
  g_assert_false(aw_input_read("/proc/self/mem", 9, &bytes, &n, &error)); /* address 0 cannot be read: EIO */
  aw_check_error(&error, AW_ERROR_IO, "cannot read /proc/self/mem");
  g_assert_null(aw_input_sha256("/proc/self/mem", &error));
  aw_check_error(&error, AW_ERROR_IO, "cannot read /proc/self/mem");
  g_assert_false(aw_input_read(folder, 9, &bytes, &n, &error));
  aw_check_error(&error, AW_ERROR_IO, folder);
  finish();
}

static void sha256(void)
{
  setup();
  GError *error = NULL;
  g_autofree char *path = aw_scratch_write(folder, "abc", "abc");
  g_autofree char *sum = aw_input_sha256(path, &error);
  /* FIPS 180-2, appendix B.1 */
  g_assert_cmpstr(sum, ==, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  g_autofree char *none = in_folder("none");
  g_assert_null(aw_input_sha256(none, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "none");
  g_assert_null(aw_input_sha256(folder, &error));
  aw_check_error(&error, AW_ERROR_IO, folder);
  finish();
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/base/output/appears_when_whole", appears_when_whole);
  aw_check_add("/base/output/not_committed_leaves_nothing", not_committed_leaves_nothing);
  aw_check_add("/base/output/permissions", permissions);
  aw_check_add("/base/output/links_are_kept", links_are_kept);
  aw_check_add("/base/output/longest_name", longest_name);
  aw_check_add("/base/output/refused", refused);
  aw_check_add("/base/output/name_taken_by_a_folder", name_taken_by_a_folder);
  aw_check_add("/base/output/read_only_folder", read_only_folder);
  aw_check_add("/base/output/full_device", full_device);
  aw_check_add("/base/output/file_size_limit", file_size_limit);
  aw_check_add("/base/output/pipe_is_written_directly", pipe_is_written_directly);
  aw_check_add("/base/output/standing_file_is_appended_to", standing_file_is_appended_to);
  aw_check_add("/base/output/closed_pipe", closed_pipe);
  aw_check_add("/base/output/input_read", input_read);
  aw_check_add("/base/output/sha256", sha256);
  return g_test_run();
}

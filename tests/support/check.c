/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "check.h"

#include <glib/gstdio.h>
#include <locale.h>
#include <string.h>

void aw_check_error(GError **error, AwErrorCode code, const char *parts)
{
  g_assert_nonnull(*error);
  g_auto(GStrv) list = g_strsplit(parts, "|", -1);
  for (gsize i = 0; list[i]; i++)
    if (!strstr((*error)->message, list[i]))
      g_error("the message '%s' lacks '%s'", (*error)->message, list[i]);
  if (!g_error_matches(*error, AW_ERROR, (int)code))
    g_error("'%s' has code %d instead of %d", (*error)->message, (*error)->code, (int)code);
  g_clear_error(error);
}

typedef struct {
  void (*test)(void);
} Wrapped;

static void run_in_german(gconstpointer data)
{
  if (!setlocale(LC_ALL, "de_DE.UTF-8")) {
    g_test_skip("locale de_DE.UTF-8 is not installed");
    return;
  }
  g_assert_cmpstr(localeconv()->decimal_point, ==, ",");
  ((const Wrapped *)data)->test();
  setlocale(LC_ALL, "C");
}

void aw_check_add(const char *path, void (*test)(void))
{
  Wrapped *wrapped = g_new(Wrapped, 1);
  wrapped->test = test;
  g_test_add_func(path, test);
  g_autofree char *german = g_strconcat(path, "/de_DE", NULL);
  g_test_add_data_func_full(german, wrapped, run_in_german, g_free);
}

char *aw_scratch_new(void)
{
  g_autoptr(GError) error = NULL;
  char *folder = g_dir_make_tmp("aimwell-test-XXXXXX", &error);
  g_assert_no_error(error);
  return folder;
}

static void remove_tree(const char *path)
{
  GDir *dir = g_file_test(path, G_FILE_TEST_IS_SYMLINK) ? NULL : g_dir_open(path, 0, NULL);
  for (const char *name; dir && (name = g_dir_read_name(dir));) {
    g_autofree char *inner = g_build_filename(path, name, NULL);
    remove_tree(inner);
  }
  if (dir)
    g_dir_close(dir);
  g_remove(path);
}

void aw_scratch_remove(char *folder)
{
  remove_tree(folder);
  g_free(folder);
}

char *aw_scratch_write(const char *folder, const char *name, const char *text)
{
  g_autoptr(GError) error = NULL;
  char *path = g_build_filename(folder, name, NULL);
  g_file_set_contents(path, text, -1, &error);
  g_assert_no_error(error);
  return path;
}

int aw_scratch_count(const char *folder)
{
  GDir *dir = g_dir_open(folder, 0, NULL);
  int n = 0;
  g_assert_nonnull(dir);
  while (g_dir_read_name(dir))
    n++;
  g_dir_close(dir);
  return n;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/keyfile.h"

#include <string.h>

#include "../support/check.h"

static const char sample[] = "\xef\xbb\xbf# a beam\r\n[beam]\r\nname = narrow beam\r\nsigma-um=0.75\r\nshots=4\r\n"
                             "gated=yes\r\nhollow=no\r\n\r\n[stage]\r\nspeed=1,5\r\n";

static AwKeyFile *parse(const char *text)
{
  g_autoptr(GError) error = NULL;
  AwKeyFile *file = aw_keyfile_parse(text, strlen(text), "k.key", &error);
  g_assert_no_error(error);
  return file;
}

static void assert_refused(const char *bytes, gsize n_bytes, AwErrorCode code, const char *parts)
{
  GError *error = NULL;
  g_assert_null(aw_keyfile_parse(bytes, n_bytes, "k.key", &error));
  aw_check_error(&error, code, parts);
}

static void values(void)
{
  g_autoptr(AwKeyFile) file = parse(sample);
  GError *error = NULL;
  double sigma = 0;
  gint64 shots = 0;
  gboolean gated = FALSE, hollow = TRUE;
  g_autofree char *name = aw_keyfile_need_text(file, "beam", "name", &error);
  g_assert_cmpstr(name, ==, "narrow beam");
  g_assert_true(aw_keyfile_double(file, "beam", "sigma-um", 0, 10, &sigma, &error));
  g_assert_cmpfloat(sigma, ==, 0.75);
  g_assert_true(aw_keyfile_int(file, "beam", "shots", 1, 9, &shots, &error));
  g_assert_cmpint(shots, ==, 4);
  g_assert_true(aw_keyfile_bool(file, "beam", "gated", &gated, &error));
  g_assert_true(aw_keyfile_bool(file, "beam", "hollow", &hollow, &error));
  g_assert_true(gated && !hollow);
  g_assert_true(aw_keyfile_has(file, "stage", "speed"));
  g_assert_true(aw_keyfile_finish(file, &error));
  g_assert_no_error(error);
}

static void absent(void)
{
  g_autoptr(AwKeyFile) file = parse(sample);
  GError *error = NULL;
  double x = 3.5;
  gint64 n = 8;
  gboolean b = TRUE;
  g_assert_true(aw_keyfile_double(file, "beam", "none", 0, 1, &x, &error));
  g_assert_true(aw_keyfile_int(file, "none", "none", 0, 1, &n, &error));
  g_assert_true(aw_keyfile_bool(file, "beam", "none", &b, &error));
  g_assert_cmpfloat(x, ==, 3.5);
  g_assert_cmpint(n, ==, 8);
  g_assert_true(b);
  g_assert_false(aw_keyfile_has(file, "beam", "none"));
  g_autofree char *text = aw_keyfile_text(file, "beam", "none", "spare");
  g_assert_cmpstr(text, ==, "spare");
  g_assert_null(aw_keyfile_text(file, "beam", "none", NULL));
  g_assert_null(aw_keyfile_need_text(file, "beam", "none", &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "k.key has no key 'none' in group [beam]");
}

static void bad_values(void)
{
  g_autoptr(AwKeyFile) file = parse(sample);
  GError *error = NULL;
  double x = 0;
  gint64 n = 0;
  gboolean b = FALSE;
  g_assert_false(aw_keyfile_double(file, "stage", "speed", 0, 10, &x, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "k.key, group [stage], key speed: '1,5' has a decimal comma");
  g_assert_false(aw_keyfile_double(file, "beam", "sigma-um", 0.8, 10, &x, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "k.key, group [beam], key sigma-um: '0.75' is outside 0.8 to 10");
  g_assert_false(aw_keyfile_int(file, "beam", "shots", 5, 9, &n, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "'4' is outside 5 to 9");
  g_assert_false(aw_keyfile_int(file, "beam", "sigma-um", 0, 9, &n, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "not a whole number");
  g_assert_false(aw_keyfile_bool(file, "beam", "name", &b, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "key name: 'narrow beam' is neither yes nor no");
}

static void misspelt(void)
{
  GError *error = NULL;
  g_autoptr(AwKeyFile) file = parse("[beam]\nname=x\nsigma-mu=1\n[empty]\n");
  g_autofree char *name = aw_keyfile_text(file, "beam", "name", NULL);
  g_assert_false(aw_keyfile_finish(file, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "no use for key 'sigma-mu' in group [beam]");
  g_assert_true(aw_keyfile_has(file, "beam", "sigma-mu"));
  g_assert_false(aw_keyfile_finish(file, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "no use for a group [empty]");
  g_auto(GStrv) groups = aw_keyfile_groups(file);
  g_assert_cmpstr(groups[0], ==, "beam");
  g_assert_cmpstr(groups[1], ==, "empty");
  g_assert_null(groups[2]);
}

static void refused(void)
{
  assert_refused("[a\n", 3, AW_ERROR_FORMAT, "k.key is no key file");
  assert_refused("x=1\n", 4, AW_ERROR_FORMAT, "k.key is no key file");
  assert_refused("[a]\nx=\xff\n", 8, AW_ERROR_FORMAT, "k.key is not UTF-8");
  assert_refused("[a]\nx=\0\n", 8, AW_ERROR_FORMAT, "k.key is not UTF-8");
  assert_refused("[a]\nx=1\ny=2\n x =3\n", 18, AW_ERROR_FORMAT, "k.key, line 4: key 'x' stands twice");
  assert_refused("[a]\nx=1\n[b]\nx=2\n[a]\ny=1\n", 24, AW_ERROR_FORMAT, "k.key, line 5: group 'a' stands twice");
  assert_refused("[a]\nx=C:\\qq\n", 12, AW_ERROR_FORMAT, "k.key, group [a], key x: ");
  g_autofree char *large = g_strnfill((1 << 20) + 1, '\n');
  assert_refused(large, (1 << 20) + 1, AW_ERROR_RANGE, "k.key is larger than 1048576 bytes");
}

static void files(void)
{
  char *folder = aw_scratch_new();
  GError *error = NULL;
  g_autofree char *path = aw_scratch_write(folder, "b.key", sample);
  g_autoptr(AwKeyFile) file = aw_keyfile_read(path, &error);
  g_assert_no_error(error);
  g_assert_true(aw_keyfile_has(file, "beam", "name"));
  g_autofree char *none = g_build_filename(folder, "none.key", NULL);
  g_assert_null(aw_keyfile_read(none, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "none.key");
  aw_scratch_remove(folder);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/base/keyfile/values", values);
  aw_check_add("/base/keyfile/absent", absent);
  aw_check_add("/base/keyfile/bad_values", bad_values);
  aw_check_add("/base/keyfile/misspelt", misspelt);
  aw_check_add("/base/keyfile/refused", refused);
  aw_check_add("/base/keyfile/files", files);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/points.h"

#include "../support/check.h"

static const char sample[] = "# from the microscope\nname,y_um,x_um,\"note, long\"\nA,2.5,-1,\"say \"\"x\"\"\"\n"
                             "B,2.50,-1.0,\nC,0,0,\"a,b\"\nD,-0,0,d\nE,2.5,-1,\n";

static AwPoints *read_text(const char *text, GError **error)
{
  char *folder = aw_scratch_new();
  g_autofree char *path = aw_scratch_write(folder, "p.csv", text);
  AwPoints *points = aw_points_read(path, error);
  aw_scratch_remove(folder);
  return points;
}

static void refuse(const char *text, AwErrorCode code, const char *parts)
{
  GError *error = NULL;
  g_assert_null(read_text(text, &error));
  aw_check_error(&error, code, parts);
}

static void reading(void)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(AwPoints) points = read_text(sample, &error);
  g_assert_no_error(error);
  g_assert_cmpuint(aw_points_n(points), ==, 5);
  g_assert_cmpfloat(aw_points_stops(points)[0].x, ==, -1);
  g_assert_cmpfloat(aw_points_stops(points)[0].y, ==, 2.5);
}

static void writing_carries_columns(void)
{
  g_autoptr(AwPoints) points = read_text(sample, NULL);
  static const guint32 order[] = { 4, 2, 0, 1, 3 };
  char *folder = aw_scratch_new();
  GError *error = NULL;
  g_autofree char *path = g_build_filename(folder, "out.csv", NULL), *text = NULL;
  g_assert_true(aw_points_write(points, order, path, &error));
  g_assert_true(g_file_get_contents(path, &text, NULL, NULL));
  g_assert_cmpstr(text, ==,
                  "# from the microscope\nname,y_um,x_um,\"note, long\",order\nE,2.5,-1,,1\nC,0,0,\"a,b\",2\n"
                  "A,2.5,-1,\"say \"\"x\"\"\",3\nB,2.50,-1.0,,4\nD,-0,0,d,5\n");
  g_assert_false(aw_points_write(points, order, "/dev/full", &error));
  aw_check_error(&error, AW_ERROR_IO, "/dev/full");
  g_assert_null(aw_points_read(path, &error));
  aw_check_error(&error, AW_ERROR_STATE, "out.csv has a column \"order\" already");
  aw_scratch_remove(folder);
}

static GPtrArray *warnings_of(const AwPoints *points)
{
  GPtrArray *warnings = g_ptr_array_new_with_free_func(g_free);
  aw_points_warn_duplicates(points, warnings);
  return warnings;
}

static void one_spot(void)
{
  g_autoptr(AwPoints) points = read_text(sample, NULL);
  g_autoptr(GPtrArray) three = warnings_of(points);
  g_assert_cmpuint(three->len, ==, 3);
  g_assert_true(g_str_has_suffix(g_ptr_array_index(three, 0), "p.csv: the points of lines 3 and 4 lie on one spot"));
  g_assert_true(g_str_has_suffix(g_ptr_array_index(three, 2), "lines 5 and 6 lie on one spot"));
  g_autoptr(AwPoints) apart = read_text("x_um,y_um\n1,2\n2,1\n1,1\n", NULL);
  g_autoptr(GPtrArray) none = warnings_of(apart);
  g_assert_cmpuint(none->len, ==, 0);
}

static void many_on_one_spot(void)
{
  g_autoptr(GString) text = g_string_new("x_um,y_um\n");
  for (int i = 0; i < 26; i++)
    g_string_append(text, "1,2\n");
  g_autoptr(AwPoints) points = read_text(text->str, NULL);
  g_autoptr(GPtrArray) lines = warnings_of(points);
  g_assert_cmpuint(lines->len, ==, 11);
  g_assert_true(g_str_has_suffix(g_ptr_array_index(lines, 10), "15 further points lie on the spot of another"));
}

static void refused(void)
{
  refuse("x_um,y\n1,2\n", AW_ERROR_NOT_FOUND, "p.csv has no column 'y_um'; its columns are: x_um, y");
  refuse("x_mm,y_um\n1,2\n", AW_ERROR_NOT_FOUND, "has no column 'x_um'");
  refuse("x_um,y_um\n", AW_ERROR_EMPTY, "p.csv has a header but no point");
  refuse("x_um,y_um\n1,two\n", AW_ERROR_FORMAT, "p.csv, line 2, column y_um: 'two'");
  refuse("x_um,y_um\n1,2\n-2e7,1\n", AW_ERROR_RANGE, "p.csv, line 3, column x_um: '-2e7' is beyond 10000000 um");
  refuse("x_um,y_um,order\n1,2,3\n", AW_ERROR_STATE, "p.csv has a column \"order\" already; remove or rename it");
}

/* Many points inside one micrometre: looking for equal ones stays quick. */
static void many_points_close_together(void)
{
  g_autoptr(GString) text = g_string_new("x_um,y_um\n");
  for (int i = 0; i < 200000; i++)
    g_string_append_printf(text, "0.%06d,0.%06d\n", i, 2 * i % 1000);
  g_autoptr(AwPoints) points = read_text(text->str, NULL);
  gint64 began = g_get_monotonic_time();
  g_autoptr(GPtrArray) none = warnings_of(points);
  g_assert_cmpint(g_get_monotonic_time() - began, <, 10 * G_USEC_PER_SEC);
  g_assert_cmpuint(none->len, ==, 0);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/plan/points/reading", reading);
  aw_check_add("/plan/points/writing_carries_columns", writing_carries_columns);
  aw_check_add("/plan/points/one_spot", one_spot);
  aw_check_add("/plan/points/many_on_one_spot", many_on_one_spot);
  aw_check_add("/plan/points/refused", refused);
  aw_check_add("/plan/points/many_points_close_together", many_points_close_together);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/csv.h"

#include <string.h>

#include "../support/check.h"

static AwCsv *parse(const char *text, char separator)
{
  g_autoptr(GError) error = NULL;
  AwCsv *csv = aw_csv_parse(text, strlen(text), "t.csv", separator, &error);
  g_assert_no_error(error);
  g_assert_nonnull(csv);
  return csv;
}

static void assert_refused(const char *bytes, gsize n_bytes, AwErrorCode code, const char *parts)
{
  GError *error = NULL;
  g_assert_null(aw_csv_parse(bytes, n_bytes, "t.csv", ',', &error));
  aw_check_error(&error, code, parts);
}

static void plain(void)
{
  g_autoptr(AwCsv) csv = parse("a,b ,c\n1,two,3.5\n\n 4,,x y\n", ',');
  g_assert_cmpstr(aw_csv_name(csv), ==, "t.csv");
  g_assert_cmpuint(aw_csv_n_rows(csv), ==, 2);
  g_assert_cmpuint(aw_csv_n_columns(csv), ==, 3);
  g_assert_cmpstr(aw_csv_heading(csv, 1), ==, "b");
  g_assert_cmpstr(aw_csv_text(csv, 0, 1), ==, "two");
  g_assert_cmpstr(aw_csv_text(csv, 1, 0), ==, " 4");
  g_assert_cmpstr(aw_csv_text(csv, 1, 1), ==, "");
  g_assert_cmpstr(aw_csv_text(csv, 1, 2), ==, "x y");
  g_assert_cmpuint(aw_csv_line(csv, 0), ==, 2);
  g_assert_cmpuint(aw_csv_line(csv, 1), ==, 4);
  g_assert_null(aw_csv_comments(csv)[0]);
}

static void quoting(void)
{
  g_autoptr(AwCsv) csv = parse("\"a\",\"b,c\"\r\n\"say \"\"hi\"\"\",\"two\r\nlines\"\r\n\"\",\"\"\"\"\r\n", ',');
  g_assert_cmpstr(aw_csv_heading(csv, 1), ==, "b,c");
  g_assert_cmpstr(aw_csv_text(csv, 0, 0), ==, "say \"hi\"");
  g_assert_cmpstr(aw_csv_text(csv, 0, 1), ==, "two\r\nlines");
  g_assert_cmpstr(aw_csv_text(csv, 1, 0), ==, "");
  g_assert_cmpstr(aw_csv_text(csv, 1, 1), ==, "\"");
  g_assert_cmpuint(aw_csv_line(csv, 1), ==, 4);
}

static void line_ends_and_bom(void)
{
  static const char *const ends[] = { "\n", "\r\n", "\r" };
  for (gsize i = 0; i < G_N_ELEMENTS(ends); i++) {
    const char *e = ends[i];
    g_autofree char *text = g_strconcat("\xef\xbb\xbf# first", e, "#second", e, e, "a;b", e, "1;2", e, e, "3;#4", NULL);
    g_autoptr(AwCsv) csv = parse(text, ';');
    g_assert_cmpstr(aw_csv_comments(csv)[0], ==, "first");
    g_assert_cmpstr(aw_csv_comments(csv)[1], ==, "second");
    g_assert_null(aw_csv_comments(csv)[2]);
    g_assert_cmpstr(aw_csv_heading(csv, 0), ==, "a");
    g_assert_cmpuint(aw_csv_n_rows(csv), ==, 2);
    g_assert_cmpstr(aw_csv_text(csv, 1, 1), ==, "#4");
    g_assert_cmpuint(aw_csv_line(csv, 1), ==, 7);
  }
}

static void hash_after_header_is_data(void)
{
  g_autoptr(AwCsv) csv = parse("a\tb\n#1\t2\n", '\t');
  g_assert_cmpuint(aw_csv_n_rows(csv), ==, 1);
  g_assert_cmpstr(aw_csv_text(csv, 0, 0), ==, "#1");
}

static void blanks_as_separator(void)
{
  g_autoptr(AwCsv) csv = parse("a b c\n1 2 \"3 4\"\n\n  \n", ' ');
  g_assert_cmpuint(aw_csv_n_rows(csv), ==, 2);
  g_assert_cmpstr(aw_csv_text(csv, 0, 2), ==, "3 4");
  g_assert_cmpstr(aw_csv_text(csv, 1, 2), ==, "");
}

static void header_alone(void)
{
  g_autoptr(AwCsv) csv = parse("a,b", ',');
  g_assert_cmpuint(aw_csv_n_rows(csv), ==, 0);
  g_assert_cmpuint(aw_csv_n_columns(csv), ==, 2);
}

static void refused(void)
{
  assert_refused("", 0, AW_ERROR_EMPTY, "t.csv is empty");
  assert_refused("# only\n\n", 8, AW_ERROR_EMPTY, "no header row");
  assert_refused("a,b\n1,2\n1\n", 10, AW_ERROR_FORMAT, "t.csv, line 3: 1 fields where the table has 2");
  assert_refused("a,b\n1,2,3\n", 10, AW_ERROR_FORMAT, "t.csv, line 2: 3 fields");
  assert_refused("a,b, a\n", 7, AW_ERROR_FORMAT, "t.csv, line 1: column 'a' stands twice");
  assert_refused("a,b\n1,\"2\n3\n", 11, AW_ERROR_FORMAT, "t.csv, line 2: a quote is opened and never closed");
  assert_refused("a,b\n\"1\"x,2\n", 11, AW_ERROR_FORMAT, "line 2: there is text between a closing quote");
  assert_refused("a,b\n1\"1,2\n", 10, AW_ERROR_FORMAT, "line 2: a quote stands inside a field");
  assert_refused("a,b\r1,2\r1,\xff\r", 12, AW_ERROR_FORMAT, "t.csv, line 3: bytes that are not UTF-8");
  assert_refused("a,b\n1,\0\n", 8, AW_ERROR_FORMAT, "t.csv, line 2: a NUL byte");
  assert_refused("\xff\xfe"
                 "a\0",
                 4, AW_ERROR_FORMAT, "t.csv is UTF-16 text");
  g_autofree char *wide = g_strnfill(10001, ',');
  assert_refused(wide, 10001, AW_ERROR_FORMAT, "more than 10000 fields");
}

static void without_header(void)
{
  static const char *const headings[] = { "x", "y", NULL };
  GError *error = NULL;
  g_autoptr(AwCsv) csv = aw_csv_parse_bare("# note\n1;2\n3;\"4\"", 16, "t.csv", ';', headings, &error);
  g_assert_no_error(error);
  g_assert_cmpuint(aw_csv_n_columns(csv), ==, 2);
  g_assert_cmpuint(aw_csv_n_rows(csv), ==, 2);
  g_assert_cmpstr(aw_csv_comments(csv)[0], ==, "note");
  g_assert_cmpstr(aw_csv_heading(csv, 0), ==, "x");
  g_assert_cmpint(aw_csv_find(csv, "y"), ==, 1);
  g_assert_cmpstr(aw_csv_text(csv, 1, 1), ==, "4");
  g_assert_cmpuint(aw_csv_line(csv, 0), ==, 2);
  g_autoptr(AwCsv) empty = aw_csv_parse_bare("", 0, "t.csv", ';', headings, &error);
  g_assert_cmpuint(aw_csv_n_rows(empty), ==, 0);
  g_assert_null(aw_csv_parse_bare("1;2\n3\n", 6, "t.csv", ';', headings, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "t.csv, line 2: 1 fields where the table has 2");
}

static void columns(void)
{
  g_autoptr(AwCsv) csv = parse("x,y\n1,2\n", ',');
  gsize column = 9;
  GError *error = NULL;
  g_assert_cmpint(aw_csv_find(csv, "y"), ==, 1);
  g_assert_cmpint(aw_csv_find(csv, "Y"), ==, -1);
  g_assert_true(aw_csv_need(csv, "x", &column, &error));
  g_assert_cmpuint(column, ==, 0);
  g_assert_false(aw_csv_need(csv, "z", &column, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "t.csv has no column 'z'; its columns are: x, y");
  g_autoptr(AwCsv) other = parse("x;y\n1;2\n", ',');
  g_assert_false(aw_csv_need(other, "x", &column, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND,
                 "its columns are: x;y (are its fields parted by something else than ','?)");
}

static void numbers(void)
{
  g_autoptr(AwCsv) csv = parse("n,x\n7,1.25\n8,\"1,25\"\n", ',');
  double x = 0;
  gint64 n = 0;
  GError *error = NULL;
  g_assert_true(aw_csv_double(csv, 0, 1, &x, &error));
  g_assert_cmpfloat(x, ==, 1.25);
  g_assert_true(aw_csv_int(csv, 0, 0, 1, 9, &n, &error));
  g_assert_cmpint(n, ==, 7);
  g_assert_false(aw_csv_double(csv, 1, 1, &x, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "t.csv, line 3, column x: '1,25' has a decimal comma");
  g_assert_false(aw_csv_int(csv, 1, 0, 1, 7, &n, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "t.csv, line 3, column n: '8' is outside 1 to 7");
}

static void append(void)
{
  static const struct {
    const char *text, *field;
  } cases[] = { { "plain", "plain" },
                { "a,b", "\"a,b\"" },
                { "a;b", "a;b" },
                { "say \"hi\"", "\"say \"\"hi\"\"\"" },
                { "", "" },
                { "two\nlines", "\"two\nlines\"" },
                { "#1", "\"#1\"" },
                { " x", "\" x\"" },
                { "x ", "\"x \"" },
                { "cr\r", "\"cr\r\"" },
                { "\xef\xbb\xbfx", "\"\xef\xbb\xbfx\"" } };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autoptr(GString) out = g_string_new(NULL);
    aw_csv_append(out, cases[i].text, ',');
    g_assert_cmpstr(out->str, ==, cases[i].field);
    g_string_prepend(out, "h,k\n");
    g_string_append(out, ",end\n");
    g_autoptr(AwCsv) back = parse(out->str, ',');
    g_assert_cmpstr(aw_csv_text(back, 0, 0), ==, cases[i].text);
  }
}

static void files(void)
{
  char *folder = aw_scratch_new();
  GError *error = NULL;
  g_autofree char *path = aw_scratch_write(folder, "scan.csv", "a,b\n1,2\n");
  g_autoptr(AwCsv) csv = aw_csv_read(path, ',', &error);
  g_assert_no_error(error);
  g_assert_cmpstr(aw_csv_name(csv), ==, path);
  g_assert_cmpstr(aw_csv_text(csv, 0, 1), ==, "2");
  g_autofree char *none = g_build_filename(folder, "none.csv", NULL);
  g_assert_null(aw_csv_read(none, ',', &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "none.csv");
  g_assert_null(aw_csv_read(folder, ',', &error));
  aw_check_error(&error, AW_ERROR_IO, folder);
  aw_scratch_remove(folder);
}

/* A million rows in well under ten seconds even on a slow shared machine; typical is a tenth of a second. */
static void million_rows(void)
{
  GString *text = g_string_new("file,x\n");
  for (int i = 0; i < 1000000; i++)
    g_string_append_printf(text, "frame-%d.tif,%d\n", i, i);
  gint64 began = g_get_monotonic_time();
  g_autoptr(AwCsv) csv = parse(text->str, ',');
  g_assert_cmpint(g_get_monotonic_time() - began, <, 10 * G_USEC_PER_SEC);
  g_test_message("parsed in %d ms", (int)((g_get_monotonic_time() - began) / 1000));
  g_assert_cmpuint(aw_csv_n_rows(csv), ==, 1000000);
  g_assert_cmpstr(aw_csv_text(csv, 999999, 1), ==, "999999");
  g_assert_cmpuint(aw_csv_line(csv, 999999), ==, 1000001);
  g_string_free(text, TRUE);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/base/csv/plain", plain);
  aw_check_add("/base/csv/quoting", quoting);
  aw_check_add("/base/csv/line_ends_and_bom", line_ends_and_bom);
  aw_check_add("/base/csv/hash_after_header_is_data", hash_after_header_is_data);
  aw_check_add("/base/csv/blanks_as_separator", blanks_as_separator);
  aw_check_add("/base/csv/header_alone", header_alone);
  aw_check_add("/base/csv/refused", refused);
  aw_check_add("/base/csv/without_header", without_header);
  aw_check_add("/base/csv/columns", columns);
  aw_check_add("/base/csv/numbers", numbers);
  aw_check_add("/base/csv/append", append);
  aw_check_add("/base/csv/files", files);
  aw_check_add("/base/csv/million_rows", million_rows);
  return g_test_run();
}

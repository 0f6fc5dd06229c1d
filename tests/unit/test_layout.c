/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/layout.h"

#include <string.h>

#include "../support/check.h"

#define COLUMNS "[column.a]\nvalue=x\n[column.b]\nvalue=y\n"

static void accept(const char *text)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(AwLayout) layout = aw_layout_parse(text, strlen(text), "l.layout", &error);
  g_assert_no_error(error);
  g_assert_nonnull(layout);
}

static void refuse(const char *text, AwErrorCode code, const char *parts)
{
  GError *error = NULL;
  g_assert_null(aw_layout_parse(text, strlen(text), "l.layout", &error));
  aw_check_error(&error, code, parts);
}

static void built_in(void)
{
  static const char *const names[] = { "csv", "tsv" };
  for (gsize i = 0; i < G_N_ELEMENTS(names); i++) {
    g_autoptr(GError) error = NULL;
    g_autoptr(AwLayout) layout = aw_layout_load(names[i], &error);
    g_assert_no_error(error);
    g_assert_cmpstr(aw_layout_name(layout), ==, names[i]);
    g_assert_null(aw_layout_beside(layout, "list"));
  }
}

static void from_file(void)
{
  char *folder = aw_scratch_new();
  GError *error = NULL;
  g_autofree char *path = aw_scratch_write(folder, "l.layout", "[layout]\nname=mine\ncomments=beside\n" COLUMNS);
  g_autoptr(AwLayout) layout = aw_layout_load(path, &error);
  g_assert_no_error(error);
  g_assert_cmpstr(aw_layout_name(layout), ==, "mine");
  g_autofree char *beside = aw_layout_beside(layout, "list.dat");
  g_assert_cmpstr(beside, ==, "list.dat.txt");
  g_assert_null(aw_layout_load("pine", &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "there is no layout 'pine': csv and tsv are built in");
  aw_scratch_remove(folder);
}

/* The example of docs/formats.md: the indented lines from [layout] to the table below it. */
static void documented_example(void)
{
  g_autofree char *page = NULL;
  g_assert_true(g_file_get_contents("docs/formats.md", &page, NULL, NULL));
  char *begin = strstr(page, "    [layout]\n");
  g_assert_nonnull(begin);
  *strstr(begin, "\n|") = '\0';
  g_auto(GStrv) lines = g_strsplit(begin, "\n    ", -1);
  g_autofree char *text = g_strjoinv("\n", lines);
  accept(g_strchug(text));
}

static void everything_set(void)
{
  accept("[layout]\nname=n\nabout=for people\nseparator=space\nline-ending=crlf\nheader=no\ncomments=beside\n"
         "[limits]\nx-min-um=-5\nx-max-um=-5\ny-min-um=0\ny-max-um=1e7\n"
         "[column.a]\nvalue=x\nheading=A (mm)\nunit=mm\nsign=-1\noffset=-3.5\ndecimals=12\n"
         "[column.b]\nvalue=y\nunit=step\nstep-um=0.1\nsign=+1\ndecimals=0\n[column.c]\nvalue=scan_x\nunit=nm\n"
         "[column.d]\nvalue=scan_y\nunit=m\n[column.e]\nvalue=target\nfirst=0\n[column.f]\nvalue=nucleus\n"
         "[column.g]\nvalue=particles\n[column.h]\nvalue=arm\n[column.i]\nvalue=text\ntext=on; off\n");
}

static void bad_head(void)
{
  refuse(COLUMNS, AW_ERROR_NOT_FOUND, "l.layout has no key 'name' in group [layout]");
  refuse("[layout]\nname=n\nseparator=pipe\n" COLUMNS, AW_ERROR_FORMAT,
         "l.layout, group [layout], key separator: 'pipe' is none of comma, semicolon, tab, space");
  refuse("[layout]\nname=n\nline-ending=cr\n" COLUMNS, AW_ERROR_FORMAT, "key line-ending: 'cr' is none of lf, crlf");
  refuse("[layout]\nname=n\ncomments=none\n" COLUMNS, AW_ERROR_FORMAT,
         "key comments: 'none' is none of in-file, beside");
  refuse("[layout]\nname=n\nheader=maybe\n" COLUMNS, AW_ERROR_FORMAT, "key header: 'maybe' is neither yes nor no");
  refuse("[layout]\nname=a\\nb\n" COLUMNS, AW_ERROR_FORMAT, "key name: the text has a line break");
  refuse("[layout]\nname=n\nseperator=tab\n" COLUMNS, AW_ERROR_FORMAT,
         "l.layout: there is no use for key 'seperator' in group [layout]");
  refuse("[layout]\nname=n\n" COLUMNS "[limit]\nx-min-um=0\n", AW_ERROR_FORMAT, "no use for a group [limit]");
  refuse("nonsense", AW_ERROR_FORMAT, "l.layout is no key file");
}

static void bad_limits(void)
{
  refuse("[layout]\nname=n\n[limits]\nx-min-um=5\nx-max-um=4\n" COLUMNS, AW_ERROR_RANGE,
         "group [limits], key x-max-um: '4' is outside 5 to 10000000");
  refuse("[layout]\nname=n\n[limits]\ny-min-um=-1e8\n" COLUMNS, AW_ERROR_RANGE, "key y-min-um: '-1e8' is outside");
  refuse("[layout]\nname=n\n[limits]\ny-max-um=1,5\n" COLUMNS, AW_ERROR_FORMAT, "'1,5' has a decimal comma");
  refuse("[layout]\nname=n\n[limits]\nx-max-um=inf\n" COLUMNS, AW_ERROR_FORMAT, "'inf' is not a finite number");
}

#define HEAD "[layout]\nname=n\n"

static void bad_columns(void)
{
  refuse(HEAD, AW_ERROR_NOT_FOUND, "needs a group [column.NAME] with value=x and one with value=y");
  refuse(HEAD "[column.a]\nvalue=x\n", AW_ERROR_NOT_FOUND, "value=y");
  refuse(HEAD "[column.a]\nheading=b\n", AW_ERROR_NOT_FOUND, "l.layout has no key 'value' in group [column.a]");
  refuse(HEAD "[column.a]\nvalue=z\n", AW_ERROR_FORMAT,
         "group [column.a], key value: 'z' is none of x, y, scan_x, scan_y, target, nucleus, arm, particles, text");
  refuse(HEAD COLUMNS "[column.c]\nvalue=text\n", AW_ERROR_NOT_FOUND, "no key 'text' in group [column.c]");
  refuse(HEAD COLUMNS "[column.c]\nvalue=text\ntext=a\\tb\n", AW_ERROR_FORMAT, "key text: the text has a line break");
  refuse(HEAD COLUMNS "[column.c]\nvalue=arm\nheading=a\n", AW_ERROR_FORMAT,
         "l.layout: the heading of column 'a' stands in another column, too");
  refuse(HEAD COLUMNS "[column.c]\nvalue=arm\nheading=a\\nb\n", AW_ERROR_FORMAT, "key heading: the text has a line");
  refuse(HEAD COLUMNS "[column. ]\nvalue=arm\n", AW_ERROR_FORMAT, "heading of column ''|(or is empty)");
  refuse(HEAD COLUMNS "[column.c]\nvalue=x\nunit=mm\n", AW_ERROR_FORMAT,
         "l.layout: the value of column 'c' stands in another column, too");
  refuse(HEAD COLUMNS "[column.c]\nvalue=arm\nunit=mm\n", AW_ERROR_FORMAT, "no use for key 'unit'");
  refuse(HEAD COLUMNS "[column.c]\nvalue=target\nfirst=x\n", AW_ERROR_FORMAT, "'x' is not a whole number");
}

static void bad_positions(void)
{
  refuse(HEAD "[column.c]\nvalue=x\nunit=inch\n", AW_ERROR_FORMAT, "key unit: 'inch' is none of um, mm, nm, m, step");
  refuse(HEAD "[column.c]\nvalue=x\nunit=step\n", AW_ERROR_NOT_FOUND, "no key 'step-um' in group [column.c]");
  refuse(HEAD "[column.c]\nvalue=x\nunit=step\nstep-um=0\n", AW_ERROR_RANGE, "'0' is outside 1e-06 to 10000");
  refuse(HEAD "[column.c]\nvalue=x\nunit=mm\nstep-um=1\n[column.d]\nvalue=y\n", AW_ERROR_FORMAT,
         "no use for key 'step-um'");
  refuse(HEAD "[column.c]\nvalue=x\nsign=0\n", AW_ERROR_FORMAT, "key sign: '0' is none of +1, 1, -1");
  refuse(HEAD "[column.c]\nvalue=x\noffset=nan\n", AW_ERROR_FORMAT, "'nan' is not a finite number");
  refuse(HEAD "[column.c]\nvalue=x\noffset=1e13\n", AW_ERROR_RANGE, "'1e13' is outside");
  refuse(HEAD "[column.c]\nvalue=x\ndecimals=13\n", AW_ERROR_RANGE, "key decimals: '13' is outside 0 to 12");
  refuse(HEAD "[column.c]\nvalue=x\ndecimals=-1\n", AW_ERROR_RANGE, "'-1' is outside 0 to 12");
}

static void too_many_columns(void)
{
  g_autoptr(GString) text = g_string_new(HEAD COLUMNS);
  for (int i = 0; i < 98; i++)
    g_string_append_printf(text, "[column.c%d]\nvalue=text\ntext=t\n", i);
  accept(text->str);
  g_string_append(text, "[column.last]\nvalue=arm\n");
  refuse(text->str, AW_ERROR_RANGE, "l.layout has 101 columns; the limit is 100");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/plan/layout/built_in", built_in);
  aw_check_add("/plan/layout/from_file", from_file);
  aw_check_add("/plan/layout/documented_example", documented_example);
  aw_check_add("/plan/layout/everything_set", everything_set);
  aw_check_add("/plan/layout/bad_head", bad_head);
  aw_check_add("/plan/layout/bad_limits", bad_limits);
  aw_check_add("/plan/layout/bad_columns", bad_columns);
  aw_check_add("/plan/layout/bad_positions", bad_positions);
  aw_check_add("/plan/layout/too_many_columns", too_many_columns);
  return g_test_run();
}

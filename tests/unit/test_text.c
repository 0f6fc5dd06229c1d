/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "../support/check.h"

static void to_double(void)
{
  static const struct {
    const char *text;
    double value;
  } good[] = { { "0", 0 },           { "-17.25", -17.25 }, { " 3.5\t", 3.5 }, { "1e-3", 1e-3 },
               { "+4.75E2", 475.0 }, { ".5", 0.5 },        { "7.", 7 },       { "1234567.890625", 1234567.890625 } };
  for (gsize i = 0; i < G_N_ELEMENTS(good); i++) {
    double value = NAN;
    g_autoptr(GError) error = NULL;
    g_assert_true(aw_text_to_double(good[i].text, "here", &value, &error));
    g_assert_no_error(error);
    g_assert_cmpfloat(value, ==, good[i].value);
  }
}

static void to_double_refused(void)
{
  static const char *const bad[] = { "nan",
                                     "NaN",
                                     "inf",
                                     "-Infinity",
                                     "0x10",
                                     "12 um",
                                     "1.2.3",
                                     "--1",
                                     "e5",
                                     "1e",
                                     "1e99999",
                                     "+",
                                     ".",
                                     "1 2",
                                     "1'000",
                                     "\xe2\x88\x92"
                                     "1" };
  double value = 0;
  GError *error = NULL;
  for (gsize i = 0; i < G_N_ELEMENTS(bad); i++) {
    g_assert_false(aw_text_to_double(bad[i], "scan.csv, line 3, column x", &value, &error));
    aw_check_error(&error, AW_ERROR_FORMAT, "scan.csv, line 3, column x: '|is not a finite number");
  }
  g_assert_false(aw_text_to_double("3,25", "here", &value, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "here: '3,25' has a decimal comma; write a decimal point");
  g_assert_false(aw_text_to_double("1,234,567", "here", &value, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "'1,234,567' is not a finite number");
  g_assert_false(aw_text_to_double("  ", "here", &value, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "here: a number is missing");
}

static void message_is_one_short_line(void)
{
  double value = 0;
  GError *error = NULL;
  g_autofree char *lines =
      g_strconcat("a\nb\xff", "yyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyy", NULL);
  g_assert_false(aw_text_to_double(lines, "here", &value, &error));
  g_assert_null(strchr(error->message, '\n'));
  g_assert_true(g_utf8_validate(error->message, -1, NULL));
  aw_check_error(&error, AW_ERROR_FORMAT, "a b|yyy...'");
}

static void to_int(void)
{
  gint64 value = 0;
  GError *error = NULL;
  g_assert_true(aw_text_to_int(" -12 ", "here", -12, 5, &value, &error));
  g_assert_cmpint(value, ==, -12);
  g_assert_true(aw_text_to_int("9223372036854775807", "here", 0, G_MAXINT64, &value, &error));
  g_assert_cmpint(value, ==, G_MAXINT64);
  g_assert_false(aw_text_to_int("6", "here", -12, 5, &value, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "here: '6' is outside -12 to 5");
  g_assert_false(aw_text_to_int("-13", "here", -12, 5, &value, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "'-13'");
  g_assert_false(aw_text_to_int("9223372036854775808", "here", 0, G_MAXINT64, &value, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "9223372036854775808");
  static const char *const bad[] = { "", "-", "1.0", "0x1", "1e3", "seven", "1 2" };
  for (gsize i = 0; i < G_N_ELEMENTS(bad); i++) {
    g_assert_false(aw_text_to_int(bad[i], "here", -5, 5, &value, &error));
    aw_check_error(&error, AW_ERROR_FORMAT, "here|is not a whole number");
  }
}

static void assert_decimals(double value, int decimals, const char *expected)
{
  g_autofree char *text = aw_text_from_double(value, decimals);
  g_assert_cmpstr(text, ==, expected);
}

static void from_double(void)
{
  assert_decimals(1234.5678, 2, "1234.57");
  assert_decimals(-0.0004, 3, "0.000");
  assert_decimals(-0.0, 0, "0");
  assert_decimals(-0.0006, 3, "-0.001");
  assert_decimals(17, 0, "17");
  assert_decimals(1e7, 12, "10000000.000000000000");
  assert_decimals(NAN, 3, "nan");
  assert_decimals(-NAN, 3, "nan");
  assert_decimals(-INFINITY, 3, "-inf");
  g_autofree char *huge = aw_text_from_double(-DBL_MAX, 20);
  g_assert_cmpuint(strlen(huge), ==, 1 + 309 + 1 + 20);
}

static void from_double_exact(void)
{
  static const struct {
    double value;
    const char *text;
  } cases[] = { { 0.1, "0.1" },
                { 1.0 / 3, "0.3333333333333333" },
                { 5e-324, "5e-324" },
                { 1e22, "1e+22" },
                { -2.5, "-2.5" },
                { -0.0, "0" },
                { 0x1.fffffffffffffp+0, "1.9999999999999998" },
                { INFINITY, "inf" } };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autofree char *text = aw_text_from_double_exact(cases[i].value);
    g_assert_cmpstr(text, ==, cases[i].text);
    g_assert_cmpfloat(g_ascii_strtod(text, NULL), ==, cases[i].value);
  }
}

static void to_time(void)
{
  /* Seconds by `date -u -d TEXT +%s` (GNU coreutils). */
  static const struct {
    const char *text;
    double unix_s;
  } good[] = { { "1970-01-01T00:00:00Z", 0 },
               { "2031-05-04T12:00:00Z", 1935662400 },
               { "2031-05-04t14:30:00.25+02:30", 1935662400.25 },
               { " 2031-05-04 11:00:00-01:00 ", 1935662400 },
               { "2000-02-29T23:59:59z", 951868799 },
               { "2016-12-31T23:59:60Z", 1483228800 },
               { "1969-12-31T23:59:59.5Z", -0.5 } };
  for (gsize i = 0; i < G_N_ELEMENTS(good); i++) {
    double unix_s = NAN;
    g_autoptr(GError) error = NULL;
    g_assert_true(aw_text_to_time(good[i].text, "here", &unix_s, &error));
    g_assert_no_error(error);
    g_assert_cmpfloat_with_epsilon(unix_s, good[i].unix_s, 1e-6);
  }
}

static void to_time_refused(void)
{
  static const char *const bad[] = { "",
                                     "yesterday",
                                     "2031-05-04",
                                     "2031-02-29T12:00:00Z",
                                     "2031-13-01T00:00:00Z",
                                     "2031-05-04T24:00:00Z",
                                     "2031-05-04T12:60:00Z",
                                     "2031-05-04T12:00:61Z",
                                     "2031-05-04T12:00Z",
                                     "31-05-04T12:00:00Z",
                                     "2031-05-04T12:00:00.Z",
                                     "2031-05-04T12:00:00+0200",
                                     "2031-05-04T12:00:00+24:00",
                                     "2031-05-04T12:00:00Zx",
                                     "0000-05-04T12:00:00Z",
                                     "2031/05/04T12:00:00Z" };
  double unix_s = 0;
  GError *error = NULL;
  for (gsize i = 0; i < G_N_ELEMENTS(bad); i++) {
    g_assert_false(aw_text_to_time(bad[i], "scan.csv, line 2", &unix_s, &error));
    aw_check_error(&error, AW_ERROR_FORMAT, "scan.csv, line 2: '|is not a time such as");
  }
  g_assert_false(aw_text_to_time("2031-05-04T12:00:00.5", "here", &unix_s, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "has no time zone");
}

static void assert_time(double unix_s, const char *expected)
{
  g_autofree char *text = aw_text_from_time(unix_s);
  g_assert_cmpstr(text, ==, expected);
}

static void from_time(void)
{
  assert_time(1935662400, "2031-05-04T12:00:00Z");
  assert_time(1935662400.25, "2031-05-04T12:00:00.250Z");
  assert_time(1935662399.9999, "2031-05-04T12:00:00Z");
  assert_time(-0.5, "1969-12-31T23:59:59.500Z");
  assert_time(-1, "1969-12-31T23:59:59Z");
  assert_time(NAN, "unknown");
  assert_time(1e15, "unknown");
  assert_time(-9e11, "unknown");
}

static void json(void)
{
  g_autofree char *text = aw_text_json("a \"b\" \\ \n\t\x01 \xc2\xb5m \xff");
  g_assert_cmpstr(text, ==, "\"a \\\"b\\\" \\\\ \\n\\u0009\\u0001 \xc2\xb5m \xef\xbf\xbd\"");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/base/text/to_double", to_double);
  aw_check_add("/base/text/to_double_refused", to_double_refused);
  aw_check_add("/base/text/message_is_one_short_line", message_is_one_short_line);
  aw_check_add("/base/text/to_int", to_int);
  aw_check_add("/base/text/from_double", from_double);
  aw_check_add("/base/text/from_double_exact", from_double_exact);
  aw_check_add("/base/text/to_time", to_time);
  aw_check_add("/base/text/to_time_refused", to_time_refused);
  aw_check_add("/base/text/from_time", from_time);
  aw_check_add("/base/text/json", json);
  return g_test_run();
}

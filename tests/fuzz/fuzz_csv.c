/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a table: no crash, and a table that was read comes back the same after it is written. */
#include <string.h>

#include "base/csv.h"
#include "base/text.h"
#include "fuzz.h"

static void append_line(GString *out, const AwCsv *csv, gint64 row, char separator)
{
  for (gsize i = 0; i < aw_csv_n_columns(csv); i++) {
    if (i)
      g_string_append_c(out, separator);
    aw_csv_append(out, row < 0 ? aw_csv_heading(csv, i) : aw_csv_text(csv, (gsize)row, i), separator);
  }
  g_string_append_c(out, '\n');
}

static void compare(const AwCsv *csv, const AwCsv *back)
{
  g_assert_cmpuint(aw_csv_n_rows(csv), ==, aw_csv_n_rows(back));
  for (gsize i = 0; i < aw_csv_n_columns(csv); i++) {
    g_assert_cmpstr(aw_csv_heading(csv, i), ==, aw_csv_heading(back, i));
    for (gsize row = 0; row < aw_csv_n_rows(csv); row++)
      g_assert_cmpstr(aw_csv_text(csv, row, i), ==, aw_csv_text(back, row, i));
  }
}

/* A lone column may hold fields that would be written as empty lines, which reading skips. */
static void check_round_trip(const AwCsv *csv, char separator)
{
  if (aw_csv_n_columns(csv) < 2)
    return;
  g_autoptr(GString) out = g_string_new(NULL);
  for (gint64 row = -1; row < (gint64)aw_csv_n_rows(csv); row++)
    append_line(out, csv, row, separator);
  g_autoptr(GError) error = NULL;
  g_autoptr(AwCsv) back = aw_csv_parse(out->str, out->len, "back", separator, &error);
  if (!back)
    g_assert_cmpstr(error->message, ==, NULL); /* shows the message */
  compare(csv, back);
}

void fuzz_csv(const uint8_t *bytes, size_t n)
{
  static const char separators[] = { ',', ';', '\t', ' ' };
  if (n == 0)
    return;
  char separator = separators[bytes[0] % 4];
  g_autoptr(GError) error = NULL;
  g_autoptr(AwCsv) csv = aw_csv_parse((const char *)bytes + 1, n - 1, "fuzz", separator, &error);
  g_assert_true((csv == NULL) == (error != NULL));
  for (gsize row = 0; csv && row < aw_csv_n_rows(csv); row++)
    for (gsize i = 0; i < aw_csv_n_columns(csv); i++) {
      double value, unix_s;
      aw_csv_double(csv, row, i, &value, NULL);
      aw_text_to_time(aw_csv_text(csv, row, i), "fuzz", &unix_s, NULL);
      g_assert_cmpuint(aw_csv_line(csv, row), >, 0);
    }
  if (csv)
    check_round_trip(csv, separator);
}

FUZZ_ENTRY(csv)

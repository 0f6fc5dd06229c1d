/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"

#include <errno.h>
#include <float.h>
#include <math.h>
#include <string.h>

#include "base/error.h"

#define SHOWN_CHARS 60
#define DOUBLE_BYTES 400 /* the largest double has 309 places before the point, and we print at most 20 after it */

/* A copy of `text` fit for a message: valid UTF-8, one line, not endless. */
static char *shown(const char *text)
{
  g_autofree char *valid = g_utf8_make_valid(text, -1);
  for (char *c = valid; *c; c++)
    if (g_ascii_iscntrl(*c))
      *c = ' ';
  if (g_utf8_strlen(valid, -1) <= SHOWN_CHARS)
    return g_steal_pointer(&valid);
  g_autofree char *head = g_utf8_substring(valid, 0, SHOWN_CHARS);
  return g_strconcat(head, "...", NULL);
}

static gboolean fail(GError **error, AwErrorCode code, const char *where, const char *text, const char *why)
{
  g_autofree char *found = shown(text);
  g_set_error(error, AW_ERROR, (int)code, "%s: '%s' %s", where, found, why);
  return FALSE;
}

/* All of `text` as a finite decimal number; hexadecimal and words are no numbers here. */
static gboolean parse_double(const char *text, double *value)
{
  char *end = NULL;
  if (!*text || strspn(text, "0123456789+-.eE") != strlen(text))
    return FALSE;
  *value = g_ascii_strtod(text, &end);
  return end != text && !*end && isfinite(*value);
}

gboolean aw_text_to_double(const char *text, const char *where, double *value, GError **error)
{
  g_autofree char *bare = g_strstrip(g_strdup(text));
  if (parse_double(bare, value))
    return TRUE;
  if (!*bare) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: a number is missing", where);
    return FALSE;
  }
  g_autofree char *pointed = g_strdelimit(g_strdup(bare), ",", '.');
  double ignored = 0;
  if (strcmp(pointed, bare) != 0 && parse_double(pointed, &ignored))
    return fail(error, AW_ERROR_FORMAT, where, bare, "has a decimal comma; write a decimal point");
  return fail(error, AW_ERROR_FORMAT, where, bare, "is not a finite number");
}

gboolean aw_text_to_int(const char *text, const char *where, gint64 min, gint64 max, gint64 *value, GError **error)
{
  g_autofree char *bare = g_strstrip(g_strdup(text));
  const char *digits = bare + (*bare == '-' || *bare == '+');
  if (!*digits || strspn(digits, "0123456789") != strlen(digits))
    return fail(error, AW_ERROR_FORMAT, where, bare, "is not a whole number");
  errno = 0;
  gint64 found = g_ascii_strtoll(bare, NULL, 10);
  if (errno || found < min || found > max) {
    g_autofree char *why = g_strdup_printf("is outside %" G_GINT64_FORMAT " to %" G_GINT64_FORMAT, min, max);
    return fail(error, AW_ERROR_RANGE, where, bare, why);
  }
  *value = found;
  return TRUE;
}

static char *non_finite(double value)
{
  return g_strdup(isnan(value) ? "nan" : value > 0 ? "inf" : "-inf");
}

char *aw_text_from_double(double value, int decimals)
{
  g_return_val_if_fail(decimals >= 0 && decimals <= 20, NULL);
  if (!isfinite(value))
    return non_finite(value);
  char format[8], buffer[DOUBLE_BYTES];
  g_snprintf(format, sizeof format, "%%.%df", decimals);
  g_ascii_formatd(buffer, sizeof buffer, format, value);
  gboolean minus_zero = *buffer == '-' && strspn(buffer, "-0.") == strlen(buffer);
  return g_strdup(buffer + (minus_zero ? 1 : 0));
}

/* Any decimal of 15 digits survives a normal double, so %.15g already gives the shortest text if one that short is
 * exact; only subnormal numbers can do with less. */
char *aw_text_from_double_exact(double value)
{
  if (!isfinite(value))
    return non_finite(value);
  char format[8], buffer[DOUBLE_BYTES];
  for (int digits = fabs(value) < DBL_MIN ? 1 : 15; digits <= 17; digits++) {
    g_snprintf(format, sizeof format, "%%.%dg", digits);
    g_ascii_formatd(buffer, sizeof buffer, format, value);
    if (g_ascii_strtod(buffer, NULL) == value)
      break;
  }
  return g_strdup(value == 0 ? "0" : buffer);
}

/* Reads exactly `n` digits at *at and moves it on. */
static gboolean take_digits(const char **at, int n, int *value)
{
  *value = 0;
  for (int i = 0; i < n; i++) {
    if (!g_ascii_isdigit(**at))
      return FALSE;
    *value = *value * 10 + g_ascii_digit_value(*(*at)++);
  }
  return TRUE;
}

static gboolean take_char(const char **at, const char *any_of)
{
  if (!**at || !strchr(any_of, **at))
    return FALSE;
  (*at)++;
  return TRUE;
}

/* ".25" or nothing. */
static gboolean take_fraction(const char **at, double *fraction)
{
  *fraction = 0;
  if (!take_char(at, "."))
    return TRUE;
  const char *first = *at;
  for (double unit = 0.1; g_ascii_isdigit(**at); unit /= 10)
    *fraction += unit * g_ascii_digit_value(*(*at)++);
  return *at > first;
}

/* "Z" or "+02:00". */
static gboolean take_zone(const char **at, int *offset_min)
{
  *offset_min = 0;
  if (take_char(at, "Zz"))
    return TRUE;
  int sign = **at == '-' ? -1 : 1, hours = 0, minutes = 0;
  if (!take_char(at, "+-") || !take_digits(at, 2, &hours) || !take_char(at, ":") || !take_digits(at, 2, &minutes))
    return FALSE;
  *offset_min = sign * (hours * 60 + minutes);
  return hours <= 23 && minutes <= 59;
}

/* RFC 3339 section 5.6; a blank in place of the T is allowed there, too. */
static gboolean parse_time(const char *at, double *unix_s, gboolean *zone_missing)
{
  int year, month, day, hour, minute, second, offset_min = 0;
  double fraction = 0;
  if (!take_digits(&at, 4, &year) || !take_char(&at, "-") || !take_digits(&at, 2, &month) || !take_char(&at, "-") ||
      !take_digits(&at, 2, &day) || !take_char(&at, "Tt ") || !take_digits(&at, 2, &hour) || !take_char(&at, ":") ||
      !take_digits(&at, 2, &minute) || !take_char(&at, ":") || !take_digits(&at, 2, &second) ||
      !take_fraction(&at, &fraction))
    return FALSE;
  g_autoptr(GDateTime) time = g_date_time_new_utc(year, month, day, hour, minute, 0);
  if (!time || second > 60) /* 60 is a leap second */
    return FALSE;
  *zone_missing = !*at;
  if (!take_zone(&at, &offset_min) || *at)
    return FALSE;
  *unix_s = (double)(g_date_time_to_unix(time) - 60 * offset_min + second) + fraction;
  return TRUE;
}

gboolean aw_text_to_time(const char *text, const char *where, double *unix_s, GError **error)
{
  g_autofree char *bare = g_strstrip(g_strdup(text));
  gboolean zone_missing = FALSE;
  if (parse_time(bare, unix_s, &zone_missing))
    return TRUE;
  return fail(error, AW_ERROR_FORMAT, where, bare,
              zone_missing ? "has no time zone; add Z for UTC or an offset such as +02:00"
                           : "is not a time such as 2031-05-04T12:00:00Z");
}

char *aw_text_from_time(double unix_s)
{
  if (!(fabs(unix_s) < 1e12))
    return g_strdup("unknown");
  gint64 ms = (gint64)floor(unix_s * 1000.0 + 0.5);
  gint64 whole = ms / 1000 - (ms % 1000 < 0);
  g_autoptr(GDateTime) time = g_date_time_new_from_unix_utc(whole);
  if (!time)
    return g_strdup("unknown");
  g_autofree char *fraction = ms == whole * 1000 ? g_strdup("") : g_strdup_printf(".%03d", (int)(ms - whole * 1000));
  return g_strdup_printf("%04d-%02d-%02dT%02d:%02d:%02d%sZ", g_date_time_get_year(time), g_date_time_get_month(time),
                         g_date_time_get_day_of_month(time), g_date_time_get_hour(time), g_date_time_get_minute(time),
                         g_date_time_get_second(time), fraction);
}

char *aw_text_json(const char *text)
{
  g_autofree char *valid = g_utf8_make_valid(text, -1);
  GString *out = g_string_new("\"");
  for (const char *c = valid; *c; c++)
    if (*c == '"' || *c == '\\')
      g_string_append_printf(out, "\\%c", *c);
    else if (*c == '\n')
      g_string_append(out, "\\n");
    else if ((guchar)*c < 0x20 || *c == 0x7f)
      g_string_append_printf(out, "\\u%04x", (guint)*c);
    else
      g_string_append_c(out, *c);
  g_string_append_c(out, '"');
  return g_string_free(out, FALSE);
}

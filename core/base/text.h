/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_TEXT_H
#define AW_BASE_TEXT_H

#include <glib.h>

/* Numbers and times as text, never locale-dependent. */

/**
 * aw_text_to_double: reads all of `text` (spaces around allowed) as a finite number with a decimal point.
 * where: names the place in errors, such as "scan.csv, line 3, column stage_x_um".
 * AW_ERROR_FORMAT for words, empty text, NaN, infinities and decimal commas (named as such).
 */
gboolean aw_text_to_double(const char *text, const char *where, double *value, GError **error);

/* As aw_text_to_double, for a whole number within min ... max (AW_ERROR_RANGE names the value and both limits). */
gboolean aw_text_to_int(const char *text, const char *where, gint64 min, gint64 max, gint64 *value, GError **error);

/* `value` with `decimals` (0 to 20) places after the point; never "-0"; "nan", "inf", "-inf". Free with g_free. */
char *aw_text_from_double(double value, int decimals);

/* The shortest text that reads back as exactly `value`. Free with g_free. */
char *aw_text_from_double_exact(double value);

/* Reads an RFC 3339 time; gives seconds since 1970-01-01T00:00:00Z. A time without zone is an AW_ERROR_FORMAT. */
gboolean aw_text_to_time(const char *text, const char *where, double *unix_s, GError **error);

/**
 * Seconds since 1970 as RFC 3339 in UTC, such as 2031-05-04T12:00:00Z; milliseconds are written when there are any.
 * "unknown" for NaN and times outside the years 1 to 9999. Free with g_free.
 */
char *aw_text_from_time(double unix_s);

/* A JSON string literal, quotes included; invalid UTF-8 becomes U+FFFD. Free with g_free. */
char *aw_text_json(const char *text);

#endif

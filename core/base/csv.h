/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_CSV_H
#define AW_BASE_CSV_H

#include <glib.h>

/**
 * AwCsv: a table read whole from a text file (RFC 4180 quoting; UTF-8 with or without BOM; LF, CRLF or CR lines).
 * `#` lines before the header are kept as comments, one in front of the first character of a line after the header
 * is data. A row with more or fewer fields than the header is an AW_ERROR_FORMAT naming file and line.
 */
typedef struct AwCsv AwCsv;

/* Reads `path`, fields parted by `separator` (',', ';', '\t' or ' '). Free with aw_csv_free. */
AwCsv *aw_csv_read(const char *path, char separator, GError **error);

/* The same from memory; `name` stands for the file in errors. `bytes` need not end in NUL. */
AwCsv *aw_csv_parse(const char *bytes, gsize n_bytes, const char *name, char separator, GError **error);

/* As aw_csv_parse for text without a header row; `headings` (NULL-terminated) name its columns. */
AwCsv *aw_csv_parse_bare(const char *bytes, gsize n_bytes, const char *name, char separator,
                         const char *const *headings, GError **error);
void aw_csv_free(AwCsv *csv);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwCsv, aw_csv_free)

const char *aw_csv_name(const AwCsv *csv);
gsize aw_csv_n_rows(const AwCsv *csv);          /* data rows, without the header */
gsize aw_csv_n_columns(const AwCsv *csv);       /* fields of the header */
gsize aw_csv_line(const AwCsv *csv, gsize row); /* line of the file on which data row `row` begins, from 1 */
const char *aw_csv_heading(const AwCsv *csv, gsize column);
const char *const *aw_csv_comments(const AwCsv *csv); /* NULL-terminated, without `#` and one blank */

/* Index of the column named `heading`, or -1. */
int aw_csv_find(const AwCsv *csv, const char *heading);

/* As aw_csv_find; AW_ERROR_NOT_FOUND lists the columns that are there. A heading that appears twice is an error. */
gboolean aw_csv_need(const AwCsv *csv, const char *heading, gsize *column, GError **error);

/* The field's text, owned by the table. */
const char *aw_csv_text(const AwCsv *csv, gsize row, gsize column);

/* The field as a number by aw_text_to_double / aw_text_to_int; errors name file, line, column, value and limit. */
gboolean aw_csv_double(const AwCsv *csv, gsize row, gsize column, double *value, GError **error);
gboolean aw_csv_int(const AwCsv *csv, gsize row, gsize column, gint64 min, gint64 max, gint64 *value, GError **error);

/* Appends `text` as one field to `out`, quoted when it must be. The caller writes separators and line ends. */
void aw_csv_append(GString *out, const char *text, char separator);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/csv.h"

#include <string.h>

#include "base/error.h"
#include "base/limits.h"
#include "base/output.h"
#include "base/text.h"

#define MAX_COLUMNS 10000
#define MAX_NAMED 24 /* columns that an error lists */
#define BYTE_ORDER_MARK "\xef\xbb\xbf"

/* The file stays in one buffer: fields are unquoted and ended with NUL where they stand, and found by offset. */
struct AwCsv {
  char *name;
  char *text;
  gsize n_bytes;
  char separator;
  guint32 *field; /* offsets into text, rows one after the other, the header first */
  gsize n_fields, fields_room;
  guint32 *line; /* line of the file on which each row begins, header included */
  gsize n_lines, lines_room;
  gsize n_columns;
  GPtrArray *comments;
};

/* Where the parser stands. */
typedef struct {
  AwCsv *csv;
  char *at, *end;
  guint32 line;
} Reader;

G_STATIC_ASSERT(AW_MAX_TEXT_BYTES < G_MAXUINT32);

void aw_csv_free(AwCsv *csv)
{
  if (!csv)
    return;
  g_free(csv->name);
  g_free(csv->text);
  g_free(csv->field);
  g_free(csv->line);
  g_clear_pointer(&csv->comments, g_ptr_array_unref);
  g_free(csv);
}

static gboolean fail(const AwCsv *csv, guint32 line, GError **error, const char *why)
{
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s, line %u: %s", csv->name, line, why);
  return FALSE;
}

static gboolean append_u32(guint32 **list, gsize *n, gsize *room, guint32 value, GError **error)
{
  if (*n == *room) {
    gsize larger = *room ? *room * 2 : 1024;
    guint32 *block = g_try_realloc_n(*list, larger, sizeof **list);
    if (!block) {
      g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "not enough memory for a table of %" G_GSIZE_FORMAT " fields", *n);
      return FALSE;
    }
    *list = block;
    *room = larger;
  }
  (*list)[(*n)++] = value;
  return TRUE;
}

/* Moves past one line end (LF, CRLF or CR), if the reader stands at one. */
static gboolean skip_line_end(Reader *r)
{
  if (r->at == r->end || (*r->at != '\n' && *r->at != '\r'))
    return FALSE;
  r->at += r->at[0] == '\r' && r->at + 1 < r->end && r->at[1] == '\n' ? 2 : 1;
  r->line++;
  return TRUE;
}

static char *line_end(const Reader *r)
{
  char *p = r->at;
  while (p < r->end && *p != '\n' && *p != '\r')
    p++;
  return p;
}

/* Skips lines that are empty or hold nothing but blanks (which are fields where the blank is the separator). */
static void skip_blank_lines(Reader *r)
{
  for (;;) {
    char *p = r->at;
    while (p < r->end && *p == ' ' && r->csv->separator != ' ')
      p++;
    if (p < r->end && *p != '\n' && *p != '\r')
      return;
    r->at = p;
    if (!skip_line_end(r))
      return;
  }
}

static void read_comments(Reader *r)
{
  for (skip_blank_lines(r); r->at < r->end && *r->at == '#'; skip_blank_lines(r)) {
    char *last = line_end(r);
    char *text = r->at + 1;
    if (text < last && *text == ' ')
      text++;
    g_ptr_array_add(r->csv->comments, g_strndup(text, (gsize)(last - text)));
    r->at = last;
    skip_line_end(r);
  }
}

/* Unquotes the field the reader stands at, in place; *stop gets the place for its NUL. */
static gboolean read_quoted(Reader *r, char **stop, GError **error)
{
  char *to = r->at;
  guint32 first_line = r->line;
  for (r->at++; r->at < r->end; *to++ = *r->at++) {
    if (*r->at == '\n' || (*r->at == '\r' && r->at[1] != '\n'))
      r->line++;
    if (*r->at != '"')
      continue;
    if (r->at + 1 == r->end || r->at[1] != '"')
      break;
    r->at++;
  }
  *stop = to;
  if (r->at == r->end)
    return fail(r->csv, first_line, error, "a quote is opened and never closed");
  r->at++;
  if (r->at < r->end && *r->at != r->csv->separator && *r->at != '\n' && *r->at != '\r')
    return fail(r->csv, r->line, error, "there is text between a closing quote and the end of the field");
  return TRUE;
}

static gboolean read_plain(Reader *r, char **stop, GError **error)
{
  char separator = r->csv->separator;
  while (r->at < r->end && *r->at != separator && *r->at != '\n' && *r->at != '\r') {
    if (*r->at == '"')
      return fail(r->csv, r->line, error, "a quote stands inside a field that does not begin with one");
    r->at++;
  }
  *stop = r->at;
  return TRUE;
}

/* Reads one record; *n_fields gets its number of fields. */
static gboolean read_row(Reader *r, gsize *n_fields, GError **error)
{
  AwCsv *csv = r->csv;
  *n_fields = 0;
  if (!append_u32(&csv->line, &csv->n_lines, &csv->lines_room, r->line, error))
    return FALSE;
  for (gboolean more = TRUE; more; (*n_fields)++) {
    char *stop = NULL;
    guint32 offset = (guint32)(r->at - csv->text);
    if (!append_u32(&csv->field, &csv->n_fields, &csv->fields_room, offset, error) ||
        !(r->at < r->end && *r->at == '"' ? read_quoted(r, &stop, error) : read_plain(r, &stop, error)))
      return FALSE;
    more = r->at < r->end && *r->at == csv->separator;
    if (more)
      r->at++;
    else
      skip_line_end(r);
    *stop = '\0';
    if (*n_fields >= MAX_COLUMNS)
      return fail(csv, r->line, error, "more than 10000 fields in one row");
  }
  return TRUE;
}

static gboolean read_header(Reader *r, GError **error)
{
  AwCsv *csv = r->csv;
  if (r->at == r->end) {
    g_set_error(error, AW_ERROR, AW_ERROR_EMPTY, "%s is empty: it has no header row", csv->name);
    return FALSE;
  }
  if (!read_row(r, &csv->n_columns, error))
    return FALSE;
  g_autoptr(GHashTable) seen = g_hash_table_new(g_str_hash, g_str_equal);
  for (gsize i = 0; i < csv->n_columns; i++) {
    char *heading = g_strstrip(csv->text + csv->field[i]);
    if (*heading && !g_hash_table_add(seen, heading)) {
      g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s, line %u: column '%s' stands twice in the header", csv->name,
                  csv->line[0], heading);
      return FALSE;
    }
  }
  return TRUE;
}

static gboolean read_rows(Reader *r, GError **error)
{
  AwCsv *csv = r->csv;
  for (skip_blank_lines(r); r->at < r->end; skip_blank_lines(r)) {
    gsize n = 0;
    guint32 line = r->line;
    if (!read_row(r, &n, error))
      return FALSE;
    if (n != csv->n_columns) {
      g_set_error(error, AW_ERROR, AW_ERROR_FORMAT,
                  "%s, line %u: %" G_GSIZE_FORMAT " fields where the table has %" G_GSIZE_FORMAT, csv->name, line, n,
                  csv->n_columns);
      return FALSE;
    }
  }
  return TRUE;
}

static guint32 line_of(const AwCsv *csv, const char *place)
{
  guint32 line = 1;
  for (const char *p = csv->text; p < place; p++)
    line += *p == '\n' || (*p == '\r' && p[1] != '\n');
  return line;
}

/* Checks what must hold before the bytes can be called text. */
static gboolean check_bytes(const AwCsv *csv, GError **error)
{
  const char *bad = NULL;
  if (csv->n_bytes >= 2 && (!memcmp(csv->text, "\xff\xfe", 2) || !memcmp(csv->text, "\xfe\xff", 2))) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s is UTF-16 text; save it as UTF-8", csv->name);
    return FALSE;
  }
  if ((bad = memchr(csv->text, '\0', csv->n_bytes)))
    return fail(csv, line_of(csv, bad), error, "a NUL byte; this is no text file");
  if (!g_utf8_validate_len(csv->text, csv->n_bytes, &bad))
    return fail(csv, line_of(csv, bad), error, "bytes that are not UTF-8; save the file as UTF-8");
  return TRUE;
}

/* Puts the headings of a table without a header row behind its text, so that they are found by offset like fields. */
static gboolean append_headings(AwCsv *csv, const char *const *headings, GError **error)
{
  g_autoptr(GString) tail = g_string_new(NULL);
  for (; headings[csv->n_columns]; csv->n_columns++) {
    guint32 offset = (guint32)(csv->n_bytes + 1 + tail->len);
    if (!append_u32(&csv->field, &csv->n_fields, &csv->fields_room, offset, error))
      return FALSE;
    g_string_append_len(tail, headings[csv->n_columns], (gssize)strlen(headings[csv->n_columns]) + 1);
  }
  char *text = g_try_realloc(csv->text, csv->n_bytes + 1 + tail->len);
  if (!text) {
    g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "not enough memory to read %s", csv->name);
    return FALSE;
  }
  csv->text = text;
  memcpy(text + csv->n_bytes + 1, tail->str, tail->len);
  return append_u32(&csv->line, &csv->n_lines, &csv->lines_room, 0, error);
}

/* Takes over `text`, which has a NUL after its n_bytes. `headings`: NULL when the text has a header row. */
static AwCsv *parse_owned(char *text, gsize n_bytes, const char *name, char separator, const char *const *headings,
                          GError **error)
{
  g_autoptr(AwCsv) csv = g_new0(AwCsv, 1);
  csv->name = g_strdup(name);
  csv->text = text;
  csv->n_bytes = n_bytes;
  csv->separator = separator;
  csv->comments = g_ptr_array_new_with_free_func(g_free);
  if (!check_bytes(csv, error) || (headings && !append_headings(csv, headings, error)))
    return NULL;
  gsize bom = g_str_has_prefix(csv->text, BYTE_ORDER_MARK) ? 3 : 0;
  Reader r = { csv, csv->text + bom, csv->text + n_bytes, 1 };
  read_comments(&r);
  g_ptr_array_add(csv->comments, NULL);
  if ((!headings && !read_header(&r, error)) || !read_rows(&r, error))
    return NULL;
  return g_steal_pointer(&csv);
}

AwCsv *aw_csv_read(const char *path, char separator, GError **error)
{
  char *text = NULL;
  gsize n_bytes = 0;
  if (!aw_input_read(path, AW_MAX_TEXT_BYTES, &text, &n_bytes, error))
    return NULL;
  return parse_owned(text, n_bytes, path, separator, NULL, error);
}

static char *copy_text(const char *bytes, gsize n_bytes, const char *name, GError **error)
{
  if (n_bytes > AW_MAX_TEXT_BYTES) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s is larger than %" G_GSIZE_FORMAT " bytes, the limit for a table",
                name, AW_MAX_TEXT_BYTES);
    return NULL;
  }
  char *text = aw_try_alloc(n_bytes + 1, 1, name, error);
  if (text && n_bytes)
    memcpy(text, bytes, n_bytes);
  return text;
}

AwCsv *aw_csv_parse(const char *bytes, gsize n_bytes, const char *name, char separator, GError **error)
{
  char *text = copy_text(bytes, n_bytes, name, error);
  return text ? parse_owned(text, n_bytes, name, separator, NULL, error) : NULL;
}

AwCsv *aw_csv_parse_bare(const char *bytes, gsize n_bytes, const char *name, char separator,
                         const char *const *headings, GError **error)
{
  char *text = copy_text(bytes, n_bytes, name, error);
  return text ? parse_owned(text, n_bytes, name, separator, headings, error) : NULL;
}

const char *aw_csv_name(const AwCsv *csv)
{
  return csv->name;
}

gsize aw_csv_n_rows(const AwCsv *csv)
{
  return csv->n_lines - 1;
}

gsize aw_csv_n_columns(const AwCsv *csv)
{
  return csv->n_columns;
}

gsize aw_csv_line(const AwCsv *csv, gsize row)
{
  g_return_val_if_fail(row < aw_csv_n_rows(csv), 0);
  return csv->line[row + 1];
}

const char *aw_csv_heading(const AwCsv *csv, gsize column)
{
  g_return_val_if_fail(column < csv->n_columns, NULL);
  return csv->text + csv->field[column];
}

const char *const *aw_csv_comments(const AwCsv *csv)
{
  return (const char *const *)csv->comments->pdata;
}

int aw_csv_find(const AwCsv *csv, const char *heading)
{
  for (gsize i = 0; i < csv->n_columns; i++)
    if (!strcmp(aw_csv_heading(csv, i), heading))
      return (int)i;
  return -1;
}

gboolean aw_csv_need(const AwCsv *csv, const char *heading, gsize *column, GError **error)
{
  int found = aw_csv_find(csv, heading);
  if (found >= 0) {
    *column = (gsize)found;
    return TRUE;
  }
  g_autoptr(GString) have = g_string_new(NULL);
  for (gsize i = 0; i < MIN(csv->n_columns, MAX_NAMED); i++)
    g_string_append_printf(have, "%s%s", i ? ", " : "", aw_csv_heading(csv, i));
  gboolean other = csv->n_columns == 1 && strpbrk(have->str, ";\t,");
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s has no column '%s'; its columns are: %s%s%s%s", csv->name,
              heading, have->str, other ? " (are its fields parted by something else than '" : "",
              other ? (csv->separator == '\t' ? "tab" : (char[]){ csv->separator, '\0' }) : "", other ? "'?)" : "");
  return FALSE;
}

const char *aw_csv_text(const AwCsv *csv, gsize row, gsize column)
{
  g_return_val_if_fail(row < aw_csv_n_rows(csv) && column < csv->n_columns, NULL);
  return csv->text + csv->field[(row + 1) * csv->n_columns + column];
}

static char *place(const AwCsv *csv, gsize row, gsize column)
{
  return g_strdup_printf("%s, line %u, column %s", csv->name, csv->line[row + 1], aw_csv_heading(csv, column));
}

gboolean aw_csv_double(const AwCsv *csv, gsize row, gsize column, double *value, GError **error)
{
  const char *text = aw_csv_text(csv, row, column);
  g_return_val_if_fail(text, FALSE);
  g_autofree char *where = place(csv, row, column);
  return aw_text_to_double(text, where, value, error);
}

gboolean aw_csv_int(const AwCsv *csv, gsize row, gsize column, gint64 min, gint64 max, gint64 *value, GError **error)
{
  const char *text = aw_csv_text(csv, row, column);
  g_return_val_if_fail(text, FALSE);
  g_autofree char *where = place(csv, row, column);
  return aw_text_to_int(text, where, min, max, value, error);
}

/* Besides what RFC 4180 asks for: what would be taken for a comment or a byte order mark, or trimmed, is quoted. */
static gboolean needs_quotes(const char *text, char separator)
{
  const char special[] = { separator, '"', '\r', '\n', '\0' };
  return strpbrk(text, special) || *text == '#' || *text == ' ' || g_str_has_suffix(text, " ") ||
         g_str_has_prefix(text, BYTE_ORDER_MARK);
}

void aw_csv_append(GString *out, const char *text, char separator)
{
  if (!needs_quotes(text, separator)) {
    g_string_append(out, text);
    return;
  }
  g_string_append_c(out, '"');
  for (const char *c = text; *c; c++) {
    if (*c == '"')
      g_string_append_c(out, '"');
    g_string_append_c(out, *c);
  }
  g_string_append_c(out, '"');
}

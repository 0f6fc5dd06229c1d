/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "base/csv.h"
#include "base/error.h"
#include "base/limits.h"
#include "base/output.h"
#include "plan/layoutcolumns.h"

#define MAX_PARTICLES 1000000000

void aw_target_list_free(AwTargetList *list)
{
  if (!list)
    return;
  g_free(list->rows);
  g_free(list->dish);
  g_free(list->plan_hash);
  g_free(list->origin);
  g_free(list->written_at);
  g_free(list);
}

/* Takes what follows `key` in a head line; a key that comes again adds a line. */
static void take_head_line(const char *line, const char *key, char **value)
{
  gsize n = strlen(key);
  if (strncmp(line, key, n) != 0 || line[n] != ':')
    return;
  const char *rest = line + n + 1 + (line[n + 1] == ' ');
  char *all = *value ? g_strconcat(*value, "\n", rest, NULL) : g_strdup(rest);
  g_free(*value);
  *value = all;
}

static void read_head(const char *const *lines, AwTargetList *list)
{
  for (; *lines; lines++) {
    take_head_line(*lines, "dish", &list->dish);
    take_head_line(*lines, "plan-hash", &list->plan_hash);
    take_head_line(*lines, "origin", &list->origin);
    take_head_line(*lines, "written-at", &list->written_at);
  }
}

/* The head from a text file of `#` lines. */
static void read_head_text(const char *text, AwTargetList *list)
{
  g_auto(GStrv) lines = g_strsplit(text, "\n", -1);
  for (gsize i = 0; lines[i]; i++) {
    char *bare = g_strchomp(lines[i]);
    bare += *bare == '#';
    bare += *bare == ' ';
    memmove(lines[i], bare, strlen(bare) + 1);
  }
  read_head((const char *const *)lines, list);
}

static gboolean check_headings(const AwLayout *layout, const AwCsv *csv, GError **error)
{
  if (aw_csv_n_columns(csv) != layout->columns->len) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s has %" G_GSIZE_FORMAT " columns where layout %s has %u",
                aw_csv_name(csv), aw_csv_n_columns(csv), layout->name, layout->columns->len);
    return FALSE;
  }
  for (gsize i = 0; i < layout->columns->len; i++)
    if (strcmp(aw_csv_heading(csv, i), aw_layout_column(layout, i)->heading) != 0) {
      g_set_error(error, AW_ERROR, AW_ERROR_FORMAT,
                  "%s, column %" G_GSIZE_FORMAT " is called '%s' where layout %s has '%s'", aw_csv_name(csv), i + 1,
                  aw_csv_heading(csv, i), layout->name, aw_layout_column(layout, i)->heading);
      return FALSE;
    }
  return TRUE;
}

/* Undoes offset, sign and unit. */
static gboolean read_position(const AwColumn *column, const AwCsv *csv, gsize row, gsize i, double *um, GError **error)
{
  double written = 0;
  if (!aw_csv_double(csv, row, i, &written, error))
    return FALSE;
  *um = column->sign * (written - column->offset) * column->um_per_unit;
  return TRUE;
}

static gboolean bad_text(const AwCsv *csv, gsize row, gsize i, const char *wanted, GError **error)
{
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s, line %" G_GSIZE_FORMAT ", column %s: '%s' is not %s",
              aw_csv_name(csv), aw_csv_line(csv, row), aw_csv_heading(csv, i), aw_csv_text(csv, row, i), wanted);
  return FALSE;
}

static gboolean read_arm(const AwCsv *csv, gsize row, gsize i, const char **arm, GError **error)
{
  const char *text = aw_csv_text(csv, row, i);
  *arm = !strcmp(text, "irradiate") ? "irradiate" : !strcmp(text, "sham") ? "sham" : NULL;
  return *arm || bad_text(csv, row, i, "irradiate or sham", error);
}

static gboolean read_target(const AwColumn *column, const AwCsv *csv, gsize row, gsize i, gint64 *target,
                            GError **error)
{
  gint64 written = 0, first = column->first;
  if (!aw_csv_int(csv, row, i, first, first + AW_MAX_NUCLEI, &written, error))
    return FALSE;
  *target = written - first + 1;
  return TRUE;
}

static gboolean read_field(const AwColumn *column, const AwCsv *csv, gsize row, gsize i, AwTargetRow *to,
                           GError **error)
{
  switch (column->value) {
  case AW_COLUMN_X:
    return read_position(column, csv, row, i, &to->at.bx_um, error);
  case AW_COLUMN_Y:
    return read_position(column, csv, row, i, &to->at.by_um, error);
  case AW_COLUMN_SCAN_X:
    return read_position(column, csv, row, i, &to->scan.x_um, error);
  case AW_COLUMN_SCAN_Y:
    return read_position(column, csv, row, i, &to->scan.y_um, error);
  case AW_COLUMN_TARGET:
    return read_target(column, csv, row, i, &to->target, error);
  case AW_COLUMN_NUCLEUS:
    return aw_csv_int(csv, row, i, 1, G_MAXINT64, &to->nucleus_id, error);
  case AW_COLUMN_PARTICLES:
    return aw_csv_int(csv, row, i, 0, MAX_PARTICLES, &to->n_particles, error);
  case AW_COLUMN_ARM:
    return read_arm(csv, row, i, &to->arm, error);
  case AW_COLUMN_TEXT:
    return !strcmp(aw_csv_text(csv, row, i), column->text) || bad_text(csv, row, i, column->text, error);
  }
  g_return_val_if_reached(FALSE);
}

static gboolean read_rows(const AwLayout *layout, const AwCsv *csv, AwTargetList *list, GError **error)
{
  for (gsize row = 0; row < list->n; row++) {
    list->rows[row] = (AwTargetRow){ .target = (gint64)row + 1, .scan = { NAN, NAN }, .n_particles = -1 };
    for (gsize i = 0; i < layout->columns->len; i++)
      if (!read_field(aw_layout_column(layout, i), csv, row, i, &list->rows[row], error))
        return FALSE;
  }
  return TRUE;
}

AwTargetList *aw_target_list_parse(const AwLayout *layout, const char *bytes, gsize n_bytes, const char *name,
                                   const char *head_text, GError **error)
{
  const char *const *headings = (const char *const *)layout->headings->pdata;
  g_autoptr(AwCsv) csv = layout->header ? aw_csv_parse(bytes, n_bytes, name, layout->separator, error)
                                        : aw_csv_parse_bare(bytes, n_bytes, name, layout->separator, headings, error);
  if (!csv || !check_headings(layout, csv, error))
    return NULL;
  if (aw_csv_n_rows(csv) == 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_EMPTY, "%s has no target", name);
    return NULL;
  }
  g_autoptr(AwTargetList) list = g_new0(AwTargetList, 1);
  list->n = aw_csv_n_rows(csv);
  list->rows = aw_try_alloc(list->n, sizeof *list->rows, "a target list", error);
  if (!list->rows || !read_rows(layout, csv, list, error))
    return NULL;
  if (head_text)
    read_head_text(head_text, list);
  else
    read_head(aw_csv_comments(csv), list);
  return g_steal_pointer(&list);
}

AwTargetList *aw_target_list_read(const AwLayout *layout, const char *path, GError **error)
{
  g_autofree char *bytes = NULL, *head_text = NULL, *beside = aw_layout_beside(layout, path);
  gsize n_bytes = 0, n_head = 0;
  if (!aw_input_read(path, AW_MAX_TEXT_BYTES, &bytes, &n_bytes, error) ||
      (beside && !aw_input_read(beside, AW_MAX_TEXT_BYTES, &head_text, &n_head, error)))
    return NULL;
  return aw_target_list_parse(layout, bytes, n_bytes, path, head_text, error);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "base/csv.h"
#include "base/error.h"
#include "base/limits.h"
#include "base/output.h"
#include "base/text.h"
#include "plan/cautions.h"
#include "plan/layoutcolumns.h"

/* The plan as it is to be written. */
typedef struct {
  const AwLayout *layout;
  const AwTargetHead *head;
  const AwTargetRow *rows;
  gsize n;
  const char *path;
} Plan;

static gboolean check_axis(const AwLayout *layout, const AwTargetRow *row, const char *axis, double value, double min,
                           double max, GError **error)
{
  if (value >= min && value <= max)
    return TRUE;
  g_autofree char *v = aw_text_from_double(value, 3);
  g_autofree char *low = aw_text_from_double(min, 3), *high = aw_text_from_double(max, 3);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "target %" G_GINT64_FORMAT " (nucleus %" G_GINT64_FORMAT
              "): %s = %s um is outside the stage limits of layout %s, %s to %s um",
              row->target, row->nucleus_id, axis, v, layout->name, low, high);
  return FALSE;
}

/* A sham target is visited with the shutter closed: a list that could have it irradiated is never written. */
static gboolean check_particles(const AwLayout *layout, const AwTargetRow *row, GError **error)
{
  gboolean sham = !strcmp(row->arm, "sham");
  if (sham ? row->n_particles != 0 : row->n_particles < 1) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "target %" G_GINT64_FORMAT " of arm %s has %" G_GINT64_FORMAT " particles; it must have %s",
                row->target, row->arm, row->n_particles, sham ? "0" : "at least 1");
    return FALSE;
  }
  if (!sham || aw_layout_holds(layout, AW_COLUMN_PARTICLES) || aw_layout_holds(layout, AW_COLUMN_ARM))
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_STATE,
              "layout %s has no column for particles or arm, so sham target %" G_GINT64_FORMAT
              " would look like one to irradiate",
              layout->name, row->target);
  return FALSE;
}

static gboolean check_rows(const Plan *plan, GError **error)
{
  const AwLayout *l = plan->layout;
  if (plan->n == 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_EMPTY, "there is no target to write to %s", plan->path);
    return FALSE;
  }
  for (gsize i = 0; i < plan->n; i++) {
    const AwTargetRow *row = &plan->rows[i];
    if (!check_axis(l, row, "x", row->at.bx_um, l->x_min_um, l->x_max_um, error) ||
        !check_axis(l, row, "y", row->at.by_um, l->y_min_um, l->y_max_um, error) || !check_particles(l, row, error))
      return FALSE;
  }
  return TRUE;
}

/* Appends one `#` line; a line break inside `text` must not make a second line that is no comment. */
static void append_comment(GString *out, const char *key, const char *text, const char *end)
{
  g_autofree char *line = g_strdup(text ? text : "");
  for (char *c = line; *c; c++)
    if (g_ascii_iscntrl(*c))
      *c = ' ';
  g_string_append_printf(out, "# %s: %s%s", key, line, end);
}

static GString *head_text(const Plan *plan)
{
  const char *end = plan->layout->crlf ? "\r\n" : "\n";
  GString *out = g_string_new(NULL);
  append_comment(out, "aimwell target list", "1", end);
  for (gsize i = 0; aw_cautions[i]; i++)
    append_comment(out, "caution", aw_cautions[i], end);
  append_comment(out, "plan-hash", plan->head->plan_hash, end);
  append_comment(out, "dish", plan->head->dish, end);
  g_auto(GStrv) origins = g_strsplit(plan->head->origin ? plan->head->origin : "", "\n", -1);
  for (gsize i = 0; origins[i]; i++)
    if (*origins[i])
      append_comment(out, "origin", origins[i], end);
  append_comment(out, "layout", plan->layout->name, end);
  append_comment(out, "written-at", plan->head->written_at, end);
  return out;
}

static char *position_text(const AwColumn *column, const AwTargetRow *row)
{
  double um = aw_column_position_um(column, row);
  return aw_text_from_double(column->sign * um / column->um_per_unit + column->offset, column->decimals);
}

static char *number_text(gint64 number)
{
  return g_strdup_printf("%" G_GINT64_FORMAT, number);
}

static char *field_text(const AwColumn *column, const AwTargetRow *row)
{
  switch (column->value) {
  case AW_COLUMN_TARGET:
    return number_text(row->target - 1 + column->first);
  case AW_COLUMN_NUCLEUS:
    return number_text(row->nucleus_id);
  case AW_COLUMN_PARTICLES:
    return number_text(row->n_particles);
  case AW_COLUMN_ARM:
    return g_strdup(row->arm);
  case AW_COLUMN_TEXT:
    return g_strdup(column->text);
  default:
    return position_text(column, row);
  }
}

/* Appends one row; *spot gets the beam-stage part of it, by which two targets on one spot are found. */
static void append_row(GString *out, const AwLayout *layout, const AwTargetRow *row, char **spot)
{
  g_autoptr(GString) key = g_string_new(NULL);
  for (gsize i = 0; i < layout->columns->len; i++) {
    const AwColumn *column = aw_layout_column(layout, i);
    g_autofree char *text = field_text(column, row);
    if (i)
      g_string_append_c(out, layout->separator);
    aw_csv_append(out, text, layout->separator);
    if (column->value == AW_COLUMN_X || column->value == AW_COLUMN_Y)
      g_string_append_printf(key, "%s%s %s", key->len ? ", " : "", column->heading, text);
  }
  g_string_append(out, layout->crlf ? "\r\n" : "\n");
  *spot = g_string_free(g_steal_pointer(&key), FALSE);
}

static void append_header(GString *out, const AwLayout *layout)
{
  for (gsize i = 0; i < layout->columns->len; i++) {
    if (i)
      g_string_append_c(out, layout->separator);
    aw_csv_append(out, aw_layout_column(layout, i)->heading, layout->separator);
  }
  g_string_append(out, layout->crlf ? "\r\n" : "\n");
}

static gboolean append_rows(GString *out, const Plan *plan, GError **error)
{
  g_autoptr(GHashTable) spots = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, NULL);
  for (gsize i = 0; i < plan->n; i++) {
    char *spot = NULL;
    append_row(out, plan->layout, &plan->rows[i], &spot);
    const AwTargetRow *other = g_hash_table_lookup(spots, spot);
    if (other) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                  "targets %" G_GINT64_FORMAT " and %" G_GINT64_FORMAT " (nuclei %" G_GINT64_FORMAT
                  " and %" G_GINT64_FORMAT ") would be written at one spot, %s",
                  other->target, plan->rows[i].target, other->nucleus_id, plan->rows[i].nucleus_id, spot);
      g_free(spot);
      return FALSE;
    }
    g_hash_table_insert(spots, spot, (gpointer)(guintptr)&plan->rows[i]);
  }
  return TRUE;
}

/* Reads the list back through the layout, from `bytes`, and compares it with the plan. */
static gboolean verify(const Plan *plan, const char *bytes, gsize n_bytes, const char *beside_bytes, GError **error)
{
  g_autoptr(GError) bad = NULL;
  g_autoptr(AwTargetList) list = aw_target_list_parse(plan->layout, bytes, n_bytes, plan->path, beside_bytes, &bad);
  if (!list)
    g_set_error(error, AW_ERROR, AW_ERROR_VERIFY, "the list cannot be read back and was not kept: %s", bad->message);
  return list && aw_target_list_compare(plan->layout, list, plan->head->plan_hash, plan->rows, plan->n, error);
}

/* Writes all of `text`; *back gets what then stands in the file, or a copy of the text where it cannot be read back. */
static gboolean write_text(AwOutput *out, const GString *text, char **back, gsize *n_back, GError **error)
{
  if (aw_output_is_direct(out)) {
    *back = g_memdup2(text->str, text->len + 1);
    *n_back = text->len;
    return TRUE;
  }
  fwrite(text->str, 1, text->len, aw_output_stream(out));
  if (fflush(aw_output_stream(out)) != 0)
    return aw_output_commit(out, error); /* it fails, and says why */
  return aw_input_read(aw_output_path(out), AW_MAX_TEXT_BYTES, back, n_back, error);
}

/* What goes to a pipe is written only now that it has been checked: it cannot be taken back. */
static gboolean commit_text(AwOutput *out, const GString *text, GError **error)
{
  if (aw_output_is_direct(out))
    fwrite(text->str, 1, text->len, aw_output_stream(out));
  return aw_output_commit(out, error);
}

/* Opens the file beside the list that holds the head, where the layout wants one. */
static gboolean open_beside(const Plan *plan, const AwOutput *list, AwOutput **beside, GError **error)
{
  g_autofree char *path = aw_layout_beside(plan->layout, plan->path);
  if (!path)
    return TRUE;
  if (aw_output_is_direct(list)) {
    g_set_error(error, AW_ERROR, AW_ERROR_STATE,
                "layout %s keeps the cautions in a file beside the list, and %s has no such place; write to a file",
                plan->layout->name, plan->path);
    return FALSE;
  }
  *beside = aw_output_open(path, error);
  return *beside != NULL;
}

static gboolean write_checked(const Plan *plan, const GString *head, const GString *list, gboolean *in_memory,
                              GError **error)
{
  g_autoptr(AwOutput) out = aw_output_open(plan->path, error);
  g_autoptr(AwOutput) beside = NULL;
  g_autofree char *list_back = NULL, *head_back = NULL;
  gsize n_list = 0, n_head = 0;
  if (!out || !open_beside(plan, out, &beside, error))
    return FALSE;
  *in_memory = aw_output_is_direct(out);
  if (!write_text(out, list, &list_back, &n_list, error) ||
      (beside && !write_text(beside, head, &head_back, &n_head, error)) ||
      !verify(plan, list_back, n_list, head_back, error))
    return FALSE;
  return (!beside || commit_text(beside, head, error)) && commit_text(out, list, error);
}

gboolean aw_target_list_write(const AwLayout *layout, const AwTargetHead *head, const AwTargetRow *rows, gsize n,
                              const char *path, gboolean *checked_in_memory, GError **error)
{
  const Plan plan = { layout, head, rows, n, path };
  gboolean in_memory = FALSE;
  if (!check_rows(&plan, error))
    return FALSE;
  g_autoptr(GString) above = head_text(&plan), list = g_string_new(NULL);
  if (!layout->beside)
    g_string_append_len(list, above->str, (gssize)above->len);
  if (layout->header)
    append_header(list, layout);
  if (!append_rows(list, &plan, error) || !write_checked(&plan, above, list, &in_memory, error))
    return FALSE;
  if (checked_in_memory)
    *checked_in_memory = in_memory;
  return TRUE;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "base/error.h"
#include "base/keyfile.h"
#include "base/limits.h"
#include "plan/layoutcolumns.h"

#define MAX_COLUMNS 100
#define COLUMN_PREFIX "column."

/* A word of the key file and what it stands for. */
typedef struct {
  const char *word;
  int meaning;
} Word;

static const Word values[] = { { "x", AW_COLUMN_X },           { "y", AW_COLUMN_Y },
                               { "scan_x", AW_COLUMN_SCAN_X }, { "scan_y", AW_COLUMN_SCAN_Y },
                               { "target", AW_COLUMN_TARGET }, { "nucleus", AW_COLUMN_NUCLEUS },
                               { "arm", AW_COLUMN_ARM },       { "particles", AW_COLUMN_PARTICLES },
                               { "text", AW_COLUMN_TEXT },     { NULL, 0 } };
static const Word separators[] = {
  { "comma", ',' }, { "semicolon", ';' }, { "tab", '\t' }, { "space", ' ' }, { NULL, 0 }
};
static const Word line_endings[] = { { "lf", FALSE }, { "crlf", TRUE }, { NULL, 0 } };
static const Word comment_places[] = { { "in-file", FALSE }, { "beside", TRUE }, { NULL, 0 } };
static const Word signs[] = { { "+1", 1 }, { "1", 1 }, { "-1", -1 }, { NULL, 0 } };

/* Lengths by UCUM code; `decimals` is the default, one nanometre or finer. */
static const struct {
  const char *unit;
  double um_per_unit;
  int decimals;
} units[] = { { "um", 1, 3 }, { "mm", 1e3, 6 }, { "nm", 1e-3, 0 }, { "m", 1e6, 9 }, { "step", 0, 0 } };

static const char builtin_columns[] = "[column.target]\nvalue=target\n[column.nucleus]\nvalue=nucleus\n"
                                      "[column.x_um]\nvalue=x\n[column.y_um]\nvalue=y\n"
                                      "[column.particles]\nvalue=particles\n[column.arm]\nvalue=arm\n";

static void column_free(gpointer data)
{
  AwColumn *column = data;
  g_free(column->heading);
  g_free(column->text);
  g_free(column->unit);
  g_free(column);
}

void aw_layout_free(AwLayout *layout)
{
  if (!layout)
    return;
  g_free(layout->name);
  g_ptr_array_unref(layout->columns);
  g_ptr_array_unref(layout->headings);
  g_free(layout);
}

const char *aw_layout_name(const AwLayout *layout)
{
  return layout->name;
}

char *aw_layout_beside(const AwLayout *layout, const char *path)
{
  return layout->beside ? g_strconcat(path, ".txt", NULL) : NULL;
}

gboolean aw_layout_holds(const AwLayout *layout, AwColumnValue value)
{
  for (gsize i = 0; i < layout->columns->len; i++)
    if (aw_layout_column(layout, i)->value == value)
      return TRUE;
  return FALSE;
}

double aw_column_position_um(const AwColumn *column, const AwTargetRow *row)
{
  switch (column->value) {
  case AW_COLUMN_X:
    return row->at.bx_um;
  case AW_COLUMN_Y:
    return row->at.by_um;
  case AW_COLUMN_SCAN_X:
    return row->scan.x_um;
  default:
    return row->scan.y_um;
  }
}

/* What is being read, for errors. */
typedef struct {
  AwKeyFile *keys;
  const char *name; /* of the file */
} Source;

/* Reads one of a few words; an absent key leaves *meaning alone. */
static gboolean read_word(const Source *from, const char *group, const char *key, const Word *words, int *meaning,
                          GError **error)
{
  g_autofree char *text = aw_keyfile_text(from->keys, group, key, NULL);
  g_autoptr(GString) known = g_string_new(NULL);
  for (const Word *w = words; text && w->word; w++) {
    g_string_append_printf(known, "%s%s", w == words ? "" : ", ", w->word);
    if (!strcmp(text, w->word)) {
      *meaning = w->meaning;
      return TRUE;
    }
  }
  if (!text)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s, group [%s], key %s: '%s' is none of %s", from->name, group, key,
              text, known->str);
  return FALSE;
}

/* Text that goes into the list must stay on its line. */
static gboolean check_line(const Source *from, const char *group, const char *key, const char *text, GError **error)
{
  for (const char *c = text; *c; c++)
    if (g_ascii_iscntrl(*c)) {
      g_set_error(error, AW_ERROR, AW_ERROR_FORMAT,
                  "%s, group [%s], key %s: the text has a line break or control "
                  "character",
                  from->name, group, key);
      return FALSE;
    }
  return TRUE;
}

/* unit, and with unit=step the size of a step. Sets the default decimals. */
static gboolean read_unit(const Source *from, const char *group, AwColumn *column, GError **error)
{
  column->unit = aw_keyfile_text(from->keys, group, "unit", "um");
  gsize i = 0;
  while (i < G_N_ELEMENTS(units) && strcmp(column->unit, units[i].unit) != 0)
    i++;
  if (i == G_N_ELEMENTS(units)) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s, group [%s], key unit: '%s' is none of um, mm, nm, m, step",
                from->name, group, column->unit);
    return FALSE;
  }
  column->um_per_unit = units[i].um_per_unit;
  column->decimals = units[i].decimals;
  if (column->um_per_unit > 0)
    return TRUE;
  if (!aw_keyfile_double(from->keys, group, "step-um", 1e-6, 1e4, &column->um_per_unit, error))
    return FALSE;
  if (column->um_per_unit > 0)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s has no key 'step-um' in group [%s], which unit=step needs",
              from->name, group);
  return FALSE;
}

static gboolean read_position(const Source *from, const char *group, AwColumn *column, GError **error)
{
  gint64 decimals = 0;
  if (!read_unit(from, group, column, error))
    return FALSE;
  decimals = column->decimals;
  if (!read_word(from, group, "sign", signs, &column->sign, error) ||
      !aw_keyfile_double(from->keys, group, "offset", -1e12, 1e12, &column->offset, error) ||
      !aw_keyfile_int(from->keys, group, "decimals", 0, 12, &decimals, error))
    return FALSE;
  column->decimals = (int)decimals;
  return TRUE;
}

static gboolean read_column_value(const Source *from, const char *group, AwColumn *column, GError **error)
{
  int value = -1;
  if (!read_word(from, group, "value", values, &value, error))
    return FALSE;
  if (value < 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s has no key 'value' in group [%s]", from->name, group);
    return FALSE;
  }
  column->value = (AwColumnValue)value;
  if (column->value <= AW_COLUMN_SCAN_Y)
    return read_position(from, group, column, error);
  if (column->value == AW_COLUMN_TARGET)
    return aw_keyfile_int(from->keys, group, "first", -1000000, 1000000, &column->first, error);
  if (column->value != AW_COLUMN_TEXT)
    return TRUE;
  column->text = aw_keyfile_need_text(from->keys, group, "text", error);
  return column->text && check_line(from, group, "text", column->text, error);
}

/* Reads one [column.NAME]; NAME is the heading unless the group has a key of that name. */
static gboolean read_column(const Source *from, const char *group, AwLayout *layout, GError **error)
{
  AwColumn *column = g_new0(AwColumn, 1);
  g_ptr_array_add(layout->columns, column);
  column->sign = 1;
  column->first = 1;
  column->heading = aw_keyfile_text(from->keys, group, "heading", group + strlen(COLUMN_PREFIX));
  g_ptr_array_add(layout->headings, g_strstrip(column->heading));
  return check_line(from, group, "heading", column->heading, error) && read_column_value(from, group, column, error);
}

/* A value may stand in one column only, so that what is read back is compared column by column. */
static gboolean check_once(const Source *from, const AwLayout *layout, gsize i, GError **error)
{
  const AwColumn *column = aw_layout_column(layout, i);
  gboolean heading_twice = !*column->heading, value_twice = FALSE;
  for (gsize k = 0; k < i; k++) {
    const AwColumn *other = aw_layout_column(layout, k);
    heading_twice = heading_twice || !strcmp(column->heading, other->heading);
    value_twice = value_twice || (column->value == other->value && column->value != AW_COLUMN_TEXT);
  }
  if (!heading_twice && !value_twice)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: the %s of column '%s' stands in another column, too%s", from->name,
              heading_twice ? "heading" : "value", column->heading, heading_twice ? " (or is empty)" : "");
  return FALSE;
}

static gboolean read_columns(const Source *from, AwLayout *layout, GError **error)
{
  g_auto(GStrv) groups = aw_keyfile_groups(from->keys);
  for (gsize i = 0; groups[i]; i++)
    if (g_str_has_prefix(groups[i], COLUMN_PREFIX) && !read_column(from, groups[i], layout, error))
      return FALSE;
  g_ptr_array_add(layout->headings, NULL);
  for (gsize i = 0; i < MIN(layout->columns->len, MAX_COLUMNS); i++)
    if (!check_once(from, layout, i, error))
      return FALSE;
  if (layout->columns->len > MAX_COLUMNS) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s has %u columns; the limit is %d", from->name, layout->columns->len,
                MAX_COLUMNS);
    return FALSE;
  }
  if (aw_layout_holds(layout, AW_COLUMN_X) && aw_layout_holds(layout, AW_COLUMN_Y))
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s needs a group [column.NAME] with value=x and one with value=y",
              from->name);
  return FALSE;
}

static gboolean read_head(const Source *from, AwLayout *layout, GError **error)
{
  int separator = ',';
  aw_keyfile_has(from->keys, "layout", "about"); /* a note for people: allowed, not used */
  layout->header = TRUE;
  layout->name = aw_keyfile_need_text(from->keys, "layout", "name", error);
  if (!layout->name || !check_line(from, "layout", "name", layout->name, error) ||
      !read_word(from, "layout", "separator", separators, &separator, error) ||
      !read_word(from, "layout", "line-ending", line_endings, &layout->crlf, error) ||
      !read_word(from, "layout", "comments", comment_places, &layout->beside, error) ||
      !aw_keyfile_bool(from->keys, "layout", "header", &layout->header, error))
    return FALSE;
  layout->separator = (char)separator;
  return TRUE;
}

static gboolean read_limits(const Source *from, AwLayout *layout, GError **error)
{
  const double most = AW_MAX_COORDINATE_UM;
  layout->x_min_um = layout->y_min_um = -most;
  layout->x_max_um = layout->y_max_um = most;
  if (!aw_keyfile_double(from->keys, "limits", "x-min-um", -most, most, &layout->x_min_um, error) ||
      !aw_keyfile_double(from->keys, "limits", "y-min-um", -most, most, &layout->y_min_um, error))
    return FALSE;
  return aw_keyfile_double(from->keys, "limits", "x-max-um", layout->x_min_um, most, &layout->x_max_um, error) &&
         aw_keyfile_double(from->keys, "limits", "y-max-um", layout->y_min_um, most, &layout->y_max_um, error);
}

static AwLayout *read_layout(AwKeyFile *keys, const char *name, GError **error)
{
  const Source from = { keys, name };
  g_autoptr(AwLayout) layout = g_new0(AwLayout, 1);
  layout->columns = g_ptr_array_new_with_free_func(column_free);
  layout->headings = g_ptr_array_new();
  if (!read_head(&from, layout, error) || !read_limits(&from, layout, error) || !read_columns(&from, layout, error) ||
      !aw_keyfile_finish(keys, error))
    return NULL;
  return g_steal_pointer(&layout);
}

AwLayout *aw_layout_parse(const char *bytes, gsize n_bytes, const char *name, GError **error)
{
  g_autoptr(AwKeyFile) keys = aw_keyfile_parse(bytes, n_bytes, name, error);
  return keys ? read_layout(keys, name, error) : NULL;
}

static AwLayout *load_builtin(const char *name, const char *separator, GError **error)
{
  g_autofree char *text = g_strconcat("[layout]\nname=", name, "\nseparator=", separator, "\n", builtin_columns, NULL);
  return aw_layout_parse(text, strlen(text), name, error);
}

AwLayout *aw_layout_load(const char *name_or_path, GError **error)
{
  if (!strcmp(name_or_path, "csv"))
    return load_builtin("csv", "comma", error);
  if (!strcmp(name_or_path, "tsv"))
    return load_builtin("tsv", "tab", error);
  if (!g_file_test(name_or_path, G_FILE_TEST_EXISTS)) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND,
                "there is no layout '%s': csv and tsv are built in, and no key file has that name", name_or_path);
    return NULL;
  }
  g_autoptr(AwKeyFile) keys = aw_keyfile_read(name_or_path, error);
  return keys ? read_layout(keys, name_or_path, error) : NULL;
}

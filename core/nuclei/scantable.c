/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/scantable.h"

#include <math.h>
#include <string.h>

#include "base/csv.h"
#include "base/error.h"
#include "base/limits.h"
#include "base/text.h"

#define MIN_PIXEL_UM 0.001
#define MAX_PIXEL_UM 100.0

enum { FILE_NAME, STAGE_X, STAGE_Y, PAGE, CHANNEL, PIXEL, TAKEN_AT, N_COLUMNS };

static const char *const headings[N_COLUMNS] = { "file",    "stage_x_um", "stage_y_um", "page",
                                                 "channel", "pixel_um",   "taken_at" };

void aw_scan_row_free(AwScanRow *row)
{
  if (!row)
    return;
  g_free(row->path);
  g_free(row);
}

/* A reading in another unit must not pass as a missing or, worse, an unknown column. */
static gboolean find_other_unit(const AwCsv *csv, const char *wanted, GError **error)
{
  for (gsize i = 0; i < aw_csv_n_columns(csv); i++) {
    const char *heading = aw_csv_heading(csv, i);
    if (strncmp(heading, wanted, strlen("stage_x")) != 0)
      continue;
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND,
                "%s has no column '%s' but '%s'; convert its values to um and rename it", aw_csv_name(csv), wanted,
                heading);
    return TRUE;
  }
  return FALSE;
}

/* Column numbers, -1 where an optional one is absent. */
static gboolean find_columns(const AwCsv *csv, int column[N_COLUMNS], GError **error)
{
  for (int i = 0; i < N_COLUMNS; i++) {
    gsize found;
    column[i] = aw_csv_find(csv, headings[i]);
    if (i <= STAGE_Y || column[i] >= 0) {
      if (i != FILE_NAME && column[i] < 0 && find_other_unit(csv, headings[i], error))
        return FALSE;
      if (!aw_csv_need(csv, headings[i], &found, error))
        return FALSE;
      column[i] = (int)found;
    }
  }
  return TRUE;
}

/* A field that is there and not blank; NULL otherwise. */
static const char *optional_text(const AwCsv *csv, gsize row, int column)
{
  const char *text = column >= 0 ? aw_csv_text(csv, row, (gsize)column) : "";
  return text[strspn(text, " \t")] ? text : NULL;
}

static gboolean within(const AwCsv *csv, gsize row, int column, double value, double min, double max, GError **error)
{
  if (value >= min && value <= max)
    return TRUE;
  g_autofree char *low = aw_text_from_double_exact(min), *high = aw_text_from_double_exact(max);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s, line %" G_GSIZE_FORMAT ", column %s: %s is outside %s to %s",
              aw_csv_name(csv), aw_csv_line(csv, row), headings[column],
              aw_csv_text(csv, row, (gsize)aw_csv_find(csv, headings[column])), low, high);
  return FALSE;
}

static gboolean read_stage(const AwCsv *csv, gsize row, const int column[N_COLUMNS], AwScanPoint *stage, GError **error)
{
  return aw_csv_double(csv, row, (gsize)column[STAGE_X], &stage->x_um, error) &&
         within(csv, row, STAGE_X, stage->x_um, -AW_MAX_COORDINATE_UM, AW_MAX_COORDINATE_UM, error) &&
         aw_csv_double(csv, row, (gsize)column[STAGE_Y], &stage->y_um, error) &&
         within(csv, row, STAGE_Y, stage->y_um, -AW_MAX_COORDINATE_UM, AW_MAX_COORDINATE_UM, error);
}

static gboolean read_plane(const AwCsv *csv, gsize row, const int column[N_COLUMNS], AwScanRow *r, GError **error)
{
  gint64 page = 0, channel = -1;
  if (optional_text(csv, row, column[PAGE]) && !aw_csv_int(csv, row, (gsize)column[PAGE], 0, 1000000, &page, error))
    return FALSE;
  if (optional_text(csv, row, column[CHANNEL]) &&
      !aw_csv_int(csv, row, (gsize)column[CHANNEL], 0, 1000, &channel, error))
    return FALSE;
  r->page = (int)page;
  r->channel = (int)channel;
  return TRUE;
}

static gboolean read_extras(const AwCsv *csv, gsize row, const int column[N_COLUMNS], AwScanRow *r, GError **error)
{
  r->taken_at_unix_s = NAN;
  if (optional_text(csv, row, column[PIXEL]) &&
      (!aw_csv_double(csv, row, (gsize)column[PIXEL], &r->pixel_um, error) ||
       !within(csv, row, PIXEL, r->pixel_um, MIN_PIXEL_UM, MAX_PIXEL_UM, error)))
    return FALSE;
  const char *time = optional_text(csv, row, column[TAKEN_AT]);
  g_autofree char *where =
      g_strdup_printf("%s, line %" G_GSIZE_FORMAT ", column taken_at", aw_csv_name(csv), aw_csv_line(csv, row));
  return !time || aw_text_to_time(time, where, &r->taken_at_unix_s, error);
}

/* Tables from Windows part folders by backslashes; a path with a drive letter leads nowhere here. */
static char *read_path(const AwCsv *csv, gsize row, int column, GError **error)
{
  const char *text = aw_csv_text(csv, row, (gsize)column), *fault = NULL;
  g_autofree char *folder = g_path_get_dirname(aw_csv_name(csv));
  g_autofree char *file = g_strstrip(g_strdelimit(g_strdup(text), "\\", '/'));
  if (!*file)
    fault = "names no file";
  else if (g_ascii_isalpha(file[0]) && file[1] == ':' && file[2] == '/')
    fault = "is a path of another machine; put the table beside the images and give paths from its folder";
  if (!fault)
    return g_path_is_absolute(file) ? g_steal_pointer(&file) : g_build_filename(folder, file, NULL);
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s, line %" G_GSIZE_FORMAT ", column file: '%s' %s", aw_csv_name(csv),
              aw_csv_line(csv, row), text, fault);
  return NULL;
}

static AwScanRow *read_row(const AwCsv *csv, gsize row, const int column[N_COLUMNS], GError **error)
{
  AwScanRow *r = g_new0(AwScanRow, 1);
  r->line = aw_csv_line(csv, row);
  r->path = read_path(csv, row, column[FILE_NAME], error);
  if (r->path && read_stage(csv, row, column, &r->stage, error) && read_plane(csv, row, column, r, error) &&
      read_extras(csv, row, column, r, error))
    return r;
  aw_scan_row_free(r);
  return NULL;
}

/* The same plane twice would make every nucleus of it a pair. */
static gboolean note_plane(GHashTable *seen, const char *table, const AwScanRow *r, GError **error)
{
  g_autofree char *whole = g_canonicalize_filename(r->path, NULL);
  char *key = g_strdup_printf("%d %d %s", r->page, r->channel, whole);
  gsize before = GPOINTER_TO_SIZE(g_hash_table_lookup(seen, key));
  g_hash_table_insert(seen, key, GSIZE_TO_POINTER(r->line));
  if (!before)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT,
              "%s, line %" G_GSIZE_FORMAT ": %s, page %d, stands in line %" G_GSIZE_FORMAT
              " already; a frame may be named once",
              table, r->line, r->path, r->page, before);
  return FALSE;
}

static gboolean check_n_rows(const AwCsv *csv, GError **error)
{
  gsize n = aw_csv_n_rows(csv);
  if (n >= 1 && n <= AW_MAX_FRAMES)
    return TRUE;
  g_set_error(error, AW_ERROR, n ? AW_ERROR_RANGE : AW_ERROR_EMPTY,
              "%s names %" G_GSIZE_FORMAT " frames; a scan has 1 to %d", aw_csv_name(csv), n, AW_MAX_FRAMES);
  return FALSE;
}

static char **unknown_headings(const AwCsv *csv)
{
  GPtrArray *list = g_ptr_array_new();
  for (gsize i = 0; i < aw_csv_n_columns(csv); i++) {
    gboolean known = FALSE;
    for (int k = 0; k < N_COLUMNS; k++)
      known |= strcmp(aw_csv_heading(csv, i), headings[k]) == 0;
    if (!known)
      g_ptr_array_add(list, g_strdup(aw_csv_heading(csv, i)));
  }
  g_ptr_array_add(list, NULL);
  return (char **)g_ptr_array_free(list, FALSE);
}

GPtrArray *aw_scan_table_read(const char *path, char ***unknown, GError **error)
{
  int column[N_COLUMNS];
  g_autoptr(AwCsv) csv = aw_csv_read(path, ',', error);
  if (!csv || !find_columns(csv, column, error) || !check_n_rows(csv, error))
    return NULL;
  g_autoptr(GPtrArray) rows = g_ptr_array_new_with_free_func((GDestroyNotify)aw_scan_row_free);
  g_autoptr(GHashTable) seen = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, NULL);
  for (gsize row = 0; row < aw_csv_n_rows(csv); row++) {
    AwScanRow *r = read_row(csv, row, column, error);
    if (!r)
      return NULL;
    g_ptr_array_add(rows, r);
    if (!note_plane(seen, path, r, error))
      return NULL;
  }
  if (unknown)
    *unknown = unknown_headings(csv);
  return g_steal_pointer(&rows);
}

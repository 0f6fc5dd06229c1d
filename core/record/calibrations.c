/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "record/private.h"

void aw_calibration_free(AwCalibration *calibration)
{
  if (!calibration)
    return;
  g_free(calibration->kind);
  g_free(calibration->source);
  g_free(calibration->sha256);
  g_free(calibration->text);
  g_free(calibration);
}

gboolean aw_record_add_calibration(AwRecord *record, const AwCalibration *c, GError **error)
{
  g_return_val_if_fail(record->in_action && c->kind && c->source && c->sha256 && c->text, FALSE);
  sqlite3_stmt *put = aw_sql_prepare(
      record, "INSERT INTO calibration(kind, at_unix_s, source, sha256, origin, text) VALUES(?, ?, ?, ?, ?, ?)", error);
  if (!put)
    return FALSE;
  aw_sql_bind_text(put, 1, c->kind);
  aw_sql_bind_double(put, 2, c->at_unix_s);
  aw_sql_bind_text(put, 3, c->source);
  aw_sql_bind_text(put, 4, c->sha256);
  sqlite3_bind_int(put, 5, (int)c->origin);
  aw_sql_bind_text(put, 6, c->text);
  return aw_sql_run(record, put, error);
}

GPtrArray *aw_record_calibrations(AwRecord *record, GError **error)
{
  g_autoptr(GPtrArray) all = g_ptr_array_new_with_free_func((GDestroyNotify)aw_calibration_free);
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(
      record, "SELECT id, kind, at_unix_s, source, sha256, origin, text FROM calibration ORDER BY at_unix_s, id",
      error);
  int row = get ? aw_sql_row(record, get, error) : -1;
  for (; row > 0; row = aw_sql_row(record, get, error)) {
    int origin = sqlite3_column_int(get, 5);
    if (origin < AW_ORIGIN_ASSUMED || origin > AW_ORIGIN_FITTED) {
      aw_record_damaged(record, error, "a calibration has the unknown origin %d", origin);
      return NULL;
    }
    AwCalibration *c = g_new0(AwCalibration, 1);
    c->id = sqlite3_column_int64(get, 0);
    c->kind = aw_sql_text(get, 1);
    c->at_unix_s = aw_sql_double(get, 2);
    c->source = aw_sql_text(get, 3);
    c->sha256 = aw_sql_text(get, 4);
    c->origin = (AwOrigin)origin;
    c->text = aw_sql_text(get, 6);
    g_ptr_array_add(all, c);
  }
  return row == 0 ? g_steal_pointer(&all) : NULL;
}

const AwCalibration *aw_calibration_newest(GPtrArray *calibrations, const char *kind)
{
  for (guint i = calibrations->len; i > 0; i--) {
    const AwCalibration *c = calibrations->pdata[i - 1];
    if (strcmp(c->kind, kind) == 0)
      return c;
  }
  return NULL;
}

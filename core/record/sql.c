/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/error.h"
#include "record/private.h"

static AwErrorCode error_code(int sqlite_code)
{
  switch (sqlite_code & 0xff) {
  case SQLITE_BUSY:
  case SQLITE_LOCKED:
    return AW_ERROR_LOCKED;
  case SQLITE_NOMEM:
    return AW_ERROR_MEMORY;
  case SQLITE_CORRUPT:
  case SQLITE_NOTADB:
  case SQLITE_ERROR: /* missing table or column: not the schema it claims to have */
  case SQLITE_TOOBIG:
  case SQLITE_MISMATCH:
    return AW_ERROR_FORMAT;
  case SQLITE_CONSTRAINT:
    return AW_ERROR_STATE;
  default:
    return AW_ERROR_IO;
  }
}

static const char *plain_words(sqlite3 *db)
{
  if (sqlite3_extended_errcode(db) == SQLITE_READONLY_ROLLBACK)
    return "it was left half-written by a program that stopped; open it once where it can be written";
  switch (sqlite3_errcode(db) & 0xff) {
  case SQLITE_BUSY:
    return "another program kept it busy for too long";
  case SQLITE_FULL:
    return "the disk is full";
  case SQLITE_NOTADB:
    return "it is not a dish record";
  default:
    return sqlite3_errmsg(db);
  }
}

gboolean aw_sql_fail(sqlite3 *db, const char *what, const char *path, GError **error)
{
  AwErrorCode code = db ? error_code(sqlite3_errcode(db)) : AW_ERROR_MEMORY;
  g_set_error(error, AW_ERROR, (int)code, "cannot %s %s: %s", what, path, db ? plain_words(db) : "not enough memory");
  return FALSE;
}

gboolean aw_record_fail(AwRecord *record, GError **error)
{
  return aw_sql_fail(record->db, record->in_action ? "write" : "read", record->path, error);
}

gboolean aw_record_damaged(AwRecord *record, GError **error, const char *format, ...)
{
  va_list args;
  va_start(args, format);
  g_autofree char *what = g_strdup_vprintf(format, args);
  va_end(args);
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s is damaged: %s", record->path, what);
  return FALSE;
}

static gboolean is_open(AwRecord *record, GError **error)
{
  if (record->db)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s is no longer open after an earlier error", record->path);
  return FALSE;
}

gboolean aw_sql_exec(AwRecord *record, const char *sql, GError **error)
{
  if (!is_open(record, error))
    return FALSE;
  if (sqlite3_exec(record->db, sql, NULL, NULL, NULL) != SQLITE_OK)
    return aw_record_fail(record, error);
  return TRUE;
}

sqlite3_stmt *aw_sql_prepare(AwRecord *record, const char *sql, GError **error)
{
  if (!is_open(record, error))
    return NULL;
  sqlite3_stmt *statement = g_hash_table_lookup(record->statements, sql);
  if (statement) {
    sqlite3_reset(statement);
    sqlite3_clear_bindings(statement);
    return statement;
  }
  if (sqlite3_prepare_v3(record->db, sql, -1, SQLITE_PREPARE_PERSISTENT, &statement, NULL) != SQLITE_OK) {
    aw_record_fail(record, error);
    return NULL;
  }
  g_hash_table_insert(record->statements, g_strdup(sql), statement);
  return statement;
}

gboolean aw_sql_run(AwRecord *record, sqlite3_stmt *statement, GError **error)
{
  int code = sqlite3_step(statement);
  gboolean ok = code == SQLITE_DONE || aw_record_fail(record, error);
  sqlite3_reset(statement);
  return ok;
}

int aw_sql_row(AwRecord *record, sqlite3_stmt *statement, GError **error)
{
  int code = sqlite3_step(statement);
  if (code == SQLITE_ROW)
    return 1;
  if (code != SQLITE_DONE)
    aw_record_fail(record, error);
  sqlite3_reset(statement);
  return code == SQLITE_DONE ? 0 : -1;
}

gboolean aw_sql_int(AwRecord *record, const char *sql, gint64 *value, GError **error)
{
  g_autoptr(sqlite3_stmt) statement = aw_sql_prepare(record, sql, error);
  int row = statement ? aw_sql_row(record, statement, error) : -1;
  *value = row > 0 ? sqlite3_column_int64(statement, 0) : 0;
  return row >= 0;
}

void aw_sql_bind_double(sqlite3_stmt *statement, int at, double value)
{
  if (isnan(value))
    sqlite3_bind_null(statement, at);
  else
    sqlite3_bind_double(statement, at, value);
}

void aw_sql_bind_text(sqlite3_stmt *statement, int at, const char *text)
{
  sqlite3_bind_text(statement, at, text, -1, SQLITE_TRANSIENT);
}

double aw_sql_double(sqlite3_stmt *statement, int column)
{
  return sqlite3_column_type(statement, column) == SQLITE_NULL ? NAN : sqlite3_column_double(statement, column);
}

char *aw_sql_text(sqlite3_stmt *statement, int column)
{
  const char *text = (const char *)sqlite3_column_text(statement, column);
  return g_utf8_make_valid(text ? text : "", -1);
}

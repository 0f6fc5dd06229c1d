/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdio.h>
#include <unistd.h>

#include "base/error.h"
#include "record/private.h"

static gboolean add_calibrations(AwRecord *record, GError **error)
{
  return aw_sql_exec(
      record,
      "CREATE TABLE calibration(id INTEGER NOT NULL PRIMARY KEY, kind TEXT NOT NULL, at_unix_s REAL NOT NULL,"
      " source TEXT NOT NULL, sha256 TEXT NOT NULL, origin INTEGER NOT NULL CHECK(origin BETWEEN 0 AND 2),"
      " text TEXT NOT NULL) STRICT",
      error);
}

const AwMigration *aw_migrations(gsize *n)
{
  static const AwMigration steps[] = { { 1, add_calibrations } };
  *n = G_N_ELEMENTS(steps);
  return steps;
}

static int copy_pages(sqlite3 *from, sqlite3 *to)
{
  sqlite3_backup *backup = sqlite3_backup_init(to, "main", from, "main");
  if (!backup)
    return sqlite3_errcode(to);
  sqlite3_backup_step(backup, -1);
  return sqlite3_backup_finish(backup);
}

/* Copies the record, page by page through SQLite, to `path`; synced by SQLite's own commit. */
static gboolean copy_record(AwRecord *record, const char *path, GError **error)
{
  sqlite3 *copy = NULL;
  unlink(path);
  gboolean ok = sqlite3_open_v2(path, &copy, SQLITE_OPEN_READWRITE | SQLITE_OPEN_CREATE, NULL) == SQLITE_OK &&
                copy_pages(record->db, copy) == SQLITE_OK;
  if (!ok)
    aw_sql_fail(copy, "keep the older version of the record as", path, error);
  if (sqlite3_close(copy) == SQLITE_OK && ok)
    return TRUE;
  unlink(path);
  return FALSE;
}

static gboolean keep_before(AwRecord *record, int version, GError **error)
{
  g_autofree char *kept = g_strdup_printf("%s.before-v%d", record->real_path, version);
  g_autofree char *draft = g_strconcat(kept, ".new", NULL);
  if (!copy_record(record, draft, error))
    return FALSE;
  if (rename(draft, kept) == 0)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_IO, "cannot keep the older version of the record as %s", kept);
  unlink(draft);
  return FALSE;
}

static const AwMigration *find_step(const AwMigration *steps, gsize n_steps, int from)
{
  for (gsize i = 0; i < n_steps; i++)
    if (steps[i].from == from)
      return &steps[i];
  return NULL;
}

static gboolean run_steps(AwRecord *record, int from, int target, const AwMigration *steps, gsize n_steps,
                          GError **error)
{
  for (int version = from; version < target; version++)
    if (!find_step(steps, n_steps, version)->apply(record, error))
      return FALSE;
  g_autofree char *stamp = g_strdup_printf("PRAGMA user_version = %d", target);
  g_autofree char *action = g_strdup_printf("Brought the record from format version %d to %d", from, target);
  return aw_sql_exec(record, stamp, error) &&
         aw_journal_append(record, AW_ENTRY_START, 0, g_get_user_name(), action, error) &&
         aw_record_check(record, error);
}

gboolean aw_migrate(AwRecord *record, int from, int target, const AwMigration *steps, gsize n_steps, GError **error)
{
  for (int version = from; version < target; version++)
    if (!find_step(steps, n_steps, version)) {
      g_set_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED, "%s has the format version %d, which this Aimwell cannot read",
                  record->path, from);
      return FALSE;
    }
  /* Steps may rebuild tables, so foreign keys are checked once, at the end. */
  if (!keep_before(record, from, error) || !aw_sql_exec(record, "PRAGMA foreign_keys = OFF; BEGIN IMMEDIATE", error))
    return FALSE;
  gboolean ok = run_steps(record, from, target, steps, n_steps, error) && aw_sql_exec(record, "COMMIT", error);
  if (!ok)
    sqlite3_exec(record->db, "ROLLBACK", NULL, NULL, NULL);
  return sqlite3_exec(record->db, "PRAGMA foreign_keys = ON", NULL, NULL, NULL) == SQLITE_OK && ok;
}

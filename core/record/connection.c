/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "record/private.h"

/* synchronous = EXTRA is FULL plus a sync of the folder after each commit: without it a power cut just after a commit
 * can bring the rollback journal's name back, and with it the state before the commit. */
static const char settings[] = "PRAGMA foreign_keys = ON; PRAGMA synchronous = EXTRA; PRAGMA temp_store = MEMORY;"
                               "PRAGMA cell_size_check = ON; PRAGMA cache_size = -65536;";

static void finalize(gpointer statement)
{
  sqlite3_finalize(statement);
}

/* A record may come from anywhere: nothing in its schema is trusted, and no value may claim more than our limit. */
static void harden(sqlite3 *db)
{
  sqlite3_db_config(db, SQLITE_DBCONFIG_DEFENSIVE, 1, NULL);
  sqlite3_db_config(db, SQLITE_DBCONFIG_TRUSTED_SCHEMA, 0, NULL);
  sqlite3_db_config(db, SQLITE_DBCONFIG_DQS_DML, 0, NULL);
  sqlite3_db_config(db, SQLITE_DBCONFIG_DQS_DDL, 0, NULL);
  sqlite3_limit(db, SQLITE_LIMIT_LENGTH, AW_RECORD_MAX_VALUE_BYTES);
}

static gboolean refuse_foreign(AwRecord *record, GError **error)
{
  gint64 id = 0;
  if (!aw_sql_int(record, "PRAGMA application_id", &id, error))
    return FALSE;
  if (id == AW_RECORD_APPLICATION_ID)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s is not a dish record (application_id 0x%08x instead of 0x%08x)",
              record->path, (guint)id, (guint)AW_RECORD_APPLICATION_ID);
  return FALSE;
}

static gboolean refuse_read_only(AwRecord *record, GError **error)
{
  if (record->mode == AW_RECORD_READ || !sqlite3_db_readonly(record->db, "main"))
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_IO, "cannot write %s: the file is read-only for you", record->path);
  return FALSE;
}

static gboolean fit_version(AwRecord *record, GError **error)
{
  gint64 version = 0;
  if (!aw_sql_int(record, "PRAGMA user_version", &version, error))
    return FALSE;
  if (version == AW_RECORD_VERSION)
    return TRUE;
  if (version > AW_RECORD_VERSION || version < 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED,
                "%s was written by a newer Aimwell: its format is version %" G_GINT64_FORMAT
                ", this one reads up to %d",
                record->path, version, AW_RECORD_VERSION);
    return FALSE;
  }
  if (record->mode == AW_RECORD_READ) {
    g_set_error(error, AW_ERROR, AW_ERROR_STATE,
                "%s has the older format version %" G_GINT64_FORMAT "; open it once for writing to bring it to %d",
                record->path, version, AW_RECORD_VERSION);
    return FALSE;
  }
  gsize n_steps;
  const AwMigration *steps = aw_migrations(&n_steps);
  return aw_migrate(record, (int)version, AW_RECORD_VERSION, steps, n_steps, error);
}

static gboolean make_schema(AwRecord *record, GError **error)
{
  g_autofree char *tables = aw_schema_sql();
  g_autofree char *sql = g_strdup_printf("BEGIN IMMEDIATE; PRAGMA application_id = %d; PRAGMA user_version = %d; %s"
                                         "COMMIT;",
                                         AW_RECORD_APPLICATION_ID, AW_RECORD_VERSION, tables);
  return aw_sql_exec(record, sql, error);
}

gboolean aw_connection_open(AwRecord *record, const char *path, gboolean create, GError **error)
{
  /* Readers, too, open for writing where they may: only so can SQLite roll back what a killed writer left behind. */
  int flags = SQLITE_OPEN_READWRITE | SQLITE_OPEN_EXRESCODE | (create ? SQLITE_OPEN_CREATE : 0);
  if (sqlite3_open_v2(path, &record->db, flags, NULL) != SQLITE_OK) {
    aw_sql_fail(record->db, "open", record->path, error);
    aw_connection_close(record);
    return FALSE;
  }
  record->statements = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, finalize);
  sqlite3_busy_timeout(record->db, AW_RECORD_BUSY_MS);
  harden(record->db);
  gboolean writes = record->mode == AW_RECORD_WRITE;
  gboolean ok = (create || refuse_foreign(record, error)) && aw_sql_exec(record, settings, error) &&
                refuse_read_only(record, error) &&
                aw_sql_exec(record, writes ? "PRAGMA journal_mode = DELETE" : "PRAGMA query_only = ON", error) &&
                (create ? make_schema(record, error) : fit_version(record, error)) &&
                (create || aw_schema_check(record, error));
  if (!ok)
    aw_connection_close(record);
  return ok;
}

void aw_connection_close(AwRecord *record)
{
  aw_changes_unwatch(record);
  g_clear_pointer(&record->statements, g_hash_table_unref);
  sqlite3_close(record->db);
  record->db = NULL;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "base/error.h"
#include "record/private.h"

/* The schema of AW_RECORD_VERSION, explained in docs/formats-record.md. Changing a word here asks for a new version, a
 * step in migrate.c and a record of the new version under tests/records. %s: the feature columns of table nucleus. */
static const char schema[] =
    "CREATE TABLE fact(key TEXT NOT NULL PRIMARY KEY, value TEXT NOT NULL) STRICT;"
    "CREATE TABLE frame(number INTEGER NOT NULL PRIMARY KEY, file TEXT NOT NULL, page INTEGER NOT NULL,"
    " channel INTEGER NOT NULL, width_px INTEGER NOT NULL, height_px INTEGER NOT NULL, full_scale REAL NOT NULL,"
    " stage_x_um REAL NOT NULL, stage_y_um REAL NOT NULL, pixel_um REAL NOT NULL, taken_at_unix_s REAL,"
    " size_bytes INTEGER NOT NULL, sha256 TEXT NOT NULL, overview BLOB) STRICT;"
    "CREATE TABLE file_time(file TEXT NOT NULL PRIMARY KEY, mtime_ns INTEGER NOT NULL) STRICT;"
    "CREATE TABLE shape(id INTEGER NOT NULL PRIMARY KEY, runs BLOB NOT NULL, outline BLOB NOT NULL) STRICT;"
    "CREATE TABLE nucleus(id INTEGER NOT NULL PRIMARY KEY AUTOINCREMENT,"
    " frame INTEGER NOT NULL REFERENCES frame(number), frame_x_px REAL, frame_y_px REAL, scan_x_um REAL,"
    " scan_y_um REAL, n_views INTEGER NOT NULL, flags INTEGER NOT NULL, shape INTEGER NOT NULL REFERENCES shape(id)"
    "%s) STRICT;"
    "CREATE TABLE decision(nucleus INTEGER NOT NULL PRIMARY KEY REFERENCES nucleus(id) ON DELETE CASCADE,"
    " state INTEGER NOT NULL CHECK(state BETWEEN 1 AND 3), by_hand INTEGER NOT NULL, journal INTEGER NOT NULL) STRICT;"
    "CREATE TABLE gate(number INTEGER NOT NULL PRIMARY KEY, feature TEXT NOT NULL, min REAL NOT NULL,"
    " max REAL NOT NULL) STRICT;"
    "CREATE TABLE tour_stop(number INTEGER NOT NULL PRIMARY KEY,"
    " nucleus INTEGER NOT NULL REFERENCES nucleus(id) ON DELETE CASCADE) STRICT;"
    "CREATE INDEX tour_stop_nucleus ON tour_stop(nucleus);"
    "CREATE TABLE calibration(id INTEGER NOT NULL PRIMARY KEY, kind TEXT NOT NULL, at_unix_s REAL NOT NULL,"
    " source TEXT NOT NULL, sha256 TEXT NOT NULL, origin INTEGER NOT NULL CHECK(origin BETWEEN 0 AND 2),"
    " text TEXT NOT NULL) STRICT;"
    "CREATE TABLE journal(id INTEGER NOT NULL PRIMARY KEY, at_unix_s REAL NOT NULL, operator TEXT NOT NULL,"
    " action TEXT NOT NULL, kind INTEGER NOT NULL CHECK(kind BETWEEN 0 AND 4),"
    " target INTEGER REFERENCES journal(id)) STRICT;"
    "CREATE TRIGGER journal_update BEFORE UPDATE ON journal BEGIN SELECT RAISE(ABORT, 'the journal is append-only'); "
    "END;"
    "CREATE TRIGGER journal_delete BEFORE DELETE ON journal BEGIN SELECT RAISE(ABORT, 'the journal is append-only'); "
    "END;"
    "CREATE TABLE change(journal INTEGER NOT NULL REFERENCES journal(id) DEFERRABLE INITIALLY DEFERRED, part INTEGER "
    "NOT NULL, packed BLOB NOT NULL,"
    " PRIMARY KEY(journal, part)) STRICT;";

char *aw_schema_sql(void)
{
  g_autoptr(GString) columns = g_string_new(NULL);
  gsize n_features;
  const AwFeature *features = aw_features(&n_features);
  for (gsize i = 0; i < n_features; i++) {
    g_autofree char *name = aw_feature_name(&features[i], TRUE);
    g_string_append_printf(columns, ", \"%s\" REAL", name);
  }
  return g_strdup_printf(schema, columns->str);
}

/* One line per table, column, index, view and trigger, in a fixed order: two databases of one schema give equal text.
 */
static const char describe[] =
    "SELECT s.type || ' ' || s.name || ' ' || CASE WHEN s.type IN ('table', 'index') THEN '' ELSE ifnull(s.sql, '') END"
    " FROM sqlite_schema s WHERE s.name NOT LIKE 'sqlite^_%' ESCAPE '^'"
    " UNION ALL "
    "SELECT 'column ' || s.name || '.' || c.name || ' ' || c.type || ' ' || c.\"notnull\" || ' ' || c.pk || ' ' ||"
    " c.hidden FROM sqlite_schema s, pragma_table_xinfo(s.name) c"
    " WHERE s.type = 'table' AND s.name NOT LIKE 'sqlite^_%' ESCAPE '^' ORDER BY 1";

/* The description of `db`, one line each; NULL with SQLite's error left in `db`. */
static char *describe_schema(sqlite3 *db)
{
  g_autoptr(GString) text = g_string_new(NULL);
  sqlite3_stmt *statement = NULL;
  int code = sqlite3_prepare_v2(db, describe, -1, &statement, NULL);
  while (code == SQLITE_OK || code == SQLITE_ROW) {
    code = sqlite3_step(statement);
    if (code == SQLITE_ROW)
      g_string_append_printf(text, "%s\n", (const char *)sqlite3_column_text(statement, 0));
  }
  sqlite3_finalize(statement);
  return code == SQLITE_DONE ? g_string_free(g_steal_pointer(&text), FALSE) : NULL;
}

/* What the present version's schema looks like, made in memory. */
static char *expected_schema(void)
{
  sqlite3 *db = NULL;
  g_autofree char *sql = aw_schema_sql();
  char *text = NULL;
  if (sqlite3_open(":memory:", &db) == SQLITE_OK && sqlite3_exec(db, sql, NULL, NULL, NULL) == SQLITE_OK)
    text = describe_schema(db);
  sqlite3_close(db);
  return text;
}

/* The first line of `found` that differs from `expected`, or what is missing. */
static char *first_difference(const char *found, const char *expected)
{
  g_auto(GStrv) have = g_strsplit(found, "\n", -1);
  g_auto(GStrv) want = g_strsplit(expected, "\n", -1);
  gsize i = 0;
  while (have[i] && want[i] && !strcmp(have[i], want[i]))
    i++;
  gboolean foreign = have[i] && *have[i] && !g_strv_contains((const char *const *)want, have[i]);
  return foreign ? g_strdup_printf("unexpected %s", have[i]) : g_strdup_printf("missing %s", want[i] ? want[i] : "");
}

gboolean aw_schema_check(AwRecord *record, GError **error)
{
  g_autofree char *expected = expected_schema();
  g_autofree char *found = expected ? describe_schema(record->db) : NULL;
  if (!expected) {
    g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "not enough memory to check %s", record->path);
    return FALSE;
  }
  if (!found)
    return aw_record_fail(record, error);
  if (!strcmp(found, expected))
    return TRUE;
  g_autofree char *difference = first_difference(found, expected);
  return aw_record_damaged(record, error, "its tables are not those of a dish record (%s)", difference);
}

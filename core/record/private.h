/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_RECORD_PRIVATE_H
#define AW_RECORD_PRIVATE_H

/* What the files of core/record share; nothing else includes this but the tests of core/record. */

#define SQLITE_ENABLE_SESSION
#define SQLITE_ENABLE_PREUPDATE_HOOK
#include <sqlite3.h>

#include "record/record.h"

#define AW_RECORD_APPLICATION_ID 0x41696d77  /* "Aimw" */
#define AW_RECORD_VERSION 2                  /* user_version that this Aimwell writes */
#define AW_RECORD_BUSY_MS 20000              /* how long a reader waits for a commit, and a commit for readers */
#define AW_RECORD_MAX_VALUE_BYTES (64 << 20) /* largest text or blob accepted from a record */
#define AW_RECORD_PART_BYTES (4 << 20)       /* a stored changeset is cut into parts of this size */

struct AwRecord {
  sqlite3 *db;      /* NULL after a failed publication */
  char *path;       /* as the caller gave it, for messages */
  char *real_path;  /* absolute, links followed */
  char *folder;     /* of real_path; image paths are relative to it */
  char *draft_path; /* where a new record stands until its first commit; NULL afterwards */
  char *lock_path;  /* NULL when no lock is held */
  int lock_fd;      /* -1 when no lock is held */
  AwRecordMode mode;
  char *warning;
  gboolean in_action;
  char *operator_name;      /* of the action begun */
  gint64 action_id;         /* journal number that the action begun will get */
  sqlite3_session *session; /* NULL outside an action and during the first one */
  GHashTable *statements;   /* SQL text -> prepared statement */
  GHashTable *touched;      /* image file -> new mtime_ns (gint64 *), stored with the next action */
};

/* --- sql.c: statements and errors --- */

/* Ends the statement's run so that it holds no lock; prepared statements stay in the record's cache. */
static inline void aw_sql_reset(sqlite3_stmt *statement)
{
  sqlite3_reset(statement);
}
G_DEFINE_AUTOPTR_CLEANUP_FUNC(sqlite3_stmt, aw_sql_reset)

/* Sets `error` from SQLite's last error on `db`: "cannot WHAT PATH: text". Always FALSE. */
gboolean aw_sql_fail(sqlite3 *db, const char *what, const char *path, GError **error);
gboolean aw_record_fail(AwRecord *record, GError **error);

/* AW_ERROR_FORMAT: "PATH is damaged: ..." Always FALSE. */
gboolean aw_record_damaged(AwRecord *record, GError **error, const char *format, ...) G_GNUC_PRINTF(3, 4);

gboolean aw_sql_exec(AwRecord *record, const char *sql, GError **error);

/* A cached statement, reset and with nothing bound; owned by the record. `sql` may be freed afterwards. */
sqlite3_stmt *aw_sql_prepare(AwRecord *record, const char *sql, GError **error);

/* Runs a statement that returns no rows. */
gboolean aw_sql_run(AwRecord *record, sqlite3_stmt *statement, GError **error);

/* Next row: 1 there is one, 0 no more, -1 error. */
int aw_sql_row(AwRecord *record, sqlite3_stmt *statement, GError **error);

/* The first column of the first row of `sql`; 0 when there is none. */
gboolean aw_sql_int(AwRecord *record, const char *sql, gint64 *value, GError **error);

void aw_sql_bind_double(sqlite3_stmt *statement, int at, double value); /* NaN becomes NULL */
void aw_sql_bind_text(sqlite3_stmt *statement, int at, const char *text);
double aw_sql_double(sqlite3_stmt *statement, int column); /* NULL becomes NaN */
char *aw_sql_text(sqlite3_stmt *statement, int column);    /* valid UTF-8, never NULL; g_free */

/* --- schema.c --- */

/* All CREATE statements of the present version. Free with g_free. */
char *aw_schema_sql(void);

/* Refuses tables, columns, views and triggers that are not those of the present version. */
gboolean aw_schema_check(AwRecord *record, GError **error);

/* --- lock.c --- */

gboolean aw_lock_take(AwRecord *record, GError **error);
void aw_lock_drop(AwRecord *record);

/* Name of a network file system by statfs's f_type, or NULL for a local one. */
const char *aw_lock_share_name(guint32 f_type);

/* --- migrate.c --- */

/* Brings a record from version `from` to from + 1, inside a transaction that the caller holds. */
typedef struct {
  int from;
  gboolean (*apply)(AwRecord *record, GError **error);
} AwMigration;

/* The steps of this Aimwell, rising; *n gets their number. */
const AwMigration *aw_migrations(gsize *n);

/* Keeps PATH.before-vN, then runs the steps from version N to `target` in one transaction. */
gboolean aw_migrate(AwRecord *record, int from, int target, const AwMigration *steps, gsize n_steps, GError **error);

/* --- connection.c --- */

/* Opens `path` (absolute) as the record's database and sets it up. */
gboolean aw_connection_open(AwRecord *record, const char *path, gboolean create, GError **error);
void aw_connection_close(AwRecord *record);

/* --- publish.c --- */

gboolean aw_draft_create(AwRecord *record, GError **error);

/* Gives the draft its final name (which must be free) and opens it there. */
gboolean aw_draft_publish(AwRecord *record, GError **error);
void aw_draft_remove(AwRecord *record);

/* --- changeset.c --- */

/* Starts and ends the watch over the tables that undo covers. */
gboolean aw_changes_watch(AwRecord *record, GError **error);
void aw_changes_unwatch(AwRecord *record);

/* Keeps the watched changes, packed, as those of journal entry `journal_id`; *any tells whether there were any. */
gboolean aw_changes_store(AwRecord *record, gint64 journal_id, gboolean *any, GError **error);

/* Applies the changes of `journal_id`, or their inverse; any mismatch with the present data is an error. */
gboolean aw_changes_apply(AwRecord *record, gint64 journal_id, gboolean inverse, GError **error);

/* --- journal.c --- */

/* What an entry is: kinds other than "do" are never undone themselves. */
typedef enum {
  AW_ENTRY_START, /* made the record, or changed its format: nothing before it can be undone */
  AW_ENTRY_DO,    /* changed data */
  AW_ENTRY_NOTE,  /* changed no data, such as an export */
  AW_ENTRY_UNDO,  /* took back the entry it names */
  AW_ENTRY_REDO   /* applied again the entry it names */
} AwEntryKind;

/* The number the next entry gets. */
gboolean aw_journal_next_id(AwRecord *record, gint64 *id, GError **error);

/* target_id: the entry taken back or applied again, 0 for none. */
gboolean aw_journal_append(AwRecord *record, AwEntryKind kind, gint64 target_id, const char *operator_name,
                           const char *action, GError **error);

/* The action text of an entry. Free with g_free. */
char *aw_journal_action(AwRecord *record, gint64 id, GError **error);

/* Entries (gint64 ids) in force and undone, the next to undo or redo last in each. */
typedef struct {
  GArray *standing, *undone;
} AwHistory;

gboolean aw_history_read(AwRecord *record, AwHistory *history, GError **error);
void aw_history_clear(AwHistory *history);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwHistory, aw_history_clear)

/* --- frames.c --- */

/* The time of an image file, outside undo. */
gboolean aw_frames_put_time(AwRecord *record, const char *file, gint64 mtime_ns, GError **error);

/* --- shape.c: masks and outlines as blobs (docs/formats-record.md) --- */

#define AW_SHAPE_STEPS_PER_UM 8192.0 /* outlines are kept to 1/8192 um */

GByteArray *aw_shape_pack_runs(const AwRun *runs, gsize n_runs, GError **error);
GByteArray *aw_shape_pack_outline(const AwScanPoint *points, gsize n_points, GError **error);
gboolean aw_shape_unpack_runs(const guint8 *bytes, gsize n_bytes, AwRun **runs, gsize *n_runs, GError **error);
gboolean aw_shape_unpack_outline(const guint8 *bytes, gsize n_bytes, AwScanPoint **points, gsize *n_points,
                                 GError **error);

#endif

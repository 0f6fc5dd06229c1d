/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>
#define ZLIB_CONST
#include <zlib.h>

#include "base/error.h"
#include "record/private.h"

/* Undo rests on SQLite's session extension: it notes old and new values of every row that an action changes. The
 * changes are kept as one zlib stream, cut into parts. Tables outside this list are never undone: journal and change
 * themselves, shape (write-once rows that undone nuclei still name) and file_time (a cache). Children come before
 * their parents, so that applying deletions never runs into a cascade. */
static const char *const watched[] = { "decision", "tour_stop", "gate", "nucleus", "frame", "fact", "calibration" };

#define BUFFER_BYTES (1 << 16)

gboolean aw_changes_watch(AwRecord *record, GError **error)
{
  int code = sqlite3session_create(record->db, "main", &record->session);
  for (gsize i = 0; code == SQLITE_OK && i < G_N_ELEMENTS(watched); i++)
    code = sqlite3session_attach(record->session, watched[i]);
  if (code == SQLITE_OK)
    return TRUE;
  aw_changes_unwatch(record);
  g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "cannot begin an action on %s: %s", record->path, sqlite3_errstr(code));
  return FALSE;
}

void aw_changes_unwatch(AwRecord *record)
{
  if (record->session)
    sqlite3session_delete(record->session);
  record->session = NULL;
}

/* Packs what the session puts out and writes it away part by part. */
typedef struct {
  AwRecord *record;
  gint64 journal_id;
  int n_parts;
  z_stream zip;
  GByteArray *part;
  GError **error;
} Packer;

static gboolean write_part(Packer *packer)
{
  sqlite3_stmt *insert = aw_sql_prepare(packer->record, "INSERT INTO change VALUES(?, ?, ?)", packer->error);
  if (!insert)
    return FALSE;
  sqlite3_bind_int64(insert, 1, packer->journal_id);
  sqlite3_bind_int(insert, 2, packer->n_parts++);
  sqlite3_bind_blob64(insert, 3, packer->part->data, packer->part->len, SQLITE_STATIC);
  gboolean ok = aw_sql_run(packer->record, insert, packer->error);
  g_byte_array_set_size(packer->part, 0);
  return ok;
}

static gboolean pack(Packer *packer, const void *bytes, int n_bytes, int flush)
{
  guint8 buffer[BUFFER_BYTES];
  packer->zip.next_in = bytes;
  packer->zip.avail_in = (uInt)n_bytes;
  do {
    packer->zip.next_out = buffer;
    packer->zip.avail_out = sizeof buffer;
    deflate(&packer->zip, flush);
    g_byte_array_append(packer->part, buffer, (guint)(sizeof buffer - packer->zip.avail_out));
    if (packer->part->len >= AW_RECORD_PART_BYTES && !write_part(packer))
      return FALSE;
  } while (packer->zip.avail_out == 0);
  return TRUE;
}

static int take_output(void *data, const void *bytes, int n_bytes)
{
  return pack(data, bytes, n_bytes, Z_NO_FLUSH) ? SQLITE_OK : SQLITE_ABORT;
}

static gboolean store(Packer *packer)
{
  AwRecord *record = packer->record;
  int code = sqlite3session_changeset_strm(record->session, take_output, packer);
  if (code == SQLITE_OK) /* no bytes: rows were touched, but all hold what they held before */
    return packer->zip.total_in == 0 || (pack(packer, NULL, 0, Z_FINISH) && write_part(packer));
  if (!packer->error || !*packer->error)
    g_set_error(packer->error, AW_ERROR, AW_ERROR_IO, "cannot keep the changes of this action in %s: %s", record->path,
                sqlite3_errstr(code));
  return FALSE;
}

gboolean aw_changes_store(AwRecord *record, gint64 journal_id, gboolean *any, GError **error)
{
  Packer packer = { .record = record, .journal_id = journal_id, .error = error };
  if (deflateInit(&packer.zip, Z_BEST_SPEED) != Z_OK) {
    g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "not enough memory to keep the changes of this action");
    return FALSE;
  }
  packer.part = g_byte_array_new();
  gboolean ok = store(&packer);
  *any = packer.zip.total_in > 0;
  g_byte_array_unref(packer.part);
  deflateEnd(&packer.zip);
  return ok;
}

/* Unpacks the parts of one journal entry. */
typedef struct {
  AwRecord *record;
  sqlite3_stmt *parts;
  z_stream zip;
  int state; /* Z_OK while there is more, Z_STREAM_END at the end, else damaged */
} Unpacker;

/* The next part becomes the input. */
static gboolean next_part(Unpacker *unpacker)
{
  if (sqlite3_step(unpacker->parts) != SQLITE_ROW)
    return FALSE;
  unpacker->zip.next_in = sqlite3_column_blob(unpacker->parts, 0);
  unpacker->zip.avail_in = (uInt)sqlite3_column_bytes(unpacker->parts, 0);
  return unpacker->zip.avail_in > 0;
}

static int give_input(void *data, void *buffer, int *n_bytes)
{
  Unpacker *unpacker = data;
  unpacker->zip.next_out = buffer;
  unpacker->zip.avail_out = (uInt)*n_bytes;
  while (unpacker->state == Z_OK && unpacker->zip.avail_out > 0) {
    if (unpacker->zip.avail_in == 0 && !next_part(unpacker))
      unpacker->state = Z_DATA_ERROR;
    else
      unpacker->state = inflate(&unpacker->zip, Z_NO_FLUSH);
  }
  *n_bytes -= (int)unpacker->zip.avail_out;
  return unpacker->state == Z_OK || unpacker->state == Z_STREAM_END ? SQLITE_OK : SQLITE_CORRUPT;
}

static gboolean unpacker_start(Unpacker *unpacker, AwRecord *record, gint64 journal_id, GError **error)
{
  *unpacker = (Unpacker){ .record = record, .state = Z_OK };
  unpacker->parts = aw_sql_prepare(record, "SELECT packed FROM change WHERE journal = ? ORDER BY part", error);
  if (!unpacker->parts)
    return FALSE;
  sqlite3_bind_int64(unpacker->parts, 1, journal_id);
  if (inflateInit(&unpacker->zip) == Z_OK)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "not enough memory to undo or redo");
  return FALSE;
}

static void unpacker_end(Unpacker *unpacker)
{
  inflateEnd(&unpacker->zip);
  sqlite3_reset(unpacker->parts);
}

/* Unpacks all once for its checksum: SQLite shall not parse what is damaged. */
static gboolean verify(AwRecord *record, gint64 journal_id, GError **error)
{
  guint8 buffer[BUFFER_BYTES];
  Unpacker unpacker;
  if (!unpacker_start(&unpacker, record, journal_id, error))
    return FALSE;
  int n = sizeof buffer;
  while (unpacker.state == Z_OK && give_input(&unpacker, buffer, &n) == SQLITE_OK)
    n = sizeof buffer;
  gboolean ok = unpacker.state == Z_STREAM_END;
  unpacker_end(&unpacker);
  return ok || aw_record_damaged(record, error, "the changes of journal entry %" G_GINT64_FORMAT " cannot be read",
                                 journal_id);
}

static int is_watched(void *ignored, const char *table)
{
  (void)ignored;
  for (gsize i = 0; i < G_N_ELEMENTS(watched); i++)
    if (!strcmp(table, watched[i]))
      return 1;
  return 0;
}

/* Undo and redo run on exactly the data the changes were noted on; whatever does not fit was altered elsewhere. */
static int refuse_conflict(void *ignored, int kind, sqlite3_changeset_iter *change)
{
  (void)ignored;
  (void)kind;
  (void)change;
  return SQLITE_CHANGESET_ABORT;
}

gboolean aw_changes_apply(AwRecord *record, gint64 journal_id, gboolean inverse, GError **error)
{
  Unpacker unpacker;
  if (!verify(record, journal_id, error) || !unpacker_start(&unpacker, record, journal_id, error))
    return FALSE;
  int flags = inverse ? SQLITE_CHANGESETAPPLY_INVERT : 0;
  int code = sqlite3changeset_apply_v2_strm(record->db, give_input, &unpacker, is_watched, refuse_conflict, NULL, NULL,
                                            NULL, flags);
  unpacker_end(&unpacker);
  if (code == SQLITE_OK)
    return TRUE;
  if (code == SQLITE_ABORT)
    return aw_record_damaged(
        record, error, "the changes of journal entry %" G_GINT64_FORMAT " do not fit its present contents", journal_id);
  g_set_error(error, AW_ERROR, (code & 0xff) == SQLITE_NOMEM ? AW_ERROR_MEMORY : AW_ERROR_IO,
              "cannot undo or redo journal entry %" G_GINT64_FORMAT " of %s: %s", journal_id, record->path,
              sqlite3_errstr(code));
  return FALSE;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <errno.h>
#include <stdlib.h>
#include <sys/stat.h>
#include <sys/vfs.h>

#include "base/error.h"
#include "record/private.h"

static AwRecord *record_new(const char *path, AwRecordMode mode)
{
  AwRecord *record = g_new0(AwRecord, 1);
  record->path = g_strdup(path);
  record->mode = mode;
  record->lock_fd = -1;
  record->touched = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, g_free);
  return record;
}

static void warn_of_share(AwRecord *record)
{
  struct statfs fs;
  const char *share = statfs(record->folder, &fs) == 0 ? aw_lock_share_name((guint32)fs.f_type) : NULL;
  if (share)
    record->warning = g_strdup_printf("%s is on a %s file system: if that is a network share, locks may fail there and "
                                      "two writers could damage the record; keep it on a local disk while you work",
                                      record->path, share);
}

/* Resolves the folder of a record that does not exist yet; the file name stays as it is. */
static gboolean locate_new(AwRecord *record, GError **error)
{
  struct stat st;
  if (lstat(record->path, &st) == 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s already exists and is never overwritten", record->path);
    return FALSE;
  }
  g_autofree char *folder = g_path_get_dirname(record->path);
  g_autofree char *name = g_path_get_basename(record->path);
  char *real = realpath(folder, NULL);
  if (!real || stat(real, &st) != 0 || !S_ISDIR(st.st_mode) || g_str_has_suffix(record->path, "/")) {
    free(real);
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "cannot create %s: there is no folder %s", record->path, folder);
    return FALSE;
  }
  record->folder = g_strdup(real);
  free(real);
  record->real_path = g_build_filename(record->folder, name, NULL);
  return TRUE;
}

AwRecord *aw_record_create(const char *path, GError **error)
{
  g_return_val_if_fail(path && *path, NULL);
  g_autoptr(AwRecord) record = record_new(path, AW_RECORD_WRITE);
  if (!locate_new(record, error) || !aw_lock_take(record, error))
    return NULL;
  struct stat st;
  if (lstat(record->real_path, &st) == 0) { /* it appeared before we held the lock */
    g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s already exists and is never overwritten", path);
    return NULL;
  }
  if (!aw_draft_create(record, error))
    return NULL;
  warn_of_share(record);
  return g_steal_pointer(&record);
}

static gboolean locate(AwRecord *record, GError **error)
{
  struct stat st;
  char *real = realpath(record->path, NULL);
  if (!real || stat(real, &st) != 0) {
    int number = errno;
    free(real);
    g_set_error(error, AW_ERROR, number == ENOENT ? AW_ERROR_NOT_FOUND : AW_ERROR_IO, "cannot open %s: %s",
                record->path, g_strerror(number));
    return FALSE;
  }
  record->real_path = g_strdup(real);
  free(real);
  record->folder = g_path_get_dirname(record->real_path);
  if (S_ISREG(st.st_mode)) /* SQLite would wait for ever at a pipe */
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s is not a dish record but a %s", record->path,
              S_ISDIR(st.st_mode) ? "folder" : "pipe or device");
  return FALSE;
}

AwRecord *aw_record_open(const char *path, AwRecordMode mode, GError **error)
{
  g_return_val_if_fail(path && *path, NULL);
  g_autoptr(AwRecord) record = record_new(path, mode);
  if (!locate(record, error) || (mode == AW_RECORD_WRITE && !aw_lock_take(record, error)) ||
      !aw_connection_open(record, record->real_path, FALSE, error))
    return NULL;
  warn_of_share(record);
  return g_steal_pointer(&record);
}

void aw_record_free(AwRecord *record)
{
  if (!record)
    return;
  aw_record_rollback(record);
  aw_connection_close(record);
  aw_draft_remove(record);
  aw_lock_drop(record);
  g_hash_table_unref(record->touched);
  g_free(record->path);
  g_free(record->real_path);
  g_free(record->folder);
  g_free(record->warning);
  g_free(record->operator_name);
  g_free(record);
}

const char *aw_record_path(const AwRecord *record)
{
  return record->path;
}

const char *aw_record_warning(const AwRecord *record)
{
  return record->warning;
}

static gboolean check_pages(AwRecord *record, GError **error)
{
  g_autoptr(sqlite3_stmt) pages = aw_sql_prepare(record, "PRAGMA integrity_check(1)", error);
  if (!pages || aw_sql_row(record, pages, error) < 0)
    return FALSE;
  g_autofree char *text = aw_sql_text(pages, 0);
  return g_str_equal(text, "ok") || aw_record_damaged(record, error, "%s", text);
}

gboolean aw_record_check(AwRecord *record, GError **error)
{
  if (!check_pages(record, error))
    return FALSE;
  g_autoptr(sqlite3_stmt) keys = aw_sql_prepare(record, "PRAGMA foreign_key_check", error);
  int row = keys ? aw_sql_row(record, keys, error) : -1;
  if (row <= 0)
    return row == 0;
  g_autofree char *child = aw_sql_text(keys, 0);
  g_autofree char *parent = aw_sql_text(keys, 2);
  return aw_record_damaged(record, error, "row %lld of table %s names a row of table %s that is not there",
                           (long long)sqlite3_column_int64(keys, 1), child, parent);
}

gboolean aw_record_read_begin(AwRecord *record, GError **error)
{
  gint64 ignored;
  return aw_sql_exec(record, "BEGIN", error) && aw_sql_int(record, "SELECT count(*) FROM fact", &ignored, error);
}

void aw_record_read_end(AwRecord *record)
{
  if (record->db && !sqlite3_get_autocommit(record->db))
    sqlite3_exec(record->db, "COMMIT", NULL, NULL, NULL);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/error.h"
#include "record/private.h"

/* A new record grows as a hidden draft beside its final name. SQLite ties a database to the name it was opened
 * under (its rollback journal is named after it), so the draft is closed before it is renamed, and opened anew. */

static void remove_draft_files(const char *draft)
{
  g_autofree char *journal = g_strconcat(draft, "-journal", NULL);
  unlink(draft);
  unlink(journal);
}

gboolean aw_draft_create(AwRecord *record, GError **error)
{
  g_autofree char *base = g_path_get_basename(record->real_path);
  g_autofree char *name = g_strdup_printf(".%s.new", base);
  record->draft_path = g_build_filename(record->folder, name, NULL);
  remove_draft_files(record->draft_path); /* left by a killed process: we hold the lock, so nobody uses it */
  return aw_connection_open(record, record->draft_path, TRUE, error);
}

void aw_draft_remove(AwRecord *record)
{
  if (!record->draft_path)
    return;
  remove_draft_files(record->draft_path);
  g_clear_pointer(&record->draft_path, g_free);
}

/* Renames without replacing; file systems that cannot do that get a hard link, or at last a check and a plain rename
 * under the record's lock. */
static int rename_new(const char *from, const char *to)
{
  if (renameat2(AT_FDCWD, from, AT_FDCWD, to, RENAME_NOREPLACE) == 0)
    return 0;
  if (errno != EINVAL && errno != ENOSYS)
    return -1;
  if (link(from, to) == 0)
    return unlink(from);
  struct stat st;
  if (errno == EEXIST || lstat(to, &st) == 0) {
    errno = EEXIST;
    return -1;
  }
  return rename(from, to);
}

static void sync_folder(const char *folder)
{
  int fd = open(folder, O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  if (fd < 0 || fsync(fd) != 0)
    g_debug("folder %s could not be synced", folder);
  if (fd >= 0)
    close(fd);
}

gboolean aw_draft_publish(AwRecord *record, GError **error)
{
  aw_connection_close(record);
  if (rename_new(record->draft_path, record->real_path) != 0) {
    int number = errno;
    aw_draft_remove(record);
    g_set_error(error, AW_ERROR, number == EEXIST ? AW_ERROR_STATE : AW_ERROR_IO, "cannot create %s: %s", record->path,
                number == EEXIST ? "a file of that name appeared meanwhile" : g_strerror(number));
    return FALSE;
  }
  g_clear_pointer(&record->draft_path, g_free);
  sync_folder(record->folder);
  return aw_connection_open(record, record->real_path, FALSE, error);
}

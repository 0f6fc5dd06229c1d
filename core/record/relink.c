/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <errno.h>
#include <string.h>
#include <sys/stat.h>

#include "base/error.h"
#include "record/files.h"
#include "record/private.h"

#define MAX_DEPTH 16 /* folders within folders that are searched */

/* wanted: file name -> paths found (GPtrArray of char *). */
static void search(const char *folder, int depth, GHashTable *wanted)
{
  g_autoptr(GDir) dir = g_dir_open(folder, 0, NULL); /* folders that cannot be read hold nothing we could use */
  const char *name;
  while (dir && (name = g_dir_read_name(dir))) {
    g_autofree char *path = g_build_filename(folder, name, NULL);
    GPtrArray *paths = g_hash_table_lookup(wanted, name);
    struct stat st;
    if (lstat(path, &st) != 0)
      continue;
    if (S_ISDIR(st.st_mode) && depth < MAX_DEPTH)
      search(path, depth + 1, wanted);
    else if (paths && !S_ISDIR(st.st_mode))
      g_ptr_array_add(paths, g_steal_pointer(&path));
  }
}

static int by_text(gconstpointer a, gconstpointer b)
{
  return strcmp(*(const char *const *)a, *(const char *const *)b);
}

static void free_paths(gpointer paths)
{
  g_ptr_array_unref(paths);
}

/* Searches `folder` for the names of all images that are not as recorded. */
static GHashTable *find_candidates(GPtrArray *checks, const char *folder)
{
  GHashTable *wanted = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, free_paths);
  for (guint i = 0; i < checks->len; i++) {
    const AwFileCheck *check = g_ptr_array_index(checks, i);
    char *name = check->state == AW_FILE_SAME ? NULL : g_path_get_basename(check->file);
    if (name)
      g_hash_table_insert(wanted, name, g_ptr_array_new_with_free_func(g_free));
  }
  if (g_hash_table_size(wanted) > 0)
    search(folder, 0, wanted);
  GHashTableIter iter;
  gpointer paths;
  g_hash_table_iter_init(&iter, wanted);
  while (g_hash_table_iter_next(&iter, NULL, &paths))
    g_ptr_array_sort(paths, by_text); /* the order of a folder's entries is not ours to rely on */
  return wanted;
}

/* The first of `paths` that holds what `frame` says; `found` gets its identity. NULL when none does. */
static const char *pick(GPtrArray *paths, const AwFrame *frame, AwFrame *found)
{
  for (guint i = 0; paths && i < paths->len; i++) {
    const char *path = g_ptr_array_index(paths, i);
    struct stat st;
    if (stat(path, &st) == 0 && st.st_size == frame->size_bytes && aw_frame_identify(found, path, NULL) &&
        !g_ascii_strcasecmp(found->sha256, frame->sha256))
      return path;
  }
  return NULL;
}

static gboolean rename_file(AwRecord *record, const char *old, const char *new, gint64 mtime_ns, GError **error)
{
  sqlite3_stmt *update = aw_sql_prepare(record, "UPDATE frame SET file = ? WHERE file = ?", error);
  if (!update)
    return FALSE;
  aw_sql_bind_text(update, 1, new);
  aw_sql_bind_text(update, 2, old);
  return aw_sql_run(record, update, error) && aw_frames_put_time(record, new, mtime_ns, error);
}

static const AwFrame *frame_of(GPtrArray *frames, const char *file)
{
  guint i = 0;
  while (!g_str_equal(((AwFrame *)g_ptr_array_index(frames, i))->file, file))
    i++;
  return g_ptr_array_index(frames, i);
}

/* Relinks one image, if one of the candidates is it. */
static gboolean relink(AwRecord *record, const AwFrame *frame, GHashTable *candidates, gsize *n_relinked,
                       GError **error)
{
  g_autofree char *name = g_path_get_basename(frame->file);
  g_autoptr(AwFrame) found = aw_frame_new();
  const char *path = pick(g_hash_table_lookup(candidates, name), frame, found);
  if (!path)
    return TRUE;
  g_autofree char *file = aw_record_file_relative(record, path);
  ++*n_relinked;
  return rename_file(record, frame->file, file, found->mtime_ns, error);
}

gboolean aw_record_files_relink(AwRecord *record, const char *folder, AwProgress *progress, gsize *n_relinked,
                                GError **error)
{
  g_return_val_if_fail(record->in_action, FALSE);
  *n_relinked = 0;
  if (!g_file_test(folder, G_FILE_TEST_IS_DIR)) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "there is no folder %s to look for images in", folder);
    return FALSE;
  }
  g_autoptr(GPtrArray) frames = aw_record_frames(record, error);
  g_autoptr(GPtrArray) checks = frames ? aw_record_files_check(record, FALSE, 0, progress, error) : NULL;
  if (!checks)
    return FALSE;
  g_autoptr(GHashTable) candidates = find_candidates(checks, folder);
  for (guint i = 0; i < checks->len; i++) {
    const AwFileCheck *check = g_ptr_array_index(checks, i);
    if (check->state != AW_FILE_SAME && !relink(record, frame_of(frames, check->file), candidates, n_relinked, error))
      return FALSE;
    aw_progress_report(progress, "looking for images", (double)(i + 1) / checks->len);
    if (aw_progress_stopped(progress, error))
      return FALSE;
  }
  return TRUE;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "record/files.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include "base/error.h"
#include "base/output.h"
#include "base/pool.h"
#include "record/private.h"

const char *aw_record_folder(const AwRecord *record)
{
  return record->folder;
}

char *aw_record_file_path(const AwRecord *record, const char *file)
{
  return g_canonicalize_filename(file, record->folder);
}

/* `to` as seen from folder `from`, both canonical and absolute: "../" for every part left, then the parts entered. */
static char *relative(const char *from, const char *to)
{
  g_auto(GStrv) here = g_strsplit(from + 1, "/", -1);
  g_auto(GStrv) there = g_strsplit(to + 1, "/", -1);
  gsize same = 0;
  while (here[same] && *here[same] && there[same] && !strcmp(here[same], there[same]))
    same++;
  g_autoptr(GString) path = g_string_new(NULL);
  for (gsize i = same; here[i] && *here[i]; i++)
    g_string_append(path, "../");
  for (gsize i = same; there[i]; i++)
    g_string_append_printf(path, "%s%s", i > same ? "/" : "", there[i]);
  return g_string_free(g_steal_pointer(&path), FALSE);
}

char *aw_record_file_relative(const AwRecord *record, const char *path)
{
  /* As it is written, if that stays below the record's folder: links inside it are then kept. Else links followed. */
  g_autofree char *whole = g_canonicalize_filename(path, NULL);
  g_autofree char *record_whole = g_canonicalize_filename(record->path, NULL);
  g_autofree char *folder = g_path_get_dirname(record_whole);
  g_autofree char *written = relative(folder, whole);
  char *real = realpath(path, NULL);
  if (!real || !g_str_has_prefix(written, "../")) {
    free(real);
    return g_steal_pointer(&written);
  }
  char *followed = relative(record->folder, real);
  free(real);
  return followed;
}

static gint64 mtime_ns(const struct stat *st)
{
  return (gint64)st->st_mtim.tv_sec * G_GINT64_CONSTANT(1000000000) + st->st_mtim.tv_nsec;
}

/* stat of a regular file. */
static gboolean look(const char *path, struct stat *st, GError **error)
{
  if (stat(path, st) != 0)
    g_set_error(error, AW_ERROR, errno == ENOENT || errno == ENOTDIR ? AW_ERROR_NOT_FOUND : AW_ERROR_IO,
                "cannot read %s: %s", path, g_strerror(errno));
  else if (!S_ISREG(st->st_mode))
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s is no file but a folder, pipe or device", path);
  else
    return TRUE;
  return FALSE;
}

gboolean aw_frame_identify(AwFrame *frame, const char *path, GError **error)
{
  struct stat before, after;
  if (!look(path, &before, error))
    return FALSE;
  g_autofree char *sha256 = aw_input_sha256(path, error);
  if (!sha256 || !look(path, &after, error))
    return FALSE;
  if (before.st_size != after.st_size || mtime_ns(&before) != mtime_ns(&after)) {
    g_set_error(error, AW_ERROR, AW_ERROR_VERIFY, "%s changed while it was read", path);
    return FALSE;
  }
  frame->size_bytes = after.st_size;
  frame->mtime_ns = mtime_ns(&after);
  g_free(frame->sha256);
  frame->sha256 = g_steal_pointer(&sha256);
  return TRUE;
}

static void check_free(gpointer data)
{
  AwFileCheck *check = data;
  if (!check) /* a slot that a stopped run did not reach */
    return;
  g_free(check->file);
  g_free(check->problem);
  g_free(check);
}

static AwFileCheck *check_new(AwFileState state, guint differs, char *problem)
{
  AwFileCheck *check = g_new0(AwFileCheck, 1);
  check->state = state;
  check->differs = differs;
  check->problem = problem;
  return check;
}

static AwFileCheck *missing(const char *file, const GError *why)
{
  gboolean absent = g_error_matches(why, AW_ERROR, AW_ERROR_NOT_FOUND);
  return check_new(AW_FILE_MISSING, 0,
                   absent ? g_strdup_printf("image %s is missing (%s)", file, why->message)
                          : g_strdup_printf("image %s cannot be used: %s", file, why->message));
}

/* Compares the file at `path` with what `frame` says of it. */
static AwFileCheck *compare(const AwFrame *frame, const char *path, gboolean full)
{
  g_autoptr(GError) why = NULL;
  g_autoptr(AwFrame) now = aw_frame_new();
  struct stat st;
  if (!look(path, &st, &why))
    return missing(frame->file, why);
  guint differs = mtime_ns(&st) == frame->mtime_ns ? 0 : AW_FILE_TIME;
  if (st.st_size != frame->size_bytes)
    return check_new(AW_FILE_CHANGED, differs | AW_FILE_SIZE,
                     g_strdup_printf("image %s has changed: it had %" G_GINT64_FORMAT " bytes and has %" G_GINT64_FORMAT
                                     " now",
                                     frame->file, frame->size_bytes, (gint64)st.st_size));
  if (!full && !differs)
    return check_new(AW_FILE_SAME, 0, NULL);
  if (!aw_frame_identify(now, path, &why))
    return missing(frame->file, why);
  if (g_ascii_strcasecmp(now->sha256, frame->sha256))
    return check_new(AW_FILE_CHANGED, differs | AW_FILE_HASH,
                     g_strdup_printf("image %s has changed: its size is the same, but its SHA-256 was %.12s... and is "
                                     "%.12s... now",
                                     frame->file, frame->sha256, now->sha256));
  AwFileCheck *check = check_new(AW_FILE_SAME, differs, NULL);
  check->mtime_ns = now->mtime_ns;
  return check;
}

/* The images to compare, one frame for each, and a slot for each verdict. */
typedef struct {
  const AwRecord *record;
  gboolean full;
  GPtrArray *frames; /* AwFrame, borrowed */
  GPtrArray *checks; /* AwFileCheck, as many as frames */
} Comparison;

static gboolean compare_one(gsize item, guint worker, gpointer data, GError **error)
{
  (void)worker;
  (void)error; /* what is wrong with a file is a verdict, not an error */
  Comparison *comparison = data;
  const AwFrame *frame = comparison->frames->pdata[item];
  g_autofree char *path = aw_record_file_path(comparison->record, frame->file);
  AwFileCheck *check = compare(frame, path, comparison->full);
  check->file = g_strdup(frame->file);
  if (check->state == AW_FILE_SAME && !check->mtime_ns)
    check->mtime_ns = frame->mtime_ns;
  comparison->checks->pdata[item] = check;
  return TRUE;
}

/* The first frame of every image file. */
static GPtrArray *distinct_files(GPtrArray *frames)
{
  g_autoptr(GHashTable) seen = g_hash_table_new(g_str_hash, g_str_equal);
  GPtrArray *distinct = g_ptr_array_new();
  for (guint i = 0; i < frames->len; i++) {
    AwFrame *frame = g_ptr_array_index(frames, i);
    if (g_hash_table_add(seen, frame->file))
      g_ptr_array_add(distinct, frame);
  }
  return distinct;
}

/* Times of files found the same in spite of a new time; action.c stores them. */
static void note_touched(AwRecord *record, GPtrArray *checks)
{
  for (guint i = 0; record->mode == AW_RECORD_WRITE && i < checks->len; i++) {
    const AwFileCheck *check = g_ptr_array_index(checks, i);
    if (check->state == AW_FILE_SAME && (check->differs & AW_FILE_TIME))
      g_hash_table_insert(record->touched, g_strdup(check->file), g_memdup2(&check->mtime_ns, sizeof check->mtime_ns));
  }
}

static GPtrArray *check_frames(AwRecord *record, GPtrArray *frames, gboolean full, guint n_threads,
                               AwProgress *progress, GError **error)
{
  g_autoptr(GPtrArray) distinct = distinct_files(frames);
  g_autoptr(GPtrArray) checks = g_ptr_array_new_with_free_func(check_free);
  g_ptr_array_set_size(checks, (gint)distinct->len);
  Comparison comparison = { record, full, distinct, checks };
  gboolean ok = aw_pool_run(n_threads, distinct->len, compare_one, &comparison, "comparing images", progress, error);
  if (!ok)
    return NULL;
  note_touched(record, checks);
  return g_steal_pointer(&checks);
}

GPtrArray *aw_record_files_check(AwRecord *record, gboolean full, guint n_threads, AwProgress *progress, GError **error)
{
  g_autoptr(GPtrArray) frames = aw_record_frames(record, error);
  return frames ? check_frames(record, frames, full, n_threads, progress, error) : NULL;
}

gboolean aw_record_files_require(AwRecord *record, gboolean full, guint n_threads, AwProgress *progress, GError **error)
{
  g_autoptr(GPtrArray) checks = aw_record_files_check(record, full, n_threads, progress, error);
  for (guint i = 0; checks && i < checks->len; i++) {
    const AwFileCheck *check = g_ptr_array_index(checks, i);
    if (check->state == AW_FILE_SAME)
      continue;
    g_set_error_literal(error, AW_ERROR, check->state == AW_FILE_MISSING ? AW_ERROR_NOT_FOUND : AW_ERROR_VERIFY,
                        check->problem);
    return FALSE;
  }
  return checks != NULL;
}

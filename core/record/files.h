/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_RECORD_FILES_H
#define AW_RECORD_FILES_H

#include "base/progress.h"
#include "record/record.h"

/* Are the images still those that the record was made from? Compared by size, time and SHA-256. */

/* The folder that relative image paths start from: that of the record itself, symbolic links followed. */
const char *aw_record_folder(const AwRecord *record);

/* The absolute path of an image that the record calls `file`. Free with g_free. */
char *aw_record_file_path(const AwRecord *record, const char *file);

/* What to call the image at `path` in the record: relative to its folder, '/' separators. Free with g_free. */
char *aw_record_file_relative(const AwRecord *record, const char *path);

/* Fills in size, time and SHA-256 of the image at `path`. AW_ERROR_IO, AW_ERROR_NOT_FOUND; AW_ERROR_VERIFY when the
 * file changes while it is read. */
gboolean aw_frame_identify(AwFrame *frame, const char *path, GError **error);

typedef enum { AW_FILE_SAME, AW_FILE_CHANGED, AW_FILE_MISSING } AwFileState;

/* In what a file differs from what the record says; a new time alone is no change. */
typedef enum { AW_FILE_SIZE = 1 << 0, AW_FILE_TIME = 1 << 1, AW_FILE_HASH = 1 << 2 } AwFileDifference;

typedef struct {
  char *file; /* as the record calls it */
  AwFileState state;
  guint differs;   /* AwFileDifference bits */
  gint64 mtime_ns; /* found now; 0 when missing */
  char *problem;   /* a sentence naming the file and what is wrong; NULL when it is the same */
} AwFileCheck;

/**
 * aw_record_files_check: looks at every image of the record once, in scan order (GPtrArray of AwFileCheck).
 *
 * full: hashes all; otherwise only files whose size is right and whose time is not. n_threads as in aw_pool_run.
 * A file with a new time but the old contents is the same; a record open for writing notes the new time with its
 * next commit.
 */
GPtrArray *aw_record_files_check(AwRecord *record, gboolean full, guint n_threads, AwProgress *progress,
                                 GError **error);

/* As above, but the first image that is missing (AW_ERROR_NOT_FOUND) or changed (AW_ERROR_VERIFY) is an error. */
gboolean aw_record_files_require(AwRecord *record, gboolean full, guint n_threads, AwProgress *progress,
                                 GError **error);

/**
 * aw_record_files_relink: looks for missing or changed images in `folder` and the folders in it, by file name, and
 * takes the first whose size and SHA-256 are right. Within a begun action.
 *
 * *n_relinked gets the number of images found; what is still missing shows in the next check.
 */
gboolean aw_record_files_relink(AwRecord *record, const char *folder, AwProgress *progress, gsize *n_relinked,
                                GError **error);

#endif

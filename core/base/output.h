/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_OUTPUT_H
#define AW_BASE_OUTPUT_H

#include <glib.h>
#include <stdio.h>

/**
 * AwOutput: a file that is written beside its final name and renamed when it is whole.
 *
 * What exists and is no regular file (/dev/stdout, a pipe, /dev/full) is written directly and never replaced; a
 * symbolic link is followed, so that the file it names is replaced and the link kept. A missing folder is an error
 * that names it. Until aw_output_commit succeeds, nothing stands under the final name.
 */
typedef struct AwOutput AwOutput;

/**
 * Called once by a program before it writes: a file-size limit or a closed pipe then fails the write, which is
 * reported and cleaned up, instead of killing the process (SIGXFSZ, SIGPIPE).
 */
void aw_output_prepare_process(void);

AwOutput *aw_output_open(const char *path, GError **error);

/* The stream to write to; NULL once committed. */
FILE *aw_output_stream(AwOutput *out);

/* Where the bytes stand until the commit: a path for libraries that open files themselves, such as libtiff. */
const char *aw_output_path(const AwOutput *out);

/* TRUE when the bytes go straight to a pipe or device and cannot be read back. */
gboolean aw_output_is_direct(const AwOutput *out);

/* Flushes, checks, syncs and renames. Any write that failed since the opening is reported here. */
gboolean aw_output_commit(AwOutput *out, GError **error);

/* Frees; what was not committed is removed. */
void aw_output_free(AwOutput *out);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwOutput, aw_output_free)

/* Writes all of `bytes` to `path` in this way. */
gboolean aw_output_write(const char *path, const char *bytes, gsize n_bytes, GError **error);

/* Reads a whole file of at most `max_bytes`. Windows path separators in `path` are the caller's business. */
gboolean aw_input_read(const char *path, gsize max_bytes, char **bytes, gsize *n_bytes, GError **error);

/* SHA-256 of a file as 64 lower-case hex digits. Free with g_free. */
char *aw_input_sha256(const char *path, GError **error);

#endif

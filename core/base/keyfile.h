/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_KEYFILE_H
#define AW_BASE_KEYFILE_H

#include <glib.h>

/**
 * AwKeyFile: a GKeyFile that remembers its name and which keys were asked for.
 * Errors name file, group, key, value and limit. Numbers use a decimal point.
 */
typedef struct AwKeyFile AwKeyFile;

AwKeyFile *aw_keyfile_read(const char *path, GError **error);
AwKeyFile *aw_keyfile_parse(const char *bytes, gsize n_bytes, const char *name, GError **error);
void aw_keyfile_free(AwKeyFile *file);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwKeyFile, aw_keyfile_free)

gboolean aw_keyfile_has(AwKeyFile *file, const char *group, const char *key);

/* Group names in file order, NULL-terminated; free with g_strfreev. */
char **aw_keyfile_groups(AwKeyFile *file);

/* The text of a key, or `fallback` (may be NULL) when it is absent. Free with g_free. */
char *aw_keyfile_text(AwKeyFile *file, const char *group, const char *key, const char *fallback);

/* As aw_keyfile_text, but an absent key is AW_ERROR_NOT_FOUND. */
char *aw_keyfile_need_text(AwKeyFile *file, const char *group, const char *key, GError **error);

/* A number within min ... max; when the key is absent *value is left alone and TRUE is returned. */
gboolean aw_keyfile_double(AwKeyFile *file, const char *group, const char *key, double min, double max, double *value,
                           GError **error);
gboolean aw_keyfile_int(AwKeyFile *file, const char *group, const char *key, gint64 min, gint64 max, gint64 *value,
                        GError **error);
gboolean aw_keyfile_bool(AwKeyFile *file, const char *group, const char *key, gboolean *value, GError **error);

/* AW_ERROR_FORMAT when the file has a group or key that nobody asked for: catches misspelt keys. */
gboolean aw_keyfile_finish(AwKeyFile *file, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/keyfile.h"

#include <string.h>

#include "base/error.h"
#include "base/limits.h"
#include "base/output.h"
#include "base/text.h"

struct AwKeyFile {
  char *name;
  GKeyFile *keys;
  GHashTable *asked; /* "group" and "group]key" of everything somebody asked for */
};

void aw_keyfile_free(AwKeyFile *file)
{
  if (!file)
    return;
  g_free(file->name);
  g_key_file_unref(file->keys);
  g_hash_table_unref(file->asked);
  g_free(file);
}

/* A group name cannot hold ']', so the joined name is unique. */
static char *joined(const char *group, const char *key)
{
  return g_strconcat(group, "]", key, NULL);
}

static void note_asked(AwKeyFile *file, const char *group, const char *key)
{
  g_hash_table_add(file->asked, g_strdup(group));
  g_hash_table_add(file->asked, joined(group, key));
}

static char *place(AwKeyFile *file, const char *group, const char *key)
{
  return g_strdup_printf("%s, group [%s], key %s", file->name, group, key);
}

static gboolean fail_line(GError **error, const char *name, guint line, const char *what, const char *which)
{
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s, line %u: %s '%s' stands twice", name, line, what, which);
  return FALSE;
}

/* GKeyFile keeps the last of two equal keys and merges equal groups without a word; here both are errors. */
static gboolean check_twice(const char *text, const char *name, GError **error)
{
  g_autoptr(GHashTable) seen = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, NULL);
  g_auto(GStrv) lines = g_strsplit(text, "\n", -1);
  g_autofree char *group = g_strdup("");
  for (guint i = 0; lines[i]; i++) {
    char *line = g_strstrip(lines[i]);
    char *end = strpbrk(line, *line == '[' ? "]" : "=");
    if (*line == '#' || !end)
      continue;
    *end = '\0';
    if (*line == '[') {
      g_free(group);
      group = g_strdup(line + 1);
      if (!g_hash_table_add(seen, g_strdup(group)))
        return fail_line(error, name, i + 1, "group", group);
    } else if (!g_hash_table_add(seen, joined(group, g_strchomp(line)))) {
      return fail_line(error, name, i + 1, "key", line);
    }
  }
  return TRUE;
}

/* Asks for every value once, so that a bad escape is found now and later reading cannot fail. */
static gboolean check_values(AwKeyFile *file, GError **error)
{
  g_auto(GStrv) groups = g_key_file_get_groups(file->keys, NULL);
  for (gsize i = 0; groups[i]; i++) {
    g_auto(GStrv) keys = g_key_file_get_keys(file->keys, groups[i], NULL, NULL);
    for (gsize j = 0; keys && keys[j]; j++) {
      g_autoptr(GError) bad = NULL;
      g_free(g_key_file_get_string(file->keys, groups[i], keys[j], &bad));
      if (bad) {
        g_autofree char *where = place(file, groups[i], keys[j]);
        g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: %s", where, bad->message);
        return FALSE;
      }
    }
  }
  return TRUE;
}

/* The text part of the bytes, or NULL: no NUL, UTF-8, no byte order mark. */
static const char *check_text(const char *bytes, gsize *n_bytes, const char *name, GError **error)
{
  if (*n_bytes > AW_MAX_KEYFILE_BYTES) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s is larger than %" G_GSIZE_FORMAT " bytes, the limit for key files",
                name, AW_MAX_KEYFILE_BYTES);
    return NULL;
  }
  if (!g_utf8_validate_len(bytes, *n_bytes, NULL)) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s is not UTF-8 text", name);
    return NULL;
  }
  gsize bom = *n_bytes >= 3 && !memcmp(bytes, "\xef\xbb\xbf", 3) ? 3 : 0;
  *n_bytes -= bom;
  return bytes + bom;
}

AwKeyFile *aw_keyfile_parse(const char *bytes, gsize n_bytes, const char *name, GError **error)
{
  const char *text = check_text(n_bytes ? bytes : "", &n_bytes, name, error);
  if (!text)
    return NULL;
  g_autoptr(AwKeyFile) file = g_new0(AwKeyFile, 1);
  file->name = g_strdup(name);
  file->keys = g_key_file_new();
  file->asked = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, NULL);
  g_autoptr(GError) bad = NULL;
  if (!g_key_file_load_from_data(file->keys, text, n_bytes, G_KEY_FILE_NONE, &bad)) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s is no key file: %s", name, bad->message);
    return NULL;
  }
  g_autofree char *copy = g_strndup(text, n_bytes);
  if (!check_twice(copy, name, error) || !check_values(file, error))
    return NULL;
  return g_steal_pointer(&file);
}

AwKeyFile *aw_keyfile_read(const char *path, GError **error)
{
  g_autofree char *bytes = NULL;
  gsize n_bytes = 0;
  if (!aw_input_read(path, AW_MAX_KEYFILE_BYTES, &bytes, &n_bytes, error))
    return NULL;
  return aw_keyfile_parse(bytes, n_bytes, path, error);
}

gboolean aw_keyfile_has(AwKeyFile *file, const char *group, const char *key)
{
  note_asked(file, group, key);
  return g_key_file_has_key(file->keys, group, key, NULL);
}

char **aw_keyfile_groups(AwKeyFile *file)
{
  return g_key_file_get_groups(file->keys, NULL);
}

char *aw_keyfile_text(AwKeyFile *file, const char *group, const char *key, const char *fallback)
{
  note_asked(file, group, key);
  char *text = g_key_file_get_string(file->keys, group, key, NULL);
  return text ? text : g_strdup(fallback);
}

char *aw_keyfile_need_text(AwKeyFile *file, const char *group, const char *key, GError **error)
{
  char *text = aw_keyfile_text(file, group, key, NULL);
  if (!text)
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s has no key '%s' in group [%s]", file->name, key, group);
  return text;
}

gboolean aw_keyfile_double(AwKeyFile *file, const char *group, const char *key, double min, double max, double *value,
                           GError **error)
{
  g_autofree char *text = aw_keyfile_text(file, group, key, NULL);
  g_autofree char *where = place(file, group, key);
  double found = 0;
  if (!text)
    return TRUE;
  if (!aw_text_to_double(text, where, &found, error))
    return FALSE;
  if (found < min || found > max) {
    g_autofree char *low = aw_text_from_double_exact(min), *high = aw_text_from_double_exact(max);
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s: '%s' is outside %s to %s", where, text, low, high);
    return FALSE;
  }
  *value = found;
  return TRUE;
}

gboolean aw_keyfile_int(AwKeyFile *file, const char *group, const char *key, gint64 min, gint64 max, gint64 *value,
                        GError **error)
{
  g_autofree char *text = aw_keyfile_text(file, group, key, NULL);
  g_autofree char *where = place(file, group, key);
  return !text || aw_text_to_int(text, where, min, max, value, error);
}

gboolean aw_keyfile_bool(AwKeyFile *file, const char *group, const char *key, gboolean *value, GError **error)
{
  g_autofree char *text = aw_keyfile_text(file, group, key, NULL);
  if (!text)
    return TRUE;
  gboolean yes = !strcmp(text, "yes") || !strcmp(text, "true");
  if (yes || !strcmp(text, "no") || !strcmp(text, "false")) {
    *value = yes;
    return TRUE;
  }
  g_autofree char *where = place(file, group, key);
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: '%s' is neither yes nor no", where, text);
  return FALSE;
}

static gboolean finish_group(AwKeyFile *file, const char *group, GError **error)
{
  if (!g_hash_table_contains(file->asked, group)) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: there is no use for a group [%s]", file->name, group);
    return FALSE;
  }
  g_auto(GStrv) keys = g_key_file_get_keys(file->keys, group, NULL, NULL);
  for (gsize i = 0; keys && keys[i]; i++) {
    g_autofree char *id = joined(group, keys[i]);
    if (!g_hash_table_contains(file->asked, id)) {
      g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: there is no use for key '%s' in group [%s]", file->name,
                  keys[i], group);
      return FALSE;
    }
  }
  return TRUE;
}

gboolean aw_keyfile_finish(AwKeyFile *file, GError **error)
{
  g_auto(GStrv) groups = aw_keyfile_groups(file);
  for (gsize i = 0; groups[i]; i++)
    if (!finish_group(file, groups[i], error))
      return FALSE;
  return TRUE;
}

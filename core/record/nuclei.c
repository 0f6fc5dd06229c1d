/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/limits.h"
#include "record/private.h"

/* Columns of table nucleus before the features, in the order in which they are bound and read. */
static const char *const fixed_columns[] = { "id",        "frame",   "frame_x_px", "frame_y_px", "scan_x_um",
                                             "scan_y_um", "n_views", "flags",      "shape" };
#define N_FIXED ((int)G_N_ELEMENTS(fixed_columns))

/* All column names, NULL-terminated; free with g_strfreev. */
static char **column_names(void)
{
  gsize n_features;
  const AwFeature *features = aw_features(&n_features);
  char **names = g_new0(char *, (gsize)N_FIXED + n_features + 1);
  for (int i = 0; i < N_FIXED; i++)
    names[i] = g_strdup(fixed_columns[i]);
  for (gsize i = 0; i < n_features; i++)
    names[(gsize)N_FIXED + i] = aw_feature_name(&features[i], TRUE);
  return names;
}

static char *insert_sql(void)
{
  g_auto(GStrv) names = column_names();
  g_autoptr(GString) marks = g_string_new("?");
  g_autoptr(GString) updates = g_string_new(NULL);
  for (char **name = names + 1; *name; name++) {
    g_string_append(marks, ", ?");
    g_string_append_printf(updates, "%s\"%s\" = excluded.\"%s\"", updates->len ? ", " : "", *name, *name);
  }
  g_autofree char *columns = g_strjoinv("\", \"", names);
  return g_strdup_printf("INSERT INTO nucleus(\"%s\") VALUES(%s) ON CONFLICT(id) DO UPDATE SET %s", columns, marks->str,
                         updates->str);
}

static char *select_sql(gboolean with_shapes)
{
  g_auto(GStrv) names = column_names();
  g_autofree char *columns = g_strjoinv("\", n.\"", names);
  return g_strdup_printf("SELECT n.\"%s\"%s FROM nucleus n %s ORDER BY n.id", columns,
                         with_shapes ? ", s.runs, s.outline" : "",
                         with_shapes ? "LEFT JOIN shape s ON s.id = n.shape" : "");
}

/* TRUE when column `at` of the row holds exactly `blob`. */
static gboolean column_is(sqlite3_stmt *row, int at, const GByteArray *blob)
{
  return sqlite3_column_bytes(row, at) == (int)blob->len &&
         !memcmp(sqlite3_column_blob(row, at), blob->data, blob->len);
}

/* The shape that nucleus `id` has already, when its blobs are these; else 0. */
static gboolean find_shape(AwRecord *record, gint64 id, const GByteArray *runs, const GByteArray *outline,
                           gint64 *shape, GError **error)
{
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(
      record, "SELECT s.id, s.runs, s.outline FROM nucleus n JOIN shape s ON s.id = n.shape WHERE n.id = ?", error);
  if (!get)
    return FALSE;
  sqlite3_bind_int64(get, 1, id);
  int row = aw_sql_row(record, get, error);
  *shape = row > 0 && column_is(get, 1, runs) && column_is(get, 2, outline) ? sqlite3_column_int64(get, 0) : 0;
  return row >= 0;
}

/* Shapes are written once and never changed or removed, so that undo need not keep copies of them. */
static gboolean put_shape(AwRecord *record, const AwNucleus *nucleus, gint64 *shape, GError **error)
{
  g_autoptr(GByteArray) runs = aw_shape_pack_runs(nucleus->runs, nucleus->n_runs, error);
  g_autoptr(GByteArray) outline = runs ? aw_shape_pack_outline(nucleus->outline, nucleus->n_outline, error) : NULL;
  if (!outline) {
    g_prefix_error(error, "nucleus %" G_GINT64_FORMAT ": ", nucleus->id);
    return FALSE;
  }
  if (!find_shape(record, nucleus->id, runs, outline, shape, error))
    return FALSE;
  if (*shape)
    return TRUE;
  sqlite3_stmt *put = aw_sql_prepare(record, "INSERT INTO shape(runs, outline) VALUES(?, ?)", error);
  if (!put)
    return FALSE;
  sqlite3_bind_blob64(put, 1, runs->data, runs->len, SQLITE_STATIC);
  sqlite3_bind_blob64(put, 2, outline->data, outline->len, SQLITE_STATIC);
  if (!aw_sql_run(record, put, error))
    return FALSE;
  *shape = sqlite3_last_insert_rowid(record->db);
  return TRUE;
}

/* put: the statement of insert_sql. */
static gboolean put_nucleus(AwRecord *record, sqlite3_stmt *put, const AwNucleus *nucleus, GError **error)
{
  gint64 shape;
  if (!put_shape(record, nucleus, &shape, error))
    return FALSE;
  sqlite3_bind_int64(put, 1, nucleus->id);
  sqlite3_bind_int(put, 2, nucleus->frame);
  aw_sql_bind_double(put, 3, nucleus->centroid_px.x_px);
  aw_sql_bind_double(put, 4, nucleus->centroid_px.y_px);
  aw_sql_bind_double(put, 5, nucleus->centroid.x_um);
  aw_sql_bind_double(put, 6, nucleus->centroid.y_um);
  sqlite3_bind_int(put, 7, nucleus->n_views);
  sqlite3_bind_int64(put, 8, nucleus->flags);
  sqlite3_bind_int64(put, 9, shape);
  gsize n_features;
  const AwFeature *features = aw_features(&n_features);
  for (gsize i = 0; i < n_features; i++)
    aw_sql_bind_double(put, N_FIXED + 1 + (int)i, aw_feature_value(&features[i], nucleus));
  return aw_sql_run(record, put, error);
}

/* The ids as a set of pointers into the nuclei; refuses ids that are not positive or appear twice, and frames that are
 * not there. */
static GHashTable *collect_ids(AwRecord *record, GPtrArray *nuclei, GError **error)
{
  gint64 n_frames;
  if (!aw_sql_int(record, "SELECT count(*) FROM frame", &n_frames, error))
    return NULL;
  g_autoptr(GHashTable) ids = g_hash_table_new(g_int64_hash, g_int64_equal);
  for (guint i = 0; i < nuclei->len; i++) {
    AwNucleus *nucleus = g_ptr_array_index(nuclei, i);
    if (nucleus->frame < 0 || nucleus->frame >= n_frames) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                  "nucleus %" G_GINT64_FORMAT " names frame %d, but %s has %" G_GINT64_FORMAT " frames", nucleus->id,
                  nucleus->frame, record->path, n_frames);
      return NULL;
    }
    if (nucleus->id < 1 || !g_hash_table_add(ids, &nucleus->id)) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "nucleus number %" G_GINT64_FORMAT " %s", nucleus->id,
                  nucleus->id < 1 ? "is below 1" : "is given twice");
      return NULL;
    }
  }
  return g_steal_pointer(&ids);
}

/* Removes the nuclei whose ids are not among `ids`; their decisions and tour stops go with them (foreign keys). */
static gboolean drop_others(AwRecord *record, GHashTable *ids, GError **error)
{
  g_autoptr(GArray) gone = g_array_new(FALSE, FALSE, sizeof(gint64));
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(record, "SELECT id FROM nucleus", error);
  int row = get ? aw_sql_row(record, get, error) : -1;
  for (; row > 0; row = aw_sql_row(record, get, error)) {
    gint64 id = sqlite3_column_int64(get, 0);
    if (!g_hash_table_contains(ids, &id))
      g_array_append_val(gone, id);
  }
  for (guint i = 0; row == 0 && i < gone->len; i++) {
    sqlite3_stmt *drop = aw_sql_prepare(record, "DELETE FROM nucleus WHERE id = ?", error);
    if (!drop)
      return FALSE;
    sqlite3_bind_int64(drop, 1, g_array_index(gone, gint64, i));
    if (!aw_sql_run(record, drop, error))
      return FALSE;
  }
  return row == 0;
}

gboolean aw_record_set_nuclei(AwRecord *record, GPtrArray *nuclei, GError **error)
{
  g_return_val_if_fail(record->in_action, FALSE);
  if (nuclei->len > AW_MAX_NUCLEI) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%u nuclei are more than the limit of %d", nuclei->len, AW_MAX_NUCLEI);
    return FALSE;
  }
  g_autoptr(GHashTable) ids = collect_ids(record, nuclei, error);
  if (!ids || !drop_others(record, ids, error))
    return FALSE;
  g_autofree char *sql = insert_sql();
  sqlite3_stmt *put = aw_sql_prepare(record, sql, error);
  for (guint i = 0; put && i < nuclei->len; i++)
    if (!put_nucleus(record, put, g_ptr_array_index(nuclei, i), error))
      return FALSE;
  return put != NULL;
}

static gboolean take_shape(sqlite3_stmt *get, int column, AwNucleus *nucleus, GError **error)
{
  return aw_shape_unpack_runs(sqlite3_column_blob(get, column), (gsize)sqlite3_column_bytes(get, column),
                              &nucleus->runs, &nucleus->n_runs, error) &&
         aw_shape_unpack_outline(sqlite3_column_blob(get, column + 1), (gsize)sqlite3_column_bytes(get, column + 1),
                                 &nucleus->outline, &nucleus->n_outline, error);
}

static AwNucleus *take_nucleus(sqlite3_stmt *get)
{
  AwNucleus *nucleus = g_new0(AwNucleus, 1);
  nucleus->id = sqlite3_column_int64(get, 0);
  nucleus->frame = sqlite3_column_int(get, 1);
  nucleus->centroid_px = (AwPixelPoint){ aw_sql_double(get, 2), aw_sql_double(get, 3) };
  nucleus->centroid = (AwScanPoint){ aw_sql_double(get, 4), aw_sql_double(get, 5) };
  nucleus->n_views = sqlite3_column_int(get, 6);
  nucleus->flags = (guint)sqlite3_column_int64(get, 7);
  gsize n_features;
  const AwFeature *features = aw_features(&n_features);
  for (gsize i = 0; i < n_features; i++)
    *(double *)(void *)((char *)nucleus + features[i].offset) = aw_sql_double(get, N_FIXED + (int)i);
  return nucleus;
}

GPtrArray *aw_record_nuclei(AwRecord *record, gboolean with_shapes, GError **error)
{
  gsize n_features;
  aw_features(&n_features);
  g_autoptr(GPtrArray) nuclei = aw_nuclei_new();
  g_autofree char *sql = select_sql(with_shapes);
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(record, sql, error);
  int row = get ? aw_sql_row(record, get, error) : -1;
  for (; row > 0; row = aw_sql_row(record, get, error)) {
    AwNucleus *nucleus = take_nucleus(get);
    g_ptr_array_add(nuclei, nucleus);
    g_autoptr(GError) problem = NULL;
    if (with_shapes && !take_shape(get, N_FIXED + (int)n_features, nucleus, &problem)) {
      aw_record_damaged(record, error, "nucleus %" G_GINT64_FORMAT ": %s", nucleus->id, problem->message);
      return NULL;
    }
  }
  return row == 0 ? g_steal_pointer(&nuclei) : NULL;
}

gboolean aw_record_next_nucleus_id(AwRecord *record, gint64 *id, GError **error)
{
  /* AUTOINCREMENT's own counter: it is part of no undo, so a number taken back is not given out again. */
  if (!aw_sql_int(record, "SELECT ifnull(max(seq), 0) + 1 FROM sqlite_sequence WHERE name = 'nucleus'", id, error))
    return FALSE;
  return *id > 0 || aw_record_damaged(record, error, "its counter of nuclei stands at an impossible number");
}

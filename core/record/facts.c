/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/text.h"
#include "record/private.h"

char *aw_record_fact(AwRecord *record, const char *key, GError **error)
{
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(record, "SELECT value FROM fact WHERE key = ?", error);
  if (!get)
    return NULL;
  aw_sql_bind_text(get, 1, key);
  return aw_sql_row(record, get, error) > 0 ? aw_sql_text(get, 0) : NULL;
}

gboolean aw_record_set_fact(AwRecord *record, const char *key, const char *value, GError **error)
{
  g_return_val_if_fail(record->in_action && key && *key, FALSE);
  static const char insert[] = "INSERT INTO fact VALUES(?, ?) ON CONFLICT(key) DO UPDATE SET value = excluded.value";
  sqlite3_stmt *set = aw_sql_prepare(record, value ? insert : "DELETE FROM fact WHERE key = ?", error);
  if (!set)
    return FALSE;
  aw_sql_bind_text(set, 1, key);
  if (value)
    aw_sql_bind_text(set, 2, value);
  return aw_sql_run(record, set, error);
}

gboolean aw_record_fact_double(AwRecord *record, const char *key, double fallback, double *value, GError **error)
{
  g_autoptr(GError) problem = NULL;
  g_autofree char *text = aw_record_fact(record, key, &problem);
  if (problem) {
    g_propagate_error(error, g_steal_pointer(&problem));
    return FALSE;
  }
  *value = fallback;
  g_autofree char *where = g_strdup_printf("%s, fact %s", record->path, key);
  return !text || aw_text_to_double(text, where, value, error);
}

gboolean aw_record_set_fact_double(AwRecord *record, const char *key, double value, GError **error)
{
  g_return_val_if_fail(!isinf(value), FALSE);
  g_autofree char *text = isnan(value) ? NULL : aw_text_from_double_exact(value);
  return aw_record_set_fact(record, key, text, error);
}

gboolean aw_record_set_pixel_map(AwRecord *record, const AwPixelMap *map, GError **error)
{
  const AwMatrix *a = &map->um_per_px;
  return aw_record_set_fact(record, "pixel_map.origin", aw_origin_name(map->origin), error) &&
         aw_record_set_fact_double(record, "pixel_map.xx_um_per_px", a->xx, error) &&
         aw_record_set_fact_double(record, "pixel_map.xy_um_per_px", a->xy, error) &&
         aw_record_set_fact_double(record, "pixel_map.yx_um_per_px", a->yx, error) &&
         aw_record_set_fact_double(record, "pixel_map.yy_um_per_px", a->yy, error) &&
         aw_record_set_fact_double(record, "pixel_map.rms_um", map->rms_um, error);
}

static gboolean find_origin(AwRecord *record, const char *name, AwOrigin *origin, GError **error)
{
  for (int i = AW_ORIGIN_ASSUMED; i <= AW_ORIGIN_FITTED; i++)
    if (!strcmp(name, aw_origin_name((AwOrigin)i))) {
      *origin = (AwOrigin)i;
      return TRUE;
    }
  return aw_record_damaged(record, error, "its pixel map has the unknown origin '%s'", name);
}

gboolean aw_record_pixel_map(AwRecord *record, AwPixelMap *map, GError **error)
{
  g_autoptr(GError) problem = NULL;
  g_autofree char *origin = aw_record_fact(record, "pixel_map.origin", &problem);
  if (problem) {
    g_propagate_error(error, g_steal_pointer(&problem));
    return FALSE;
  }
  if (!origin) {
    g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s has no pixel map yet", record->path);
    return FALSE;
  }
  AwMatrix *a = &map->um_per_px;
  if (!find_origin(record, origin, &map->origin, error) ||
      !aw_record_fact_double(record, "pixel_map.xx_um_per_px", 0, &a->xx, error) ||
      !aw_record_fact_double(record, "pixel_map.xy_um_per_px", 0, &a->xy, error) ||
      !aw_record_fact_double(record, "pixel_map.yx_um_per_px", 0, &a->yx, error) ||
      !aw_record_fact_double(record, "pixel_map.yy_um_per_px", 0, &a->yy, error) ||
      !aw_record_fact_double(record, "pixel_map.rms_um", 0, &map->rms_um, error))
    return FALSE;
  return aw_matrix_det(*a) != 0 || aw_record_damaged(record, error, "its pixel map has no inverse");
}

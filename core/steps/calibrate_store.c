/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/calibrate_store.h"

#include <math.h>
#include <string.h>

#include "base/output.h"
#include "base/text.h"

void aw_store_double(GString *text, const char *key, double value)
{
  if (isnan(value))
    return;
  g_autofree char *number = aw_text_from_double_exact(value);
  aw_store_text(text, key, number);
}

void aw_store_text(GString *text, const char *key, const char *value)
{
  g_string_append_printf(text, "%s=%s\n", key, value);
}

void aw_store_matrix(GString *text, const char *prefix, AwMatrix m)
{
  const double value[4] = { m.xx, m.xy, m.yx, m.yy };
  static const char *const ends[4] = { "xx", "xy", "yx", "yy" };
  for (int i = 0; i < 4; i++) {
    g_autofree char *key = g_strconcat(prefix, ends[i], NULL);
    aw_store_double(text, key, value[i]);
  }
}

void aw_store_marks(GString *text, AwFitKind kind, gboolean mirrored, double localisation_um, const GArray *pairs)
{
  aw_store_text(text, "fit", aw_fit_kind_name(kind));
  aw_store_text(text, "mirrored", mirrored ? "true" : "false");
  aw_store_double(text, "localisation-um", localisation_um);
  aw_store_double(text, "n", (double)pairs->len);
  for (guint i = 0; i < pairs->len; i++) {
    const AwMarkPair *p = &g_array_index(pairs, AwMarkPair, i);
    g_autofree char *key = g_strdup_printf("mark-%u", i + 1);
    g_autofree char *x = aw_text_from_double_exact(p->scan.x_um), *y = aw_text_from_double_exact(p->scan.y_um);
    g_autofree char *u = aw_text_from_double_exact(p->beam.bx_um), *v = aw_text_from_double_exact(p->beam.by_um);
    g_autofree char *value = g_strdup_printf("%s %s %s %s", x, y, u, v);
    aw_store_text(text, key, value);
  }
}

gboolean aw_store_commit(AwRecord *record, const char *kind, const AwCalibrateSource *source, const GString *text,
                         const char *action, GError **error)
{
  g_autofree char *hash = source->table ? aw_input_sha256(source->table, error) : g_strdup("");
  g_autofree char *name = g_strdup(source->table ? source->table : ""), *own_kind = g_strdup(kind);
  if (!hash)
    return FALSE;
  AwCalibration one = { .kind = own_kind, .at_unix_s = source->at_unix_s, .source = name, .sha256 = hash };
  one.text = text->str;
  one.origin = source->table && strcmp(kind, "beam") != 0 ? AW_ORIGIN_FITTED : AW_ORIGIN_ENTERED;
  if (isnan(one.at_unix_s))
    one.at_unix_s = floor((double)g_get_real_time() / G_USEC_PER_SEC);
  return aw_record_add_calibration(record, &one, error) &&
         (!source->before_commit || source->before_commit(source->data, error)) &&
         aw_record_commit(record, action, error);
}

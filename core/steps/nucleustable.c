/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/nucleustable.h"

#include <math.h>

#include "base/text.h"

void aw_nucleus_table_header(GString *csv, const char *first, gboolean in_um)
{
  gsize n;
  const AwFeature *features = aw_features(&n);
  g_string_append_printf(csv, "%s,x_px,y_px%s", first, in_um ? ",x_um,y_um" : "");
  for (gsize i = 0; i < n; i++) {
    g_autofree char *name = aw_feature_name(&features[i], in_um);
    g_string_append_printf(csv, ",%s", name);
  }
  g_string_append(csv, ",views,flags\n");
}

/* Six significant places are below every measurement error here; what is not finite stays empty. */
static void append_number(GString *csv, double value)
{
  g_string_append_c(csv, ',');
  if (!isfinite(value))
    return;
  int whole = value == 0 ? 0 : (int)floor(log10(fabs(value)));
  g_autofree char *text = aw_text_from_double(value, CLAMP(5 - whole, 0, 9));
  g_string_append(csv, text);
}

static void append_place(GString *csv, double value)
{
  g_autofree char *text = aw_text_from_double(value, 3);
  g_string_append_printf(csv, ",%s", text);
}

void aw_nucleus_table_row(GString *csv, const char *first, const AwNucleus *nucleus, gboolean in_um)
{
  gsize n;
  const AwFeature *features = aw_features(&n);
  g_autofree char *flags = aw_flags_text(nucleus->flags);
  g_string_append(csv, first);
  append_place(csv, nucleus->centroid_px.x_px);
  append_place(csv, nucleus->centroid_px.y_px);
  if (in_um) {
    append_place(csv, nucleus->centroid.x_um);
    append_place(csv, nucleus->centroid.y_um);
  }
  for (gsize i = 0; i < n; i++)
    append_number(csv, aw_feature_value(&features[i], nucleus));
  g_string_append_printf(csv, ",%d,%s\n", nucleus->n_views, flags);
}

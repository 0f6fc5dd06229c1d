/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/text.h"

#include <math.h>

#include "base/text.h"

char *cli_number(double value, int decimals)
{
  return isfinite(value) ? aw_text_from_double(value, decimals) : g_strdup("unknown");
}

char *cli_length(double um)
{
  gboolean in_mm = um >= 10000;
  g_autofree char *number = cli_number(in_mm ? um / 1000 : um, in_mm ? 2 : 0);
  return g_strdup_printf("%s %s", number, in_mm ? "mm" : "um");
}

static void append_key(GString *json, const char *key)
{
  g_autofree char *quoted = aw_text_json(key);
  gboolean first = json->len == 0 || json->str[json->len - 1] == '{';
  g_string_append_printf(json, "%s%s: ", first ? "" : ", ", quoted);
}

void cli_json_number(GString *json, const char *key, double value)
{
  g_autofree char *text = isfinite(value) ? aw_text_from_double_exact(value) : g_strdup("null");
  append_key(json, key);
  g_string_append(json, text);
}

void cli_json_int(GString *json, const char *key, gint64 value)
{
  append_key(json, key);
  g_string_append_printf(json, "%" G_GINT64_FORMAT, value);
}

void cli_json_text(GString *json, const char *key, const char *text)
{
  g_autofree char *quoted = text ? aw_text_json(text) : g_strdup("null");
  append_key(json, key);
  g_string_append(json, quoted);
}

void cli_json_texts(GString *json, const char *key, GPtrArray *texts)
{
  append_key(json, key);
  g_string_append_c(json, '[');
  for (guint i = 0; i < texts->len; i++) {
    g_autofree char *quoted = aw_text_json(texts->pdata[i]);
    g_string_append_printf(json, "%s%s", i ? ", " : "", quoted);
  }
  g_string_append_c(json, ']');
}

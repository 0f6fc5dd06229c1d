/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/gates.h"

#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/text.h"

static const struct {
  const char *feature;
  double min, max;
} defaults[] = {
  { "confidence", 0.75, INFINITY },
  { "area_ratio", 0.4, 2.5 },
  { "convexity", 0.9, INFINITY },
};

AwGate *aw_gates_default(gsize *n)
{
  *n = G_N_ELEMENTS(defaults);
  AwGate *gates = g_new(AwGate, *n);
  for (gsize i = 0; i < *n; i++)
    gates[i] = (AwGate){ aw_feature_find(defaults[i].feature, NULL), defaults[i].min, defaults[i].max };
  return gates;
}

/* One end of a range; empty text leaves it open. */
static gboolean parse_end(const char *text, const char *gate, double open, double *end, GError **error)
{
  g_autofree char *where = g_strdup_printf("gate \"%s\"", gate);
  *end = open;
  return !*text || aw_text_to_double(text, where, end, error);
}

/* A range in px must not be taken for one in um. */
static gboolean parse_feature(const char *text, const char *name, const AwFeature **feature, GError **error)
{
  *feature = aw_feature_find(name, error);
  if (!*feature)
    return FALSE;
  g_autofree char *in_um = aw_feature_name(*feature, TRUE);
  if (!strcmp(name, in_um) || !strcmp(name, (*feature)->stem))
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "gate \"%s\" names the wrong unit; write %s", text, in_um);
  return FALSE;
}

gboolean aw_gate_parse(const char *text, AwGate *gate, GError **error)
{
  const char *equals = strchr(text, '=');
  const char *dots = equals ? strstr(equals, "..") : NULL;
  if (!dots) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "gate \"%s\" is not of the form FEATURE=MIN..MAX", text);
    return FALSE;
  }
  g_autofree char *name = g_strstrip(g_strndup(text, (gsize)(equals - text)));
  g_autofree char *min = g_strstrip(g_strndup(equals + 1, (gsize)(dots - equals - 1)));
  g_autofree char *max = g_strstrip(g_strdup(dots + 2));
  AwGate found = { 0 };
  if (!parse_feature(text, name, &found.feature, error) || !parse_end(min, text, -INFINITY, &found.min, error) ||
      !parse_end(max, text, INFINITY, &found.max, error))
    return FALSE;
  if (!*min && !*max) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "gate \"%s\" has neither a lower nor an upper end", text);
    return FALSE;
  }
  *gate = found;
  if (found.min <= found.max)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "gate \"%s\": its lower end lies above its upper end", text);
  return FALSE;
}

char *aw_gate_text(const AwGate *gate)
{
  g_autofree char *name = aw_feature_name(gate->feature, TRUE);
  GString *text = g_string_new(NULL);
  if (isfinite(gate->min)) {
    g_autofree char *min = aw_text_from_double_exact(gate->min);
    g_string_append_printf(text, "%s <= ", min);
  }
  g_string_append(text, name);
  if (isfinite(gate->max)) {
    g_autofree char *max = aw_text_from_double_exact(gate->max);
    g_string_append_printf(text, " <= %s", max);
  }
  if (!isfinite(gate->min) && !isfinite(gate->max))
    g_string_append(text, " any");
  return g_string_free(text, FALSE);
}

static gboolean inside_gate(const AwGate *gate, const AwNucleus *nucleus)
{
  double value = aw_feature_value(gate->feature, nucleus);
  return value >= gate->min && value <= gate->max;
}

gboolean aw_gates_pass(const AwGate *gates, gsize n, guint refused, const AwNucleus *nucleus)
{
  gboolean pass = !(nucleus->flags & refused);
  for (gsize i = 0; pass && i < n; i++)
    pass = inside_gate(&gates[i], nucleus);
  return pass;
}

/* Counts what keeps one nucleus out; TRUE when nothing does. */
static gboolean count_one(const AwGate *gates, gsize n, guint refused, const AwNucleus *nucleus, AwGateCount *counts)
{
  gboolean pass = TRUE;
  for (gsize i = 0; i <= n; i++) {
    if (i == 0 ? !(nucleus->flags & refused) : inside_gate(&gates[i - 1], nucleus))
      continue;
    counts[i].alone++;
    counts[i].first += pass;
    pass = FALSE;
  }
  return pass;
}

gsize aw_gates_apply(const AwGate *gates, gsize n, guint refused, GPtrArray *nuclei, AwGateCount *counts,
                     gboolean *inside)
{
  gsize n_inside = 0;
  memset(counts, 0, (n + 1) * sizeof *counts);
  for (guint i = 0; i < nuclei->len; i++) {
    inside[i] = count_one(gates, n, refused, nuclei->pdata[i], counts);
    n_inside += (gsize)inside[i];
  }
  return n_inside;
}

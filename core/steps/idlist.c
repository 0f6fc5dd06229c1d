/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/idlist.h"

#include <string.h>

#include "base/error.h"
#include "base/text.h"

static gint64 id_of(GPtrArray *nuclei, guint i)
{
  return ((const AwNucleus *)nuclei->pdata[i])->id;
}

/* Index of the first nucleus whose id is at least `id`. */
static guint lower_bound(GPtrArray *nuclei, gint64 id)
{
  guint low = 0, high = nuclei->len;
  while (low < high) {
    guint mid = low + (high - low) / 2;
    if (id_of(nuclei, mid) < id)
      low = mid + 1;
    else
      high = mid;
  }
  return low;
}

static gboolean parse_ends(const char *part, gint64 *first, gint64 *last, GError **error)
{
  g_autofree char *where = g_strdup_printf("list entry \"%s\"", part);
  const char *dash = strchr(part, '-');
  g_autofree char *head = dash ? g_strndup(part, (gsize)(dash - part)) : g_strdup(part);
  if (!aw_text_to_int(head, where, 1, G_MAXINT64, first, error) ||
      !aw_text_to_int(dash ? dash + 1 : part, where, 1, G_MAXINT64, last, error))
    return FALSE;
  if (*first <= *last)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s runs backwards", where);
  return FALSE;
}

static gboolean mark_range(const char *part, GPtrArray *nuclei, gboolean *named, GError **error)
{
  gint64 first, last;
  if (!parse_ends(part, &first, &last, error))
    return FALSE;
  guint i = lower_bound(nuclei, first);
  if (i == nuclei->len || id_of(nuclei, i) > last) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND,
                "there is no nucleus %s; the dish has %u, numbered within %" G_GINT64_FORMAT " to %" G_GINT64_FORMAT,
                part, nuclei->len, id_of(nuclei, 0), id_of(nuclei, nuclei->len - 1));
    return FALSE;
  }
  for (; i < nuclei->len && id_of(nuclei, i) <= last; i++)
    named[i] = TRUE;
  return TRUE;
}

static GArray *collect(const gboolean *named, guint n)
{
  GArray *list = g_array_new(FALSE, FALSE, sizeof(guint));
  for (guint i = 0; i < n; i++)
    if (named[i])
      g_array_append_val(list, i);
  return list;
}

GArray *aw_id_list(const char *text, GPtrArray *nuclei, const AwState *states, GError **error)
{
  g_autofree gboolean *named = g_new0(gboolean, nuclei->len + 1);
  g_auto(GStrv) parts = g_strsplit(text, ",", -1);
  for (char **part = parts; *part; part++) {
    g_strstrip(*part);
    if (strcmp(*part, "proposed") == 0)
      for (guint i = 0; i < nuclei->len; i++)
        named[i] |= states[i] == AW_STATE_PROPOSED;
    else if (!mark_range(*part, nuclei, named, error))
      return NULL;
  }
  g_autoptr(GArray) list = collect(named, nuclei->len);
  if (list->len)
    return g_steal_pointer(&list);
  g_set_error(error, AW_ERROR, AW_ERROR_EMPTY, "\"%s\" names no nucleus", text);
  return NULL;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"
#include "plan/layout.h"

#define HASH_DECIMALS 3 /* as in the built-in layouts, so that anyone can find the hash again from such a list */

/* docs/formats.md, "Plan hash", defines these bytes; a change of one needs a new version number in the first line. */
char *aw_plan_canonical_text(const AwTargetRow *rows, gsize n)
{
  GString *text = g_string_new(NULL);
  g_string_append_printf(text, "aimwell plan 1 targets %" G_GSIZE_FORMAT "\n", n);
  for (gsize i = 0; i < n; i++) {
    g_autofree char *x = aw_text_from_double(rows[i].at.bx_um, HASH_DECIMALS);
    g_autofree char *y = aw_text_from_double(rows[i].at.by_um, HASH_DECIMALS);
    g_string_append_printf(text, "%" G_GINT64_FORMAT " %" G_GINT64_FORMAT " %s %s %" G_GINT64_FORMAT " %s\n",
                           rows[i].target, rows[i].nucleus_id, x, y, rows[i].n_particles, rows[i].arm);
  }
  return g_string_free(text, FALSE);
}

char *aw_plan_hash(const AwTargetRow *rows, gsize n)
{
  g_autofree char *text = aw_plan_canonical_text(rows, n);
  return g_compute_checksum_for_string(G_CHECKSUM_SHA256, text, -1);
}

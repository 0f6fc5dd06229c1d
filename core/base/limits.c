/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/limits.h"

#include "base/error.h"

gpointer aw_try_alloc(gsize n, gsize size, const char *what, GError **error)
{
  gpointer block = g_try_malloc0_n(n ? n : 1, size ? size : 1);
  if (!block)
    g_set_error(error, AW_ERROR, AW_ERROR_MEMORY,
                "not enough memory for %s (%" G_GSIZE_FORMAT " items of %" G_GSIZE_FORMAT " bytes)", what, n, size);
  return block;
}

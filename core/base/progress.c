/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/progress.h"

#include "base/error.h"

void aw_progress_report(AwProgress *progress, const char *what, double done_frac)
{
  if (progress && progress->report)
    progress->report(what, CLAMP(done_frac, 0.0, 1.0), progress->data);
}

void aw_progress_cancel(AwProgress *progress)
{
  __atomic_store_n(&progress->cancelled, 1, __ATOMIC_RELEASE);
}

gboolean aw_progress_stopped(AwProgress *progress, GError **error)
{
  if (!progress || !__atomic_load_n(&progress->cancelled, __ATOMIC_ACQUIRE))
    return FALSE;
  g_set_error_literal(error, AW_ERROR, AW_ERROR_CANCELLED, "stopped on request; nothing was changed");
  return TRUE;
}

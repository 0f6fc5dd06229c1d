/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_PROGRESS_H
#define AW_BASE_PROGRESS_H

#include <glib.h>

/**
 * AwProgress: how long work reports where it is, and how it is stopped.
 *
 * The caller owns it and may leave it NULL everywhere. `report` is called from worker threads, never from two at
 * once; `cancelled` is set by anyone, also from a signal handler, and read by the workers between items.
 */
typedef struct {
  void (*report)(const char *what, double done_frac, gpointer data); /* may be NULL */
  gpointer data;
  volatile gint cancelled; /* atomic; 1 asks the work to stop */
} AwProgress;

/* Tells that `done_frac` (0 ... 1) of `what` is done. Safe with NULL. */
void aw_progress_report(AwProgress *progress, const char *what, double done_frac);

/* Asks the work to stop. Safe in a signal handler. */
void aw_progress_cancel(AwProgress *progress);

/* TRUE and AW_ERROR_CANCELLED when the work was asked to stop. Safe with NULL. */
gboolean aw_progress_stopped(AwProgress *progress, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_POOL_H
#define AW_BASE_POOL_H

#include <glib.h>

#include "base/progress.h"

/**
 * The work on one item. `worker` is 0 ... n_threads-1 and names the scratch memory that this thread may use.
 * Item i writes slot i of the caller's results and nothing else that is shared. FALSE with `error` set stops the run.
 */
typedef gboolean (*AwPoolItem)(gsize item, guint worker, gpointer data, GError **error);

/**
 * aw_pool_run: works items 0 ... n_items-1 on up to n_threads threads (plain pthreads; the calling thread is one of
 * them).
 *
 * n_threads: 0 means one per processor; limited to AW_MAX_THREADS and to n_items.
 * what: names the work in progress reports. progress: may be NULL; asked between items.
 * Returns FALSE with the error of the lowest-numbered item that failed among those begun, or AW_ERROR_CANCELLED.
 */
gboolean aw_pool_run(guint n_threads, gsize n_items, AwPoolItem fn, gpointer data, const char *what,
                     AwProgress *progress, GError **error);

/* The number of threads that `n_threads` asks for, 0 meaning one per processor this process may use. */
guint aw_pool_n_threads(guint n_threads);

#endif

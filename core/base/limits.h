/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_LIMITS_H
#define AW_BASE_LIMITS_H

#include <glib.h>

/* Limits that keep a damaged or hostile file from claiming the machine. Each is quoted in the error it causes. */

#define AW_MAX_SIDE_PX 200000                      /* width or height of one image plane */
#define AW_MAX_BLOCK_SIDE_PX 4096                  /* larger images are worked in overlapping blocks */
#define AW_MAX_PIXELS (G_GINT64_CONSTANT(1) << 36) /* width x height of one image plane */
#define AW_MAX_FRAMES 100000                       /* frames of one scan */
#define AW_MAX_NUCLEI 10000000                     /* nuclei of one dish */
#define AW_MAX_TEXT_BYTES ((gsize)1 << 30)         /* one CSV table */
#define AW_MAX_KEYFILE_BYTES ((gsize)1 << 20)      /* one key file */
#define AW_MAX_COORDINATE_UM 1e7                   /* stage readings beyond 10 m are a mistake in units */
#define AW_MAX_THREADS 256

/* Allocates n x size bytes, filled with zeros; NULL and AW_ERROR_MEMORY when it cannot be had. `what` names it. */
gpointer aw_try_alloc(gsize n, gsize size, const char *what, GError **error);

/**
 * To be called once by a program at its start: keeps the pages of freed memory for the next request. Image planes come
 * and go by the dozen, and giving their pages back each time costs the kernel half as much as the work itself.
 */
void aw_memory_prepare_process(void);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/limits.h"

#include <malloc.h>

#include <sys/mman.h>

#include "base/error.h"

#define HUGE_PAGE ((guintptr)1 << 21)

/* Asks for large pages under a large block: it is then there after a few page faults instead of thousands. */
static void ask_for_large_pages(gpointer block, gsize bytes)
{
  guintptr from = ((guintptr)block + HUGE_PAGE - 1) & ~(HUGE_PAGE - 1),
           to = ((guintptr)block + bytes) & ~(HUGE_PAGE - 1);
  if (to > from)
    (void)madvise((gpointer)from, to - from, MADV_HUGEPAGE);
}

gpointer aw_try_alloc(gsize n, gsize size, const char *what, GError **error)
{
  gpointer block = g_try_malloc0_n(n ? n : 1, size ? size : 1);
  if (!block)
    g_set_error(error, AW_ERROR, AW_ERROR_MEMORY,
                "not enough memory for %s (%" G_GSIZE_FORMAT " items of %" G_GSIZE_FORMAT " bytes)", what, n, size);
  if (block && n > 0 && size > 0)
    ask_for_large_pages(block, n * size);
  return block;
}

void aw_memory_prepare_process(void)
{
  mallopt(M_MMAP_THRESHOLD, 32 << 20);
  mallopt(M_TRIM_THRESHOLD, 256 << 20);
  mallopt(M_TOP_PAD, 16 << 20);
}

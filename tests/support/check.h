/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_SUPPORT_CHECK_H
#define AW_SUPPORT_CHECK_H

#include <glib.h>

#include "base/error.h"

/* Asserts that *error is an AW_ERROR of that code whose message has every one of the `parts` (parted by '|') in it,
 * and clears it. */
void aw_check_error(GError **error, AwErrorCode code, const char *parts);

/* Adds `test` under `path`, and once more under path + "/de_DE" with that locale set (decimal comma asserted). The
 * second run is skipped by name where the locale is not installed. `path` must outlive the test run. */
void aw_check_add(const char *path, void (*test)(void));

/* A new empty folder for one test; aw_scratch_remove takes it away with all that is in it and frees the name. */
char *aw_scratch_new(void);
void aw_scratch_remove(char *folder);

/* Writes `text` to folder/name and gives that path. Free with g_free. */
char *aw_scratch_write(const char *folder, const char *name, const char *text);

/* The number of entries of a folder. */
int aw_scratch_count(const char *folder);

#endif

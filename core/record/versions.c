/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "record/versions.h"

#include <sqlite3.h>

const char *aw_sqlite_version(void)
{
  return sqlite3_libversion();
}

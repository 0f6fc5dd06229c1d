/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_RECORD_VERSIONS_H
#define AW_RECORD_VERSIONS_H

/* The version of SQLite in use; static. */
const char *aw_sqlite_version(void);

#endif

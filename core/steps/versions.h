/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_VERSIONS_H
#define AW_STEPS_VERSIONS_H

/* "aimwell 0.1.0" and one line per library with the version in use, each ended by a newline. Free with g_free. */
char *aw_versions_text(void);

#endif

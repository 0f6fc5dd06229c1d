/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_CAUTIONS_H
#define AW_PLAN_CAUTIONS_H

/* The cautions that stand wherever people act on numbers: one sentence per entry, NULL-terminated. */
extern const char *const aw_cautions[];

#endif

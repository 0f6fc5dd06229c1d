/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_IDLIST_H
#define AW_STEPS_IDLIST_H

#include <glib.h>

#include "nuclei/nucleus.h"
#include "record/record.h"

/**
 * aw_id_list: the nuclei that a text such as "3,7,10-20" or "proposed" names.
 *
 * nuclei by rising id, states beside them. Returns indices into `nuclei` (guint), each once, rising.
 * AW_ERROR_NOT_FOUND for a number that no nucleus has (a range needs only its ends within the numbers given),
 * AW_ERROR_FORMAT for anything else, AW_ERROR_EMPTY when nothing is named.
 */
GArray *aw_id_list(const char *text, GPtrArray *nuclei, const AwState *states, GError **error);

#endif

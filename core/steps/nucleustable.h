/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_NUCLEUSTABLE_H
#define AW_STEPS_NUCLEUSTABLE_H

#include "nuclei/nucleus.h"

/* The table of nuclei as CSV text (docs/formats.md, "Nuclei table"). */

/* Appends the header row; `first` names the leading columns ("image,nucleus" or "nucleus,frame,state"). */
void aw_nucleus_table_header(GString *csv, const char *first, gboolean in_um);

/* Appends one row; `first` holds the leading fields, already quoted where they must be. */
void aw_nucleus_table_row(GString *csv, const char *first, const AwNucleus *nucleus, gboolean in_um);

#endif

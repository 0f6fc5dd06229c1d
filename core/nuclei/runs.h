/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_RUNS_H
#define AW_NUCLEI_RUNS_H

#include "image/image.h"
#include "nuclei/nucleus.h"

/**
 * AwRunTable: a label image as runs, sorted by label, rows from the top within one; px of the label image.
 * The runs of label k are runs[first[k]] ... runs[first[k + 1] - 1].
 */
typedef struct {
  guint32 n_labels;
  AwRun *runs;
  gsize *first;     /* n_labels + 2 entries */
  guint8 *touching; /* 1 where label k shares a pixel edge with another label; n_labels + 1 entries */
} AwRunTable;

/* One pass over the labels. AW_ERROR_FORMAT when a label is unused or larger than n_labels. */
AwRunTable *aw_run_table_new(const AwLabels *labels, GError **error);
void aw_run_table_free(AwRunTable *table);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwRunTable, aw_run_table_free)

/* TRUE when the runs are surely one part without holes: one run a row, each overlapping the one above. */
gboolean aw_runs_are_plain(const AwRun *runs, gsize n_runs);

#endif

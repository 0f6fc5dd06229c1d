/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_LAYOUTCOLUMNS_H
#define AW_PLAN_LAYOUTCOLUMNS_H

#include "plan/layout.h"

/* The inside of a layout, for the files that write and read lists. Everyone else uses plan/layout.h. */

/* What a column holds. The four positions come first. */
typedef enum {
  AW_COLUMN_X,
  AW_COLUMN_Y,
  AW_COLUMN_SCAN_X,
  AW_COLUMN_SCAN_Y,
  AW_COLUMN_TARGET,
  AW_COLUMN_NUCLEUS,
  AW_COLUMN_PARTICLES,
  AW_COLUMN_ARM,
  AW_COLUMN_TEXT
} AwColumnValue;

/* One column. Positions are written as sign * position / um_per_unit + offset. */
typedef struct {
  AwColumnValue value;
  char *heading;
  char *text;         /* of an AW_COLUMN_TEXT */
  char *unit;         /* UCUM code, or "step" */
  double um_per_unit; /* > 0 */
  int sign;           /* 1 or -1 */
  double offset;      /* in the column's unit */
  int decimals;
  gint64 first; /* number written for the first target */
} AwColumn;

struct AwLayout {
  char *name;
  char separator;
  gboolean crlf;
  gboolean header;
  gboolean beside;                               /* the head stands in a file beside the list */
  double x_min_um, x_max_um, y_min_um, y_max_um; /* beam-stage limits, inclusive */
  GPtrArray *columns;                            /* AwColumn */
  GPtrArray *headings;                           /* char *, borrowed from the columns, NULL-terminated */
};

static inline const AwColumn *aw_layout_column(const AwLayout *layout, gsize i)
{
  return g_ptr_array_index(layout->columns, i);
}

/* TRUE when some column holds `value`. */
gboolean aw_layout_holds(const AwLayout *layout, AwColumnValue value);

/* The position of `row` that a column shows, in beam-stage or scan um. */
double aw_column_position_um(const AwColumn *column, const AwTargetRow *row);

/* Reads a list from memory; `head_text` holds the `#` lines when they stand beside the list, else NULL. */
AwTargetList *aw_target_list_parse(const AwLayout *layout, const char *bytes, gsize n_bytes, const char *name,
                                   const char *head_text, GError **error);

/* AW_ERROR_VERIFY naming target and column when the list that was read back is not the plan to within rounding. */
gboolean aw_target_list_compare(const AwLayout *layout, const AwTargetList *back, const char *plan_hash,
                                const AwTargetRow *rows, gsize n, GError **error);

#endif

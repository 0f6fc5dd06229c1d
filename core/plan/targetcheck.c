/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <math.h>
#include <string.h>

#include "base/error.h"
#include "plan/layoutcolumns.h"

static gboolean differs(const AwTargetRow *row, const char *what, GError **error)
{
  g_set_error(error, AW_ERROR, AW_ERROR_VERIFY,
              "target %" G_GINT64_FORMAT " was read back with another %s than planned; the list was not kept",
              row->target, what);
  return FALSE;
}

/* Half a unit of the last written place, and what the arithmetic on doubles of that size cannot resolve. */
static double tolerance_um(const AwColumn *column, double um)
{
  double size_um = fabs(um) + fabs(column->offset) * column->um_per_unit;
  return 0.5 * pow(10, -column->decimals) * column->um_per_unit + 8 * DBL_EPSILON * size_um;
}

static gboolean compare_positions(const AwLayout *layout, const AwTargetRow *row, const AwTargetRow *back,
                                  GError **error)
{
  for (gsize i = 0; i < layout->columns->len; i++) {
    const AwColumn *column = aw_layout_column(layout, i);
    if (column->value > AW_COLUMN_SCAN_Y)
      continue;
    double um = aw_column_position_um(column, row);
    if (!(fabs(aw_column_position_um(column, back) - um) <= tolerance_um(column, um)))
      return differs(row, column->heading, error);
  }
  return TRUE;
}

/* A field that the layout has no column for reads back as a value of its own and is left out. */
static gboolean compare_row(const AwLayout *layout, const AwTargetRow *row, const AwTargetRow *back, GError **error)
{
  if (!compare_positions(layout, row, back, error))
    return FALSE;
  if (back->target != row->target)
    return differs(row, "target number", error);
  if (back->nucleus_id && back->nucleus_id != row->nucleus_id)
    return differs(row, "nucleus", error);
  if (back->n_particles >= 0 && back->n_particles != row->n_particles)
    return differs(row, "particle number", error);
  if (back->arm && strcmp(back->arm, row->arm) != 0)
    return differs(row, "arm", error);
  return TRUE;
}

gboolean aw_target_list_compare(const AwLayout *layout, const AwTargetList *back, const char *plan_hash,
                                const AwTargetRow *rows, gsize n, GError **error)
{
  if (back->n != n || g_strcmp0(back->plan_hash, plan_hash)) {
    g_set_error(error, AW_ERROR, AW_ERROR_VERIFY,
                "the list was read back with another number of targets or plan hash than planned and was not kept");
    return FALSE;
  }
  for (gsize i = 0; i < n; i++)
    if (!compare_row(layout, &rows[i], &back->rows[i], error))
      return FALSE;
  return TRUE;
}

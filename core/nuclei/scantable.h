/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SCANTABLE_H
#define AW_NUCLEI_SCANTABLE_H

#include <glib.h>

#include "base/point.h"

/* One row of a scan table. */
typedef struct {
  char *path;  /* absolute or relative to the working folder; Windows separators turned */
  gsize line;  /* of the table, for messages */
  int page;    /* 0 when the column is absent */
  int channel; /* -1 when the column is absent or the field empty */
  AwScanPoint stage;
  double pixel_um;        /* 0 when not said */
  double taken_at_unix_s; /* NaN when not said */
} AwScanRow;

void aw_scan_row_free(AwScanRow *row);

/**
 * Reads `file,stage_x_um,stage_y_um` and optional `page,channel,pixel_um,taken_at` (docs/formats.md, "Scan table").
 *
 * Relative paths start from the table's folder. Returns a GPtrArray of AwScanRow in table order. `unknown` (may be
 * NULL) gets the headings that mean nothing here, NULL-terminated, g_strfreev. Errors name file, line, column, value
 * and limit: a missing column, words, commas or NaN for numbers, readings past AW_MAX_COORDINATE_UM, a pixel size
 * outside 0.001 ... 100 um, a time without zone, one plane named twice, a table without rows or with too many.
 */
GPtrArray *aw_scan_table_read(const char *path, char ***unknown, GError **error);

#endif

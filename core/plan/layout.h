/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_LAYOUT_H
#define AW_PLAN_LAYOUT_H

#include <glib.h>

#include "base/point.h"

/* One row of a target list before the layout turns it into text. */
typedef struct {
  gint64 target; /* 1 ... n in visiting order */
  gint64 nucleus_id;
  AwBeamPoint at;     /* beam-stage reading that puts the aim point on the beam */
  AwScanPoint scan;   /* the same point as scan coordinate */
  gint64 n_particles; /* at least 1; 0 for a sham target, which is visited with the shutter closed */
  const char *arm;    /* "irradiate" or "sham" */
} AwTargetRow;

/* What stands above the rows. */
typedef struct {
  const char *dish;       /* record name */
  const char *plan_hash;  /* 64 hex digits of the plan's canonical text */
  const char *origin;     /* how positions were made: relocation, offset, pixel map with their origins; one line each */
  const char *written_at; /* RFC 3339 */
} AwTargetHead;

/**
 * AwLayout: how one controller wants its target list: columns, names, units, order, separator, decimals, offsets,
 * axis signs, line ending, header, stage limits. "csv" and "tsv" are built in; any other is a key file
 * (docs/formats.md, "Layouts").
 */
typedef struct AwLayout AwLayout;

/* name_or_path: "csv", "tsv" or the path of a key file. */
AwLayout *aw_layout_load(const char *name_or_path, GError **error);

/* The same from the text of a key file; `name` stands for the file in errors. */
AwLayout *aw_layout_parse(const char *bytes, gsize n_bytes, const char *name, GError **error);
void aw_layout_free(AwLayout *layout);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwLayout, aw_layout_free)

/* The name that the layout gives itself. */
const char *aw_layout_name(const AwLayout *layout);

/* Where the cautions and the plan hash stand when the list is `path`: NULL for in the list itself, else g_free. */
char *aw_layout_beside(const AwLayout *layout, const char *path);

/**
 * aw_target_list_write: writes the list through AwOutput, reads it back and compares every position with the plan to
 * half a unit of the last written place before the final name is taken (a pipe or device is checked in memory;
 * *checked_in_memory says so and may be NULL).
 *
 * AW_ERROR_RANGE for a target outside the layout's stage limits, two targets that are written at one spot, or a
 * particle number that does not fit the arm; AW_ERROR_STATE when the layout cannot tell sham targets from others, or
 * wants a file beside a pipe; AW_ERROR_VERIFY when the read-back differs; AW_ERROR_EMPTY without rows.
 */
gboolean aw_target_list_write(const AwLayout *layout, const AwTargetHead *head, const AwTargetRow *rows, gsize n,
                              const char *path, gboolean *checked_in_memory, GError **error);

/* A target list as read from its file. */
typedef struct {
  AwTargetRow *rows; /* owned; what the layout has no column for: target by row, nucleus 0, scan NaN, particles -1 and
                        arm NULL */
  gsize n;
  char *dish, *plan_hash, *origin, *written_at; /* owned; NULL when the head does not say */
} AwTargetList;

void aw_target_list_free(AwTargetList *list);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTargetList, aw_target_list_free)

/**
 * aw_target_list_read: reads a list written through `layout`, undoing its units, offsets and signs. The head comes
 * from the file beside it where the layout puts it there. AW_ERROR_FORMAT and AW_ERROR_RANGE name file, line and
 * column; AW_ERROR_EMPTY without rows.
 */
AwTargetList *aw_target_list_read(const AwLayout *layout, const char *path, GError **error);

/* The canonical text of a plan, byte for byte as docs/formats.md defines it, and its SHA-256. Free with g_free. */
char *aw_plan_canonical_text(const AwTargetRow *rows, gsize n);
char *aw_plan_hash(const AwTargetRow *rows, gsize n);

#endif

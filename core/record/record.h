/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_RECORD_RECORD_H
#define AW_RECORD_RECORD_H

#include <glib.h>

#include "geometry/pixelmap.h"
#include "nuclei/nucleus.h"

/**
 * AwRecord: one dish record, NAME.dish (SQLite 3). The only way to it; no other layer knows SQLite.
 *
 * One user action is one transaction: aw_record_begin ... aw_record_commit, which also appends to the journal and
 * keeps the action's changeset for undo. A record opened for writing holds flock (NAME.dish.lock) until it is freed.
 * An AwRecord is used by one thread at a time. docs/formats-record.md describes the file.
 */
typedef struct AwRecord AwRecord;

typedef enum { AW_RECORD_READ, AW_RECORD_WRITE } AwRecordMode;

/* Makes a new record; AW_ERROR_STATE when `path` exists. It appears under its name only when the first action commits.
 */
AwRecord *aw_record_create(const char *path, GError **error);

/* Opens; refuses what is no dish record, was written by a newer Aimwell, or (for writing) is locked or read-only. */
AwRecord *aw_record_open(const char *path, AwRecordMode mode, GError **error);
void aw_record_free(AwRecord *record); /* rolls back an action that was begun */
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwRecord, aw_record_free)

const char *aw_record_path(const AwRecord *record);

/* Warning about the place of the record (network share), or NULL. Owned by the record. */
const char *aw_record_warning(const AwRecord *record);

/* Runs SQLite's integrity and foreign-key checks. */
gboolean aw_record_check(AwRecord *record, GError **error);

/* Between these two every read sees one state of the record. Keep it short: a writer waits for it with its commit. */
gboolean aw_record_read_begin(AwRecord *record, GError **error);
void aw_record_read_end(AwRecord *record);

/* Begins one user action; `operator_name` and `action` (a plain sentence) go into the journal on commit. All setters
 * below ask for a begun action. A commit that fails has rolled the action back. */
gboolean aw_record_begin(AwRecord *record, const char *operator_name, GError **error);
gboolean aw_record_commit(AwRecord *record, const char *action, GError **error);
void aw_record_rollback(AwRecord *record);

/* Undoes the newest standing action that changed data, as a new journalled action; the first action, which made the
 * record, is AW_ERROR_STATE. *what (may be NULL) gets the action's text; g_free. */
gboolean aw_record_undo(AwRecord *record, const char *operator_name, char **what, GError **error);

/* Applies again the action undone last; AW_ERROR_STATE when there is none or another was done since. */
gboolean aw_record_redo(AwRecord *record, const char *operator_name, char **what, GError **error);

typedef struct {
  gint64 id;
  double at_unix_s;
  char *operator_name, *action;
  gboolean undone;
} AwJournalEntry;

/* All entries, oldest first; a GPtrArray that frees its elements. */
GPtrArray *aw_record_journal(AwRecord *record, GError **error);

/* Single facts by key ("name", "created_at", "pixel_map.origin", ...). NULL without error when absent. g_free. */
char *aw_record_fact(AwRecord *record, const char *key, GError **error);
gboolean aw_record_set_fact(AwRecord *record, const char *key, const char *value, GError **error); /* NULL removes */
gboolean aw_record_fact_double(AwRecord *record, const char *key, double fallback, double *value, GError **error);
gboolean aw_record_set_fact_double(AwRecord *record, const char *key, double value, GError **error); /* NaN removes */

/* One frame of the scan as the record keeps it. */
typedef struct {
  char *file;        /* path relative to the record's folder, '/' separators */
  int page, channel; /* channel -1: the only one */
  int width_px, height_px;
  double full_scale; /* 0 for float images */
  AwScanPoint stage;
  double pixel_um;        /* 0 unknown */
  double taken_at_unix_s; /* NaN unknown */
  gint64 size_bytes;
  gint64 mtime_ns;
  char *sha256;     /* 64 hex digits */
  GBytes *overview; /* small PNG, may be NULL */
} AwFrame;

AwFrame *aw_frame_new(void);
void aw_frame_free(AwFrame *frame);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwFrame, aw_frame_free)

/* Frames in scan order (GPtrArray of AwFrame). Index in the array = AwNucleus.frame. */
gboolean aw_record_set_frames(AwRecord *record, GPtrArray *frames, GError **error);
GPtrArray *aw_record_frames(AwRecord *record, GError **error);

gboolean aw_record_set_pixel_map(AwRecord *record, const AwPixelMap *map, GError **error);
gboolean aw_record_pixel_map(AwRecord *record, AwPixelMap *map, GError **error);

/* What was decided about a nucleus. */
typedef enum { AW_STATE_FOUND, AW_STATE_PROPOSED, AW_STATE_ACCEPTED, AW_STATE_REJECTED } AwState;

const char *aw_state_name(AwState state); /* "found", "proposed", "accepted", "rejected" */

/* Replaces all nuclei. Ids must be unique and > 0. Decisions and tour entries of vanished ids go with them. */
gboolean aw_record_set_nuclei(AwRecord *record, GPtrArray *nuclei, GError **error);

/* All nuclei by rising id (GPtrArray of AwNucleus); with_shapes = FALSE leaves runs and outlines out. */
GPtrArray *aw_record_nuclei(AwRecord *record, gboolean with_shapes, GError **error);

/* The next id that was never used in this record. */
gboolean aw_record_next_nucleus_id(AwRecord *record, gint64 *id, GError **error);

typedef struct {
  gint64 nucleus_id;
  AwState state;
  gboolean by_hand; /* a person decided; FALSE: gates proposed it */
} AwDecision;

gboolean aw_record_set_decision(AwRecord *record, const AwDecision *decision, GError **error);
GArray *aw_record_decisions(AwRecord *record, GError **error); /* AwDecision by rising id; FOUND ones are left out */

typedef struct {
  const AwFeature *feature;
  double min, max; /* inclusive; infinite when open */
} AwGateRow;

gboolean aw_record_set_gates(AwRecord *record, const AwGateRow *gates, gsize n, GError **error);
GArray *aw_record_gates(AwRecord *record, GError **error);

/* One measurement or entered number; none is ever changed, the newest of a kind counts. */
typedef struct {
  gint64 id;
  char *kind;       /* such as "marks", "edge-x" (docs/formats-record.md) */
  double at_unix_s; /* when it was measured */
  char *source;     /* file it was read from; "" for none */
  char *sha256;     /* of that file; "" for none */
  AwOrigin origin;
  char *text; /* key file with the numbers */
} AwCalibration;

void aw_calibration_free(AwCalibration *calibration);

/* Adds one; `id` of it is not looked at. */
gboolean aw_record_add_calibration(AwRecord *record, const AwCalibration *calibration, GError **error);

/* All, by time and then by id (GPtrArray of AwCalibration that frees its elements). */
GPtrArray *aw_record_calibrations(AwRecord *record, GError **error);

/* The newest of a kind in what aw_record_calibrations gave, or NULL. */
const AwCalibration *aw_calibration_newest(GPtrArray *calibrations, const char *kind);

/* The tour: nucleus ids in visiting order; setting an empty one clears it. */
gboolean aw_record_set_tour(AwRecord *record, const gint64 *ids, gsize n, GError **error);
GArray *aw_record_tour(AwRecord *record, GError **error); /* gint64 */

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_COMMON_H
#define AW_STEPS_COMMON_H

#include "base/progress.h"
#include "record/record.h"

/* Facts of the record that steps keep (docs/formats-record.md). */
#define AW_FACT_CREATED_AT "created_at"
#define AW_FACT_PIXEL_UM "scan.pixel_um"
#define AW_FACT_MAP_NOTE "pixel_map.note"
#define AW_FACT_RADIUS_PX "segment.radius_px"
#define AW_FACT_NUCLEUS_WIDTH_UM "segment.nucleus_width_um"
#define AW_FACT_SENSITIVITY "segment.sensitivity"
#define AW_FACT_SPLITTING "segment.splitting"
#define AW_FACT_OVERVIEW_LOW "overview.low"   /* pixel value that overviews show as 0 */
#define AW_FACT_OVERVIEW_HIGH "overview.high" /* and as 255 */
#define AW_FACT_OVERLAP_RMS_UM "scan.overlap_rms_um"
#define AW_FACT_N_PARTICLES "plan.n_particles"
#define AW_FACT_TOUR_UM "tour.length_um"
#define AW_FACT_TOUR_HOW "tour.how"

/* What every step needs besides its own settings. Borrowed. */
typedef struct {
  const char *who;      /* operator for the journal */
  guint n_threads;      /* 0: one per processor */
  AwProgress *progress; /* may be NULL */
  GPtrArray *warnings;  /* char *, freed by the array; a step appends whole sentences; may be NULL */
} AwStepContext;

/* Appends a printf-style sentence to context->warnings. */
void aw_step_warn(const AwStepContext *context, const char *format, ...) G_GNUC_PRINTF(2, 3);

/* Opens for writing and begins one action; passes on the record's own warning. */
AwRecord *aw_step_open(const char *path, const AwStepContext *context, GError **error);

/* The dish's name: the record's file name without ".dish". Free with g_free. */
char *aw_step_name(const AwRecord *record);

/* The particles planned for every target (1 unless chosen otherwise). */
gboolean aw_step_n_particles(AwRecord *record, gint64 *n_particles, GError **error);

/* nuclei[i]'s state as an array in the same order; FOUND where nothing was decided. Free with g_free. */
AwState *aw_step_states(AwRecord *record, GPtrArray *nuclei, GError **error);

/* Frames as the scan engine wants them; paths are owned by the array of strings `*paths` (g_ptr_array_unref). */
GArray *aw_step_scan_frames(const AwRecord *record, GPtrArray *frames, GPtrArray **paths);

#endif

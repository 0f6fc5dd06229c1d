/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_COMMON_H
#define AW_STEPS_COMMON_H

#include "base/progress.h"
#include "record/record.h"

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

/* The folder that relative image paths of the record start from. Free with g_free. */
char *aw_step_folder(const AwRecord *record);

/* The absolute path of a frame's image. Free with g_free. */
char *aw_step_frame_path(const AwRecord *record, const AwFrame *frame);

/* nuclei[i]'s state as an array in the same order; FOUND where nothing was decided. Free with g_free. */
AwState *aw_step_states(AwRecord *record, GPtrArray *nuclei, GError **error);

/* Frames as the scan engine wants them; paths are owned by the array of strings `*paths` (g_ptr_array_unref). */
GArray *aw_step_scan_frames(const AwRecord *record, GPtrArray *frames, GPtrArray **paths);

#endif

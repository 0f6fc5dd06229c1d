/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_IMAGES_H
#define AW_STEPS_IMAGES_H

#include "steps/common.h"

/* Sentences on images that are missing or changed (GPtrArray of char *); by hash when `full`, else by size and time. */
GPtrArray *aw_step_check_images(AwRecord *record, gboolean full, const AwStepContext *context, GError **error);

/* The frames of a record after every image was compared by hash; a missing or changed one is refused by name. */
GPtrArray *aw_step_verified_frames(AwRecord *record, const AwStepContext *context, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_SAMPLE_TABLES_H
#define AW_SAMPLE_TABLES_H

#include "dish.h"

/* The sample dish's tables as CSV text, row for row as README.md describes them. Free with g_free. */

/* Frames and stage readings. */
char *sample_scan_table(const SampleDish *dish);

/* One row per object. image: the SAMPLE_N_FRAMES drawn frames, which decide what counts as saturated. */
char *sample_truth_table(const SampleDish *dish, AwImage *const *image);

/* One row per object and frame that shows some of it. */
char *sample_views_table(const SampleDish *dish);

/* One row per point of every object's outline. */
char *sample_outline_table(const GPtrArray *truths);

#endif

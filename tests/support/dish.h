/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_TESTS_DISH_H
#define AW_TESTS_DISH_H

#include "record/record.h"

/* Small invented dish records for tests. All of it is deterministic. */

/* Lets scratch folders stand in memory where the machine has such a place: hundreds of commits each wait for the disk
 * otherwise. For tests that do not ask what the disk keeps; before g_test_run. */
void aw_test_use_memory(void);

/* n frames in a row, 100 um apart, files "images/frame_N.tif" with made-up hashes. */
GPtrArray *aw_test_frames(guint n);

/* n nuclei with ids first_id ..., spread over n_frames frames, each with a disc-like mask and an outline. */
GPtrArray *aw_test_nuclei(guint n, gint64 first_id, int n_frames);

/* FOLDER/dish.dish with 3 frames and a pixel map, one action. Aborts on error. */
AwRecord *aw_test_dish_new(const char *folder);

/* Stores n nuclei (ids from 1) as one action. */
void aw_test_dish_segment(AwRecord *record, guint n);

/* Accepts one nucleus as one action, journalled as "accept ID". */
void aw_test_dish_accept(AwRecord *record, gint64 id);

/* Everything undo covers, as text: two equal texts mean equal data. Free with g_free. */
char *aw_test_dish_dump(AwRecord *record);

#endif

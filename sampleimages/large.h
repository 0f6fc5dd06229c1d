/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_SAMPLE_LARGE_H
#define AW_SAMPLE_LARGE_H

#include "dish.h"

/* Large invented scans for load tests and speed measurements; nothing of it is kept. */

/**
 * A scan of n_frames uncompressed frames of side_px in DIR (made if absent), about nuclei_per_frame nuclei on each,
 * with scan.csv, truth.csv (id,kind,x_um,y_um,area_um2,gap_um) and the sample dish's camera and map.
 */
gboolean sample_write_stress(const char *dir, int n_frames, int side_px, int nuclei_per_frame, guint n_threads,
                             GError **error);

/**
 * One BigTIFF of side_px x side_px, uncompressed 256 x 256 tiles, as one giant frame at stage reading (0, 0), with
 * nuclei_per_block nuclei on every 2048 x 2048 px. Drawn a few rows of tiles at a time: memory grows with the side,
 * not with its square.
 */
gboolean sample_write_bigtiff(const char *path, int side_px, int nuclei_per_block, guint n_threads, GError **error);

/* The population of large scans in a rectangle. A GPtrArray of AwTruth; errors as aw_population_new. */
GPtrArray *sample_populate(AwScanPoint from, AwScanPoint to, int n_nuclei, guint64 seed, GError **error);

#endif

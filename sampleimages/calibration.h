/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_SAMPLE_CALIBRATION_H
#define AW_SAMPLE_CALIBRATION_H

#include <glib.h>

/* The morning's calibration tables, drawn from the truth that README.md states. */
#define SAMPLE_N_CALIBRATIONS 8

/* Name of file i below the sample folder, such as "calibration/marks.csv". */
const char *sample_calibration_name(int i);

/* Its text. Free with g_free. */
char *sample_calibration_text(int i);

#endif

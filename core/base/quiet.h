/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_QUIET_H
#define AW_BASE_QUIET_H

/**
 * Turns GSL's error handler off, which would end the process; from then on GSL functions return their status.
 * Call it before the first GSL function of a calculation that can fail; calling again costs nothing.
 */
void aw_gsl_quiet(void);

#endif

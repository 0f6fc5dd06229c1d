/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/quiet.h"

#include <gsl/gsl_errno.h>
#include <pthread.h>

static void turn_off(void)
{
  gsl_set_error_handler_off();
}

void aw_gsl_quiet(void)
{
  static pthread_once_t once = PTHREAD_ONCE_INIT;
  pthread_once(&once, turn_off);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_ERROR_H
#define AW_BASE_ERROR_H

#include <glib.h>

/**
 * AW_ERROR: the one error domain of Aimwell.
 *
 * A message is a whole sentence for the person at the keyboard: it names the file, the line or frame, the value
 * found and the limit. Bad data is a GError; a caller's bug is g_return_val_if_fail.
 */
#define AW_ERROR (aw_error_quark())

typedef enum {
  AW_ERROR_IO,          /* the system refused to read or write */
  AW_ERROR_FORMAT,      /* a file's bytes or text are not what its kind asks for */
  AW_ERROR_UNSUPPORTED, /* well-formed, but a form Aimwell does not read */
  AW_ERROR_RANGE,       /* a value outside its limits */
  AW_ERROR_STATE,       /* the action does not fit the record's present state */
  AW_ERROR_LOCKED,      /* another process is writing the record */
  AW_ERROR_NOT_FOUND,   /* a name, number or file that does not exist */
  AW_ERROR_EMPTY,       /* nothing left to work on: no nucleus, no target, no row */
  AW_ERROR_MEMORY,      /* memory could not be had */
  AW_ERROR_CANCELLED,   /* the user stopped it */
  AW_ERROR_VERIFY       /* what was written differs from what was meant */
} AwErrorCode;

GQuark aw_error_quark(void);

#endif

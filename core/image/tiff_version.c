/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <glib.h>
#include <string.h>
#include <tiffio.h>

#include "image/versions.h"

/* The library says "LIBTIFF, Version 4.5.0" and its copyright lines. */
char *aw_tiff_version(void)
{
  const char *text = TIFFGetVersion();
  const char *number = strstr(text, "Version ");
  number = number ? number + strlen("Version ") : text;
  return g_strndup(number, strcspn(number, "\n"));
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <png.h>

#include "image/versions.h"

const char *aw_png_version(void)
{
  return png_get_libpng_ver(NULL);
}

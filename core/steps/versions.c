/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/versions.h"

#include <glib.h>
#include <gsl/gsl_version.h>

#include "image/versions.h"
#include "record/versions.h"

char *aw_versions_text(void)
{
  g_autofree char *tiff = aw_tiff_version();
  return g_strdup_printf("aimwell %s\nlibtiff %s\nlibpng %s\nSQLite %s\nGSL %s\nGLib %u.%u.%u\n", AW_VERSION, tiff,
                         aw_png_version(), aw_sqlite_version(), gsl_version, glib_major_version, glib_minor_version,
                         glib_micro_version);
}

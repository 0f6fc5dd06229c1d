/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/versions.h"

#include <glib.h>
#include <gsl/gsl_version.h>

#include "image/versions.h"
#include "record/versions.h"

char *aw_versions_text(void)
{
  g_autofree char *image = aw_image_versions();
  g_autofree char *record = aw_record_versions();
  return g_strdup_printf("aimwell %s\n%s%sGSL %s\nGLib %u.%u.%u\n", AW_VERSION, image, record, gsl_version,
                         glib_major_version, glib_minor_version, glib_micro_version);
}

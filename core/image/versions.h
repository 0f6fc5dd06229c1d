/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_VERSIONS_H
#define AW_IMAGE_VERSIONS_H

/* The version of libtiff in use, such as "4.5.0". Free with g_free. */
char *aw_tiff_version(void);

/* The version of libpng in use; static. */
const char *aw_png_version(void);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_TIFF_PLANE_H
#define AW_IMAGE_TIFF_PLANE_H

#include "image/reader.h"

/* One plane of a TIFF file, for reader.c alone; arguments and errors as in image/reader.h. */
typedef struct AwTiffPlane AwTiffPlane;

AwTiffPlane *aw_tiff_plane_open(const char *path, int page, int channel, GError **error);
void aw_tiff_plane_free(AwTiffPlane *plane);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTiffPlane, aw_tiff_plane_free)

const AwImageInfo *aw_tiff_plane_info(const AwTiffPlane *plane);
int aw_tiff_plane_n_pages(const AwTiffPlane *plane);
int aw_tiff_plane_n_channels(const AwTiffPlane *plane);

/* Fills `image`, which has the size of `rect`. */
gboolean aw_tiff_plane_read(AwTiffPlane *plane, AwRect rect, AwImage *image, GError **error);

#endif

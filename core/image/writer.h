/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_WRITER_H
#define AW_IMAGE_WRITER_H

#include "image/image.h"

/* Writes one grey plane as a Deflate TIFF with its resolution tags when pixel_um > 0; through AwOutput. */
gboolean aw_image_write_tiff(const AwImage *image, const char *path, double pixel_um, GError **error);

/* Writes labels as TIFF: 16-bit, or 32-bit when n_labels > 65535. */
gboolean aw_labels_write_tiff(const AwLabels *labels, const char *path, GError **error);

#endif

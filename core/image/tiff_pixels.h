/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_TIFF_PIXELS_H
#define AW_IMAGE_TIFF_PIXELS_H

#include "image/tiff_form.h"

/* Decodes pixels of the current directory, one strip, tile or row at a time. */
typedef struct AwTiffPixels AwTiffPixels;

/* file and form stay the caller's and must outlive it. sample -1: the only one, or three that must agree. */
AwTiffPixels *aw_tiff_pixels_new(AwTiffFile *file, const AwTiffForm *form, int sample);
void aw_tiff_pixels_free(AwTiffPixels *pixels);

/* Fills `image`, which has the size of `rect` and the form's sample. */
gboolean aw_tiff_pixels_read(AwTiffPixels *pixels, AwRect rect, AwImage *image, GError **error);

#endif

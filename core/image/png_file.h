/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_PNG_FILE_H
#define AW_IMAGE_PNG_FILE_H

#include "image/reader.h"

/* PNG (ISO/IEC 15948) of grey planes; png_file.c and png_write.c are the only users of libpng. */

/* One PNG being read, for reader.c and overview.c; arguments and errors as in image/reader.h. */
typedef struct AwPngFile AwPngFile;

AwPngFile *aw_png_file_open(const char *path, int channel, GError **error);

/* The same from memory, which is kept alive; `name` stands for the file in errors. */
AwPngFile *aw_png_file_open_bytes(GBytes *bytes, const char *name, int channel, GError **error);
void aw_png_file_free(AwPngFile *png);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwPngFile, aw_png_file_free)

const AwImageInfo *aw_png_file_info(const AwPngFile *png);
int aw_png_file_n_channels(const AwPngFile *png);

/* Fills `image`, which has the size of `rect`. Rows can only be read downwards: going up again starts afresh. */
gboolean aw_png_file_read(AwPngFile *png, AwRect rect, AwImage *image, GError **error);

/* An 8-bit grey image as PNG, the same bytes every time; NULL and AW_ERROR_MEMORY. */
GBytes *aw_png_encode(const AwImage *image, GError **error);

#endif

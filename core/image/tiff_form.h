/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_TIFF_FORM_H
#define AW_IMAGE_TIFF_FORM_H

#include "image/pixels.h"
#include "image/tiff_file.h"

#define AW_TIFF_MAX_STRILE_BYTES                                                                                       \
  (G_GINT64_CONSTANT(1) << 27) /* largest strip or tile held whole; longer strips go by rows */

/* How one directory keeps its pixels. "Strile": a strip or tile, whichever the directory has. */
typedef struct {
  int width_px, height_px;
  int n_samples;
  gboolean is_rgb;      /* three samples that may be one grey */
  gboolean is_separate; /* one plane of striles for each sample */
  gboolean is_tiled;
  gboolean is_stored; /* not compressed, and the strips of each plane follow each other without a gap */
  AwPixelForm pixel;  /* of a decoded row: n_samples is 1 when is_separate */
  int strile_width_px, strile_height_px;
  gsize row_bytes;   /* of a decoded strile */
  int n_across;      /* striles side by side; 1 for strips */
  guint32 n_striles; /* of one plane */
} AwTiffForm;

/* Reads and checks the current directory's form; everything Aimwell does not read is refused here by name. */
gboolean aw_tiff_form_read(const AwTiffFile *file, AwTiffForm *form, GError **error);

/* Rows of the strip that begins at row y0: the last one may be shorter. */
int aw_tiff_form_strip_rows(const AwTiffForm *form, int y0);

/* Pixel size in µm by tag 282 or 283 and tag 296; 0 where the file does not say (see the source for when). */
double aw_tiff_form_pixel_um(const AwTiffFile *file, guint32 tag);

#endif

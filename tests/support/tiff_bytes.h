/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_TESTS_TIFF_BYTES_H
#define AW_TESTS_TIFF_BYTES_H

#include <glib.h>

/* Builds classic TIFF files byte by byte (TIFF 6.0, section 2) without libtiff, good and bad ones alike. */

enum { TIFF_BYTE = 1, TIFF_TEXT = 2, TIFF_U16 = 3, TIFF_U32 = 4, TIFF_RATIO = 5, TIFF_F64 = 12 };

typedef struct TiffBytes TiffBytes;

TiffBytes *tiff_bytes_new(gboolean big_endian);
void tiff_bytes_free(TiffBytes *t);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(TiffBytes, tiff_bytes_free)

/* Appends pixel data; gives its offset. */
guint32 tiff_bytes_data(TiffBytes *t, const void *bytes, gsize n);

/* Sets a tag of the page being built, in place of an earlier one; a value of n such as TIFF_U16. */
void tiff_bytes_set(TiffBytes *t, guint16 tag, guint16 type, guint32 value);
void tiff_bytes_set_list(TiffBytes *t, guint16 tag, guint16 type, const guint32 *values, guint32 n);
void tiff_bytes_set_text(TiffBytes *t, guint16 tag, const char *text);
void tiff_bytes_set_ratio(TiffBytes *t, guint16 tag, guint32 over, guint32 under);
void tiff_bytes_set_f64(TiffBytes *t, guint16 tag, double value);
void tiff_bytes_drop(TiffBytes *t, guint16 tag);

/* Sets all that a page of one grey, uncompressed strip needs; `pixels` are n bytes as they shall stand in the file. */
void tiff_bytes_grey(TiffBytes *t, int width_px, int height_px, int bits, const void *pixels, gsize n);

/* Writes the page's directory and begins the next page; gives the directory's offset. */
guint32 tiff_bytes_end_page(TiffBytes *t);

/* Makes the last page written point to a directory at `offset`. */
void tiff_bytes_link(TiffBytes *t, guint32 offset);

/* The bytes so far; owned by t. */
GByteArray *tiff_bytes_all(TiffBytes *t);

/* Writes the first n bytes (0: all) to folder/name and gives that path. Free with g_free. */
char *tiff_bytes_save(TiffBytes *t, const char *folder, const char *name, gsize n);

#endif

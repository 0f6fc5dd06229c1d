/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_PIXELS_H
#define AW_IMAGE_PIXELS_H

#include "image/image.h"

/* Between the file readers of this room: how decoded rows of a file hold their pixels, and how grey is taken. */

typedef struct {
  int bits;          /* of one sample: 8, 16, 32 (float), or 1 ... 15 packed from the high bit on, rows byte-aligned */
  int n_samples;     /* samples of one pixel, side by side in the row */
  gboolean inverted; /* white is zero: value v reads as 2^bits - 1 - v */
  double full_scale; /* as in AwImage */
} AwPixelForm;

/* What makes a row unreadable as grey. */
typedef enum {
  AW_PIXELS_FINE,
  AW_PIXELS_COLOURED,  /* samples of one pixel differ */
  AW_PIXELS_NOT_FINITE /* a float is infinite or no number */
} AwPixelFault;

AwSample aw_pixels_sample(const AwPixelForm *form);

/* Bytes of a row of width_px pixels. */
gsize aw_pixels_row_bytes(const AwPixelForm *form, int width_px);

/* Takes sample `sample` of the n_px pixels from first_px on of the row at `raw` to `out`. */
void aw_pixels_take(const AwPixelForm *form, int sample, const guint8 *raw, int first_px, int n_px, void *out);

/* The first pixel at which that sample differs from the values at `out`; -1 when all agree. */
int aw_pixels_differ(const AwPixelForm *form, int sample, const guint8 *raw, int first_px, int n_px, const void *out);

/* The first of n_px values that is not finite; -1 when all are, and for integers. */
int aw_pixels_not_finite(AwSample sample, const void *values, int n_px);

/* Integer values above the declared full scale show that it is none: the image then gets that of its pixel form. */
void aw_pixels_settle_full_scale(AwImage *image);

/* The AW_ERROR for a fault at column x, row y of `place` (file and page), which has n_samples channels. */
void aw_pixels_fault_error(AwPixelFault fault, const char *place, int n_samples, int x, int y, GError **error);

/* AW_ERROR_NOT_FOUND for a channel outside 0 ... n-1, AW_ERROR_UNSUPPORTED where channel is -1 and n is not 1. */
gboolean aw_pixels_check_channel(const char *place, int channel, int n, const char *names, GError **error);

#endif

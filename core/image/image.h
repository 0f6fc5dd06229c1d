/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_IMAGE_H
#define AW_IMAGE_IMAGE_H

#include <glib.h>

#include "base/point.h"

/* How one pixel of an AwImage is stored, native byte order. */
typedef enum { AW_SAMPLE_U8, AW_SAMPLE_U16, AW_SAMPLE_F32 } AwSample;

/**
 * AwImage: one grey image plane, rows from the top, no padding.
 * Black stays black: a "white is zero" file is inverted on reading.
 */
typedef struct {
  int width_px, height_px;
  AwSample sample;
  double full_scale; /* largest value the file's pixel form can hold (255, 4095 for 12 in 16, 65535); 0 for float */
  void *pixels;      /* width_px x height_px samples, owned */
} AwImage;

/* A new image, all zero; AW_ERROR_RANGE for a side outside 1 ... AW_MAX_SIDE_PX, AW_ERROR_MEMORY. */
AwImage *aw_image_new(int width_px, int height_px, AwSample sample, GError **error);
void aw_image_free(AwImage *image);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwImage, aw_image_free)

gsize aw_sample_bytes(AwSample sample);

/* The value at column x, row y, which must lie inside. For loops over many pixels use the typed rows instead. */
double aw_image_value(const AwImage *image, int x, int y);

/**
 * AwLabels: which nucleus each pixel belongs to; 0 is background, nucleus k has label k.
 */
typedef struct {
  int width_px, height_px;
  guint32 n_labels; /* labels 1 ... n_labels are all in use */
  guint32 *label;   /* width_px x height_px, owned */
} AwLabels;

AwLabels *aw_labels_new(int width_px, int height_px, GError **error);
void aw_labels_free(AwLabels *labels);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwLabels, aw_labels_free)

#endif

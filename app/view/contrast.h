/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_VIEW_CONTRAST_H
#define AW_VIEW_CONTRAST_H

#include <cairo.h>

#include "image/image.h"

#define AW_MIN_GAMMA 0.1
#define AW_MAX_GAMMA 10.0

/* How pixel values become greys: t = (value - low) / (high - low), limited to 0 ... 1; grey = t^gamma. */
typedef struct {
  double low, high;  /* pixel values shown black and white; high <= low shows all above low white */
  double gamma;      /* AW_MIN_GAMMA ... AW_MAX_GAMMA; below 1 lifts dim nuclei */
  gboolean inverted; /* dark on light */
} AwContrast;

/* The grey of a value, 0 ... 255; NaN gives that of low. */
guint8 aw_contrast_grey(const AwContrast *contrast, double value);

/**
 * Sets low and high to percentiles of all pixels of n images (n >= 1; one dish's frames share one contrast, so that
 * brightness can be compared). low_frac < high_frac within 0 ... 1; images are sampled evenly past 200,000 pixels in
 * all. The automatic contrast is 0.01 and 0.998. Leaves *contrast alone when there is no finite pixel.
 */
void aw_contrast_set_percentiles(AwContrast *contrast, const AwImage *const *images, gsize n, double low_frac,
                                 double high_frac);

/* AwGreys: a contrast made ready to turn many images into greys: every 8- and 16-bit value is worked out once. */
typedef struct AwGreys AwGreys;

AwGreys *aw_greys_new(const AwContrast *contrast);
void aw_greys_free(AwGreys *greys);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwGreys, aw_greys_free)

/* The image in greys as an RGB24 surface; NULL when memory cannot be had. */
cairo_surface_t *aw_greys_render(const AwGreys *greys, const AwImage *image);

#endif

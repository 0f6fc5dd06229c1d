/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_MARKS_H
#define AW_IMAGE_MARKS_H

#include "image/image.h"

/* Which mark of an image is meant. */
typedef struct {
  gboolean dark;            /* a dark mark on bright ground; FALSE: bright on dark */
  double diameter_px;       /* its rough size, 2 ... 200 px; right within a factor of two */
  const AwPixelPoint *near; /* the mark nearest to this pixel within reach; NULL: the one clearly strongest */
  double reach_px;          /* how far from `near` to look; 0: three diameters */
} AwMarkSettings;

/* A spot, disc or cross found in an image. */
typedef struct {
  AwPixelPoint at;
  double se_px;  /* standard error per axis from the noise of the ground round it */
  double height; /* above (dark: below) the ground, image units */
  double ground; /* median round the mark */
  double noise;  /* rms of the ground, one pixel */
} AwMark;

/**
 * aw_mark_find: a mark that is the same when turned by 180 degrees, to a fraction of a pixel.
 *
 * Found as the peak of the Laplacian of a Gaussian fitting its size (Lindeberg 1998), then placed by a centroid under
 * a Gaussian window that is moved until it stands on its own centroid. AW_ERROR_NOT_FOUND: no mark stands out;
 * AW_ERROR_RANGE: it is cut by the image's edge, a setting outside its limits, or two marks are as strong.
 */
gboolean aw_mark_find(const AwImage *image, const AwMarkSettings *settings, AwMark *mark, GError **error);

/**
 * Standard error per axis of the centroid of a point-like mark, in the unit of s and a: sqrt(s2/N + a2/12N +
 * 8 pi s4 b2/(a2 N2)); s the rms width of the spot, a the pixel, N photons, b noise photons per pixel. Thompson, Larson
 * & Webb 2002, Biophys. J. 82:2775.
 */
double aw_mark_spot_error(double s, double a, double n_photons, double b);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_RENDER_H
#define AW_NUCLEI_RENDER_H

#include "geometry/pixelmap.h"
#include "image/image.h"
#include "nuclei/truth.h"

/**
 * Draws synthetic fluorescence frames from true geometry, for sample data, rehearsed follow-ups and tests.
 *
 * Light adds up: an object is its outline with exact pixel coverage, shaded by thickness and chromatin texture, scaled
 * to its photoelectrons, blurred by the optics and its own defocus. Haze, background, uneven light, photon noise,
 * read noise, hot pixels and clipping follow. One channel is one list of objects: a second channel (damage marks) is
 * the same call with another list and camera.
 */

/* Where and how large a frame is. */
typedef struct {
  int width_px, height_px;
  AwPixelMap map;
  AwScanPoint stage; /* where the stage truly stands, which its reading may miss a little */
  guint frame;       /* number of the frame, from 0: every frame has noise of its own */
} AwRenderView;

/* Microscope and camera of one channel. */
typedef struct {
  double blur_px;          /* Gaussian sigma of the optics */
  double background_e;     /* electrons per pixel from medium and plastic under full light */
  double haze_frac;        /* of each object's light, spread wide around it: light from out of focus */
  double haze_um;          /* Gaussian sigma of that spread */
  double vignette_frac;    /* loss of light from the frame's centre to its corners, growing with r^2 */
  double slope_x, slope_y; /* change of the light from the centre to the right and lower edge, fraction */
  double counts_per_e;     /* camera gain */
  double read_noise_e;     /* standard deviation */
  double offset;           /* counts of a dark pixel */
  double full_scale;       /* largest count, 255 ... 65535; above it is clipped */
  int n_hot;               /* hot pixels, the same in every frame of this camera */
  double hot_e;            /* electrons of the hottest; the others have less */
  guint64 seed;            /* of the camera's hot pixels and of all noise */
} AwRenderCamera;

/**
 * aw_render_rows: draws rows y0 ... y1-1 of a frame into `counts` ((y1 - y0) x width_px values).
 *
 * truths: AwTruth, drawn in array order; those out of sight cost little. Noise depends on (camera seed, frame, row,
 * column) only, so a frame drawn in bands equals one drawn whole, bit by bit, on any number of threads.
 * AW_ERROR_MEMORY when the drawing board cannot be had.
 */
gboolean aw_render_rows(const GPtrArray *truths, const AwRenderView *view, const AwRenderCamera *camera, int y0, int y1,
                        guint16 *counts, GError **error);

/* The whole frame as a 16-bit image whose full_scale is the camera's. */
AwImage *aw_render_frame(const GPtrArray *truths, const AwRenderView *view, const AwRenderCamera *camera,
                         GError **error);

/**
 * aw_render_labels: the true mask of each object: label i + 1 where truth i covers at least half of the pixel; where
 * two do, the later one. n_labels is the number of truths, seen or not.
 */
AwLabels *aw_render_labels(const GPtrArray *truths, const AwRenderView *view, GError **error);

/* The outline of a truth in a frame's pixels (n_outline points). Free with g_free. */
AwPixelPoint *aw_render_outline(const AwTruth *truth, const AwRenderView *view);

#endif

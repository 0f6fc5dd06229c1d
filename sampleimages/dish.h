/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_SAMPLE_DISH_H
#define AW_SAMPLE_DISH_H

#include "nuclei/render.h"

/* The invented dish that sampleimages/README.md tells of. */

#define SAMPLE_SIDE_PX 1024
#define SAMPLE_N_FRAMES 9
#define SAMPLE_NOMINAL_PIXEL_UM 0.65 /* what the objective's label says; the true map differs a little */

/* What `whole`, `separate` and `defocused` mean in the truth tables; README.md says the same. */
#define SAMPLE_WHOLE_MARGIN_PX 3.0
#define SAMPLE_SEPARATE_GAP_UM 3.0
#define SAMPLE_SEPARATE_BLURS 2.0 /* and this many times its own defocus blur */
#define SAMPLE_DEFOCUSED_BLUR_UM 1.0
#define SAMPLE_SATURATED_FRAC 0.01
#define SAMPLE_FAR_GAP_UM 30.0

/* What a frame shows. The damage marks of a later follow-up are one more row of the generator's channel table. */
typedef struct {
  const char *name; /* as in --channel, and in file names */
  AwRenderCamera camera;
} SampleChannel;

typedef struct {
  char file[32];       /* path from the scan table's folder */
  AwRenderView view;   /* where the stage truly stood */
  AwScanPoint reading; /* what the stage said: to 0.1 um, with a small error */
  double taken_at_unix_s;
} SampleFrame;

typedef struct {
  GPtrArray *truths; /* AwTruth; the id in tables is the index + 1 */
  SampleFrame frame[SAMPLE_N_FRAMES];
  const SampleChannel *channel;
} SampleDish;

/* The channel of that name, or NULL. */
const SampleChannel *sample_channel(const char *name);

/* The dish as seen in one channel. Free with sample_dish_free. */
SampleDish *sample_dish_new(const SampleChannel *channel, GError **error);
void sample_dish_free(SampleDish *dish);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(SampleDish, sample_dish_free)

/* The camera and pixel map of the nuclear channel, for large scans that only need to look alike. */
AwPixelMap sample_pixel_map(void);

#endif

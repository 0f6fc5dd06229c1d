/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "dish.h"

#include "base/random.h"
#include "nuclei/population.h"

#define SEED G_GUINT64_CONSTANT(20310504)
#define STEP_UM 592.0                      /* between neighbouring frames: 11 % overlap */
#define TURN_RAD 0.0419                    /* camera against stage axes: 2.4 degrees */
#define TRUE_PIXEL_UM 0.6506               /* the label says 0.65 */
#define FRAME_S 2.6                        /* from one exposure to the next */
#define FIRST_EXPOSURE_UNIX_S 1777885931.0 /* 2026-05-04T09:12:11Z */

/* Where the scan stands on the stage: its middle frame. */
static const AwScanPoint middle = { 41250.0, 28730.0 };

/* Too much stain, and a place where the film bulges out of focus; from the middle of the scan, um. */
static const struct {
  double x_um, y_um, radius_um, factor;
} stained = { 40.0, 350.0, 95.0, 9.0 };
static const struct {
  double x_um, y_um, radius_um, blur_um;
} bulge = { -560.0, 590.0, 290.0, 3.4 };

static const SampleChannel channels[] = {
  { "nuclei",
    { .blur_px = 1.1,
      .background_e = 230.0,
      .haze_frac = 0.24,
      .haze_um = 18.0,
      .vignette_frac = 0.28,
      .slope_x = 0.07,
      .slope_y = -0.05,
      .counts_per_e = 0.3,
      .read_noise_e = 6.0,
      .offset = 100.0,
      .full_scale = 4095.0,
      .n_hot = 14,
      .hot_e = 4000.0,
      .seed = SEED + 1 } },
};

const SampleChannel *sample_channel(const char *name)
{
  for (gsize i = 0; i < G_N_ELEMENTS(channels); i++)
    if (!g_strcmp0(channels[i].name, name))
      return channels + i;
  return NULL;
}

AwPixelMap sample_pixel_map(void)
{
  double c = TRUE_PIXEL_UM * cos(TURN_RAD), s = TRUE_PIXEL_UM * sin(TURN_RAD);
  return (AwPixelMap){ { c, -s, s, c }, AW_ORIGIN_ENTERED, 0.0 };
}

static double to_tenths(double um)
{
  return floor(um * 10.0 + 0.5) / 10.0;
}

/* A meander over 3 x 3 places. The stage stops up to a few um off; its encoder is good to 0.05 um and shows 0.1 um. */
static void place_frames(SampleDish *dish)
{
  for (int i = 0; i < SAMPLE_N_FRAMES; i++) {
    int row = i / 3, column = row % 2 ? 2 - i % 3 : i % 3;
    AwRandom r = aw_random_stream(SEED + 2, (guint64)i);
    SampleFrame *frame = dish->frame + i;
    AwScanPoint at = { middle.x_um + (column - 1) * STEP_UM, middle.y_um + (row - 1) * STEP_UM };
    at.x_um += 0.9 * aw_random_normal(&r);
    at.y_um += 0.9 * aw_random_normal(&r);
    frame->view = (AwRenderView){ SAMPLE_SIDE_PX, SAMPLE_SIDE_PX, sample_pixel_map(), at, (guint)i };
    frame->reading.x_um = to_tenths(at.x_um + 0.05 * aw_random_normal(&r));
    frame->reading.y_um = to_tenths(at.y_um + 0.05 * aw_random_normal(&r));
    frame->taken_at_unix_s = FIRST_EXPOSURE_UNIX_S + floor(FRAME_S * i);
    g_snprintf(frame->file, sizeof frame->file, "frames/%s-%d.tif", dish->channel->name, i + 1);
  }
}

#define N_FIBRE 160

/* A textile fibre: a thin strip along a slow curve. */
static AwTruth *fibre(void)
{
  AwScanPoint side[2 * N_FIBRE];
  double x = middle.x_um - 130.0, y = middle.y_um - 610.0, turn = 0.95;
  for (int i = 0; i < N_FIBRE; i++) {
    double half = 0.75 + 0.15 * sin(0.31 * i);
    side[i] = (AwScanPoint){ x - half * sin(turn), y + half * cos(turn) };
    side[2 * N_FIBRE - 1 - i] = (AwScanPoint){ x + half * sin(turn), y - half * cos(turn) };
    turn += 0.017 * sin(0.055 * i) + 0.012 * sin(0.13 * i + 1.0);
    x += 4.0 * cos(turn);
    y += 4.0 * sin(turn);
  }
  AwTruth *truth = aw_truth_new(AW_TRUTH_FIBRE, side, 2 * N_FIBRE);
  truth->light_e = 1.1e6;
  truth->texture_frac = 0.25;
  truth->blur_um = 0.6;
  truth->seed = SEED + 3;
  return truth;
}

/* The two bad places of the dish, each strongest in its middle. */
static void spoil(AwTruth *truth)
{
  double x = truth->centroid.x_um - middle.x_um, y = truth->centroid.y_um - middle.y_um;
  double d = hypot(x - stained.x_um, y - stained.y_um) / stained.radius_um;
  truth->light_e *= 1.0 + stained.factor * exp(-d * d * d * d);
  double b = hypot(x - bulge.x_um, y - bulge.y_um) / bulge.radius_um;
  if (b < 1.0)
    truth->blur_um = hypot(truth->blur_um, bulge.blur_um * (1.0 - b * b));
}

SampleDish *sample_dish_new(const SampleChannel *channel, GError **error)
{
  double reach = 1.5 * STEP_UM + 120.0;
  AwPopulationPlan plan = { .from = { middle.x_um - reach, middle.y_um - reach },
                            .to = { middle.x_um + reach, middle.y_um + reach },
                            .n_nuclei = 700,
                            .clump_frac = 0.3,
                            .mitotic_frac = 0.045,
                            .debris_per_nucleus = 0.2,
                            .gap_um = 3.2,
                            .patchy_frac = 0.85,
                            .light_e = 4.8e5,
                            .seed = SEED };
  g_autoptr(SampleDish) dish = g_new0(SampleDish, 1);
  dish->channel = channel;
  dish->truths = aw_population_new(&plan, error);
  if (!dish->truths)
    return NULL;
  g_ptr_array_add(dish->truths, fibre());
  for (guint i = 0; i < dish->truths->len; i++)
    spoil(dish->truths->pdata[i]);
  aw_truths_measure_gaps(dish->truths, SAMPLE_FAR_GAP_UM);
  place_frames(dish);
  return g_steal_pointer(&dish);
}

void sample_dish_free(SampleDish *dish)
{
  if (!dish)
    return;
  if (dish->truths)
    g_ptr_array_unref(dish->truths);
  g_free(dish);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "calibration.h"

#include <gsl/gsl_cdf.h>
#include <math.h>

#include "base/random.h"
#include "base/text.h"

#define SEED G_GUINT64_CONSTANT(20310505)
#define PIXEL_UM 0.6506
#define TURN_RAD 0.0419       /* camera against stage axes */
#define RELOCATION_RAD 0.0062 /* of the beam stage against the scan stage */
#define SHIFT_X_UM 312.4
#define SHIFT_Y_UM (-187.9)
#define READING_UM 0.8 /* rms per axis of reading a mark, both stages together */
#define OFFSET_X_UM 3.42
#define OFFSET_Y_UM (-1.87)
#define EARLY_X_UM 3.05 /* the offset an hour and ten minutes before */
#define EARLY_Y_UM (-2.10)
#define SIGMA_X_UM 0.42
#define SIGMA_Y_UM 0.55
#define BEAD_SIGMA_UM 1.9 /* beam and bead together */

static void put(GString *text, double value, int decimals, char end)
{
  g_autofree char *number = aw_text_from_double(value, decimals);
  g_string_append_printf(text, "%s%c", number, end);
}

static unsigned draw_count(AwRandom *r, unsigned n, double fraction)
{
  unsigned hits = 0;
  for (unsigned i = 0; i < n; i++)
    hits += aw_random_unit(r) < fraction;
  return hits;
}

/* One mark brought to nine places of the image: S = k + A (p - c). */
static void pixel_pairs(GString *text)
{
  AwRandom r = aw_random_stream(SEED, 1);
  g_string_append(text, "stage_x_um,stage_y_um,x_px,y_px\n");
  for (int i = 0; i < 9; i++) {
    double x = 140 + 370 * (i % 3) + 8 * aw_random_normal(&r), y = 150 + 360 * (i / 3) + 8 * aw_random_normal(&r);
    double c = PIXEL_UM * cos(TURN_RAD), s = PIXEL_UM * sin(TURN_RAD), u = x - 511.5, v = y - 511.5;
    put(text, 40212.4 + c * u - s * v + 0.05 * aw_random_normal(&r), 1, ',');
    put(text, 30877.0 + s * u + c * v + 0.05 * aw_random_normal(&r), 1, ',');
    put(text, x + 0.05 * aw_random_normal(&r), 2, ',');
    put(text, y + 0.05 * aw_random_normal(&r), 2, '\n');
  }
}

static void marks(GString *text)
{
  static const struct {
    const char *name;
    double x, y;
  } places[] = { { "north", 41500, 38700 }, { "north-east", 49800, 34100 }, { "south-east", 47600, 20900 },
                 { "south", 40100, 18300 }, { "west", 31900, 26200 },       { "north-west", 34400, 36800 } };
  AwRandom r = aw_random_stream(SEED, 2);
  double c = cos(RELOCATION_RAD), s = sin(RELOCATION_RAD);
  g_string_append(text, "name,scan_x_um,scan_y_um,beam_x_um,beam_y_um\n");
  for (gsize i = 0; i < G_N_ELEMENTS(places); i++) {
    double x = places[i].x + 30 * aw_random_normal(&r), y = places[i].y + 30 * aw_random_normal(&r);
    g_string_append_printf(text, "%s,", places[i].name);
    put(text, x, 1, ',');
    put(text, y, 1, ',');
    put(text, c * x - s * y + SHIFT_X_UM + READING_UM * aw_random_normal(&r), 1, ',');
    put(text, s * x + c * y + SHIFT_Y_UM + READING_UM * aw_random_normal(&r), 1, '\n');
  }
}

/* The fraction of full energy rises as the edge leaves the beam. */
static void edge(GString *text, double centre, double sigma, guint64 item)
{
  AwRandom r = aw_random_stream(SEED, item);
  g_string_append(text, "position_um,n_full,n_degraded\n");
  for (int i = -15; i <= 15; i++) {
    double x = round(centre) + 0.15 * i;
    unsigned full = draw_count(&r, 200, gsl_cdf_ugaussian_P((x - centre) / sigma));
    put(text, x, 2, ',');
    g_string_append_printf(text, "%u,%u\n", full, 200 - full);
  }
}

static void bead(GString *text, double x0, double y0, guint64 item)
{
  AwRandom r = aw_random_stream(SEED, item);
  g_string_append(text, "x_um,y_um,n_full,n_degraded\n");
  for (int i = 0; i < 121; i++) {
    double x = round(x0) + i % 11 - 5, y = round(y0) + i / 11 - 5;
    double d2 = ((x - x0) * (x - x0) + (y - y0) * (y - y0)) / (BEAD_SIGMA_UM * BEAD_SIGMA_UM);
    unsigned degraded = draw_count(&r, 100, 0.01 + 0.93 * exp(-d2 / 2));
    put(text, x, 1, ',');
    put(text, y, 1, ',');
    g_string_append_printf(text, "%u,%u\n", 100 - degraded, degraded);
  }
}

static void beam(GString *text)
{
  g_string_append(text, "[beam]\nparticle=proton\nenergy-mev=3\nshape=gaussian\nhalo-frac=0.02\nhalo-diameter-um=12\n\n"
                        "[layer.1]\nname=window\ncomposition=C 10 H 8 O 4\ndensity-g-cm3=1.4\nthickness-um=6\n\n"
                        "[layer.2]\nname=gap\ncomposition=N 2\ndensity-g-cm3=0.0012\nthickness-um=200\n\n"
                        "[layer.3]\nname=film\ncomposition=C 10 H 8 O 4\ndensity-g-cm3=1.4\nthickness-um=4\n\n"
                        "[layer.4]\nname=medium\ncomposition=H 2 O 1\ndensity-g-cm3=1\nthickness-um=2\n");
}

static void truth(GString *text)
{
  static const struct {
    const char *name, *unit;
    double value;
  } rows[] = { { "pixel_map_scale", "um/px", PIXEL_UM },
               { "pixel_map_rotation", "rad", TURN_RAD },
               { "relocation_rotation", "rad", RELOCATION_RAD },
               { "relocation_shift_x", "um", SHIFT_X_UM },
               { "relocation_shift_y", "um", SHIFT_Y_UM },
               { "mark_reading_error", "um", READING_UM },
               { "offset_x", "um", OFFSET_X_UM },
               { "offset_y", "um", OFFSET_Y_UM },
               { "offset_x_0830", "um", EARLY_X_UM },
               { "offset_y_0830", "um", EARLY_Y_UM },
               { "beam_sigma_x", "um", SIGMA_X_UM },
               { "beam_sigma_y", "um", SIGMA_Y_UM },
               { "bead_sigma", "um", BEAD_SIGMA_UM } };
  g_string_append(text, "quantity,value,unit\n");
  for (gsize i = 0; i < G_N_ELEMENTS(rows); i++) {
    g_autofree char *number = aw_text_from_double_exact(rows[i].value);
    g_string_append_printf(text, "%s,%s,%s\n", rows[i].name, number, rows[i].unit);
  }
}

static const char *const names[SAMPLE_N_CALIBRATIONS] = { "calibration/pixel.csv",     "calibration/marks.csv",
                                                          "calibration/edge-x.csv",    "calibration/edge-y.csv",
                                                          "calibration/bead-0830.csv", "calibration/bead.csv",
                                                          "calibration/proton.beam",   "calibration/truth.csv" };

const char *sample_calibration_name(int i)
{
  return names[i];
}

char *sample_calibration_text(int i)
{
  GString *text = g_string_new(NULL);
  switch (i) {
  case 0:
    pixel_pairs(text);
    break;
  case 1:
    marks(text);
    break;
  case 2:
    edge(text, 50120 + OFFSET_X_UM, SIGMA_X_UM, 3);
    break;
  case 3:
    edge(text, 30110 + OFFSET_Y_UM, SIGMA_Y_UM, 4);
    break;
  case 4:
    bead(text, 52012 + EARLY_X_UM, 31408 + EARLY_Y_UM, 5);
    break;
  case 5:
    bead(text, 52012 + OFFSET_X_UM, 31408 + OFFSET_Y_UM, 6);
    break;
  case 6:
    beam(text);
    break;
  default:
    truth(text);
  }
  return g_string_free(text, FALSE);
}

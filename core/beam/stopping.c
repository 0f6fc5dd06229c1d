/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "beam/stopping.h"

#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/text.h"

#define ELECTRON_REST_EV 510998.95
#define BETHE_FACTOR 0.307075 /* MeV cm2/mol, Particle Data Group */
#define WATER_Z_OVER_A (10.0 / 18.01528)
#define WATER_MEAN_EXCITATION_EV 75.0 /* as PSTAR and ASTAR take it */
#define N_SLOWING_STEPS 256

/* Liquid water: NIST PSTAR and ASTAR, kinetic energy (MeV), total stopping power (MeV cm2/g), CSDA range (um). */
typedef struct {
  double energy_mev, stopping, range_um;
} Row;

static const Row proton_rows[] = { { 1, 260.8, 24.58 },   { 2, 158.6, 75.55 },   { 3, 117.2, 149.9 },
                                   { 3.5, 104.2, 195.2 }, { 4.5, 85.86, 301.5 }, { 5, 79.11, 362.3 } };
static const Row alpha_rows[] = {
  { 3, 1256.5, 18.29 }, { 4, 1034.7, 27.11 }, { 5, 885.5, 37.59 }, { 6, 777.7, 49.67 }
};

static const struct {
  const char *name;
  double charge, rest_mev;
  const Row *rows;
  gsize n;
} particles[] = { { "proton", 1, 938.27208816, proton_rows, G_N_ELEMENTS(proton_rows) },
                  { "alpha", 2, 3727.3794066, alpha_rows, G_N_ELEMENTS(alpha_rows) } };

const char *aw_particle_name(AwParticle particle)
{
  return particles[particle].name;
}

gboolean aw_particle_parse(const char *name, AwParticle *particle, GError **error)
{
  for (gsize i = 0; i < G_N_ELEMENTS(particles); i++)
    if (strcmp(name, particles[i].name) == 0) {
      *particle = (AwParticle)i;
      return TRUE;
    }
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "there is no particle \"%s\"; proton and alpha are known", name);
  return FALSE;
}

double aw_particle_charge(AwParticle particle)
{
  return particles[particle].charge;
}

double aw_particle_rest_mev(AwParticle particle)
{
  return particles[particle].rest_mev;
}

void aw_stopping_limits(AwParticle particle, double *min_mev, double *max_mev)
{
  *min_mev = particles[particle].rows[0].energy_mev;
  *max_mev = particles[particle].rows[particles[particle].n - 1].energy_mev;
}

double aw_particle_beta(AwParticle particle, double energy_mev)
{
  double gamma = 1 + energy_mev / particles[particle].rest_mev;
  return sqrt(1 - 1 / (gamma * gamma));
}

double aw_particle_p_beta_mev(AwParticle particle, double energy_mev)
{
  double rest = particles[particle].rest_mev;
  return energy_mev * (energy_mev + 2 * rest) / (energy_mev + rest); /* p^2 c^2 / E */
}

/* Bethe's formula without shell and density corrections; only its shape is used, between table rows. */
static double bethe(AwParticle particle, double energy_mev)
{
  double beta = aw_particle_beta(particle, energy_mev), b2 = beta * beta, z = particles[particle].charge;
  double argument = 2 * ELECTRON_REST_EV * b2 / (1 - b2) / WATER_MEAN_EXCITATION_EV;
  return BETHE_FACTOR * z * z * WATER_Z_OVER_A / b2 * (log(argument) - b2);
}

/* The rows around an energy and where it lies between them on a logarithmic scale. */
static gboolean find_rows(AwParticle particle, double energy_mev, const Row **row, double *part, GError **error)
{
  double min, max;
  aw_stopping_limits(particle, &min, &max);
  if (!(energy_mev >= min && energy_mev <= max)) {
    g_autofree char *e = aw_text_from_double(energy_mev, 3);
    g_autofree char *low = aw_text_from_double_exact(min), *high = aw_text_from_double_exact(max);
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s of %s MeV: the stopping-power table reaches from %s to %s MeV",
                aw_particle_name(particle), e, low, high);
    return FALSE;
  }
  const Row *rows = particles[particle].rows;
  gsize i = 0;
  while (i + 2 < particles[particle].n && rows[i + 1].energy_mev < energy_mev)
    i++;
  *row = rows + i;
  *part = log(energy_mev / rows[i].energy_mev) / log(rows[i + 1].energy_mev / rows[i].energy_mev);
  return TRUE;
}

gboolean aw_stopping_water(AwParticle particle, double energy_mev, double *mev_cm2_per_g, GError **error)
{
  const Row *row;
  double part;
  if (!find_rows(particle, energy_mev, &row, &part, error))
    return FALSE;
  double a = row[0].stopping / bethe(particle, row[0].energy_mev),
         b = row[1].stopping / bethe(particle, row[1].energy_mev);
  *mev_cm2_per_g = bethe(particle, energy_mev) * (a + part * (b - a));
  return TRUE;
}

gboolean aw_let_water(AwParticle particle, double energy_mev, double *kev_per_um, GError **error)
{
  if (!aw_stopping_water(particle, energy_mev, kev_per_um, error))
    return FALSE;
  *kev_per_um *= 0.1;
  return TRUE;
}

/* Length over which water takes a particle from one energy of the table to another: Simpson's rule on dE / S. */
static double path_um(AwParticle particle, double from_mev, double to_mev)
{
  double h = (from_mev - to_mev) / N_SLOWING_STEPS, sum = 0;
  for (int i = 0; i <= N_SLOWING_STEPS; i++) {
    double s = INFINITY, weight = i == 0 || i == N_SLOWING_STEPS ? 1 : i % 2 ? 4 : 2;
    aw_stopping_water(particle, fmin(to_mev + i * h, from_mev), &s, NULL);
    sum += weight / s;
  }
  return sum * h / 3 * 1e4; /* cm of unit density into um */
}

/* From the row below on by the stopping powers, so that both tables meet at every row. */
gboolean aw_range_water(AwParticle particle, double energy_mev, double *range_um, GError **error)
{
  const Row *row;
  double part;
  if (!find_rows(particle, energy_mev, &row, &part, error))
    return FALSE;
  double whole = path_um(particle, row[1].energy_mev, row[0].energy_mev);
  double walked = path_um(particle, energy_mev, row[0].energy_mev);
  *range_um = row[0].range_um + (row[1].range_um - row[0].range_um) * (walked / whole);
  return TRUE;
}

static gboolean explain_stop(AwParticle particle, double energy_mev, double depth_um, double range_um, GError **error)
{
  double min, max;
  aw_stopping_limits(particle, &min, &max);
  g_autofree char *e = aw_text_from_double(energy_mev, 3), *d = aw_text_from_double(depth_um, 2);
  g_autofree char *r = aw_text_from_double(range_um, 2), *low = aw_text_from_double_exact(min);
  if (depth_um >= range_um)
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s of %s MeV stops after %s um of water; it does not pass %s um",
                aw_particle_name(particle), e, r, d);
  else
    g_set_error(
        error, AW_ERROR, AW_ERROR_RANGE,
        "%s of %s MeV leaves %s um of water below %s MeV, where the stopping-power table ends (its range is %s um)",
        aw_particle_name(particle), e, d, low, r);
  return FALSE;
}

/* Bisection on the energy whose range is the range left. */
gboolean aw_slow_down_water(AwParticle particle, double energy_mev, double depth_um, double *left_mev, GError **error)
{
  double range, low, high, max, least;
  if (!aw_range_water(particle, energy_mev, &range, error))
    return FALSE;
  aw_stopping_limits(particle, &low, &max);
  aw_range_water(particle, low, &least, NULL);
  if (range - depth_um < least)
    return explain_stop(particle, energy_mev, depth_um, range, error);
  high = energy_mev;
  for (int i = 0; i < 60 && high - low > 1e-9; i++) {
    double mid = (low + high) / 2, r = 0;
    aw_range_water(particle, mid, &r, NULL);
    if (r < range - depth_um)
      low = mid;
    else
      high = mid;
  }
  *left_mev = (low + high) / 2;
  return TRUE;
}

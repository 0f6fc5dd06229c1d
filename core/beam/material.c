/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "beam/material.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/error.h"
#include "base/text.h"

#define MIN_DENSITY 1e-5
#define MAX_DENSITY 25.0
#define WATER_COMPOSITION "H 2 O 1"

/* Standard atomic weights (IUPAC, abridged; from memory). */
static const struct {
  const char *symbol;
  int z;
  double weight;
} elements[] = {
  { "H", 1, 1.008 },    { "He", 2, 4.0026 },  { "Be", 4, 9.012 },   { "B", 5, 10.81 },    { "C", 6, 12.011 },
  { "N", 7, 14.007 },   { "O", 8, 15.999 },   { "F", 9, 18.998 },   { "Na", 11, 22.990 }, { "Al", 13, 26.982 },
  { "Si", 14, 28.085 }, { "P", 15, 30.974 },  { "S", 16, 32.06 },   { "Cl", 17, 35.45 },  { "Ar", 18, 39.95 },
  { "K", 19, 39.098 },  { "Ca", 20, 40.078 }, { "Ti", 22, 47.867 },
};

/* Sums over the atoms of a molecule. */
typedef struct {
  double mass, over_root, over_length; /* weight, sum w / sqrt(A), sum w / X0, both times the mass */
} Sums;

/* Radiation length of an element, g/cm2: Dahl's fit as the Particle Data Group gives it. */
static double element_length(int z, double weight)
{
  return 716.4 * weight / (z * (z + 1.0) * log(287 / sqrt(z)));
}

static gboolean add_element(const char *symbol, const char *count, const char *composition, Sums *sums, GError **error)
{
  double n;
  g_autofree char *where = g_strdup_printf("composition \"%s\"", composition);
  if (!count) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: a count is missing after %s; write it like C 10 H 8 O 4", where,
                symbol);
    return FALSE;
  }
  if (!aw_text_to_double(count, where, &n, error))
    return FALSE;
  if (!(n > 0 && n <= 1e6)) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s: %s atoms of %s; a count is above 0 and at most 1000000", where,
                count, symbol);
    return FALSE;
  }
  for (gsize i = 0; i < G_N_ELEMENTS(elements); i++) {
    if (strcmp(symbol, elements[i].symbol) != 0)
      continue;
    double mass = n * elements[i].weight;
    sums->mass += mass;
    sums->over_root += mass / sqrt(elements[i].weight);
    sums->over_length += mass / element_length(elements[i].z, elements[i].weight);
    return TRUE;
  }
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s: element \"%s\" is not in the table", where, symbol);
  return FALSE;
}

static gboolean sum_composition(const char *composition, Sums *sums, GError **error)
{
  g_auto(GStrv) words = g_strsplit_set(composition, " \t", -1);
  const char *symbol = NULL;
  memset(sums, 0, sizeof *sums);
  for (char **word = words; *word; word++) {
    if (!**word)
      continue;
    if (!symbol) {
      symbol = *word;
      continue;
    }
    if (!add_element(symbol, *word, composition, sums, error))
      return FALSE;
    symbol = NULL;
  }
  if (symbol)
    return add_element(symbol, NULL, composition, sums, error);
  if (sums->mass > 0)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "composition \"%s\" names no element; write it like C 10 H 8 O 4",
              composition);
  return FALSE;
}

gboolean aw_material_from_composition(const char *composition, double density_g_cm3, AwMaterial *material,
                                      GError **error)
{
  Sums sums, water;
  if (!(density_g_cm3 >= MIN_DENSITY && density_g_cm3 <= MAX_DENSITY)) {
    g_autofree char *density = aw_text_from_double_exact(density_g_cm3);
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "a density of %s g/cm3 is outside 0.00001 to 25", density);
    return FALSE;
  }
  if (!sum_composition(composition, &sums, error) || !sum_composition(WATER_COMPOSITION, &water, error))
    return FALSE;
  *material = (AwMaterial){ density_g_cm3, (sums.over_root / sums.mass) / (water.over_root / water.mass),
                            sums.mass / sums.over_length };
  return TRUE;
}

double aw_highland_rad(double p_beta_mev, double beta, double charge, double radiation_lengths)
{
  if (radiation_lengths <= 0)
    return 0;
  double log_term = 1 + 0.038 * log(radiation_lengths * charge * charge / (beta * beta));
  return 13.6 / p_beta_mev * charge * sqrt(radiation_lengths) * fmax(log_term, 0);
}

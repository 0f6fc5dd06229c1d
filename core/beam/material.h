/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BEAM_MATERIAL_H
#define AW_BEAM_MATERIAL_H

#include <glib.h>

/* What a layer is made of, from its composition and density. */
typedef struct {
  double density_g_cm3;
  double water_ratio; /* mass stopping power over that of water */
  double radiation_length_g_cm2;
} AwMaterial;

/**
 * aw_material_from_composition: from atoms per molecule, such as "C 10 H 8 O 4".
 *
 * water_ratio by the rule of Bragg & Kleeman (1905): ranges go as the square root of the atomic weight over the
 * density, compounds by mass fractions. Radiation length by Dahl's fit (Particle Data Group), compounds likewise.
 * AW_ERROR_FORMAT for a text of another form, AW_ERROR_NOT_FOUND for an element that is not in the table,
 * AW_ERROR_RANGE for a density outside 1e-5 ... 25 g/cm3.
 */
gboolean aw_material_from_composition(const char *composition, double density_g_cm3, AwMaterial *material,
                                      GError **error);

/**
 * Highland's formula in the Particle Data Group's form, for one scatterer: the rms angle per axis (plane), rad,
 * theta0 = 13.6 MeV / (p beta c) z sqrt(x/X0) (1 + 0.038 ln(x z2 / (X0 beta2))).
 */
double aw_highland_rad(double p_beta_mev, double beta, double charge, double radiation_lengths);

#endif

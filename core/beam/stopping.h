/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BEAM_STOPPING_H
#define AW_BEAM_STOPPING_H

#include <glib.h>

typedef enum { AW_PROTON, AW_ALPHA } AwParticle;

const char *aw_particle_name(AwParticle particle); /* "proton" or "alpha" */
gboolean aw_particle_parse(const char *name, AwParticle *particle, GError **error);
double aw_particle_charge(AwParticle particle);   /* in elementary charges */
double aw_particle_rest_mev(AwParticle particle); /* rest energy, CODATA 2018 */

/* Kinetic energies between which the tables reach, MeV. */
void aw_stopping_limits(AwParticle particle, double *min_mev, double *max_mev);

/**
 * Total mass stopping power of liquid water, MeV cm2/g.
 *
 * NIST PSTAR and ASTAR (Berger, Coursey, Zucker & Chang; ICRU Report 49, 1993), good to three figures; between the
 * table's energies the ratio to Bethe's formula is interpolated, which changes by a few parts in a hundred only.
 * AW_ERROR_RANGE outside aw_stopping_limits, naming the energy and the limits.
 */
gboolean aw_stopping_water(AwParticle particle, double energy_mev, double *mev_cm2_per_g, GError **error);

/* LET in water of density 1 g/cm3, keV/um: 0.1 times the above. */
gboolean aw_let_water(AwParticle particle, double energy_mev, double *kev_per_um, GError **error);

/* Range in water by continuous slowing down, um, from the same tables; interpolated in the logarithms. */
gboolean aw_range_water(AwParticle particle, double energy_mev, double *range_um, GError **error);

/**
 * Energy left after `depth_um` of water. AW_ERROR_RANGE when the particle stops, naming where, or leaves the table.
 */
gboolean aw_slow_down_water(AwParticle particle, double energy_mev, double depth_um, double *left_mev, GError **error);

/* v/c and momentum times v/c (MeV) at a kinetic energy. */
double aw_particle_beta(AwParticle particle, double energy_mev);
double aw_particle_p_beta_mev(AwParticle particle, double energy_mev);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BEAM_LAYERS_H
#define AW_BEAM_LAYERS_H

#include "beam/material.h"
#include "beam/stopping.h"

/* One sheet between the vacuum and the nucleus, in beam order. */
typedef struct {
  char *name;
  double thickness_um;
  AwMaterial material;
} AwLayer;

typedef enum { AW_CORE_GAUSSIAN, AW_CORE_DISC } AwCoreShape;

/* The beam and what it passes (docs/formats.md, "Beam files"). */
typedef struct {
  AwParticle particle;
  double energy_mev; /* before the first layer */
  AwCoreShape shape;
  double sigma_x_um, sigma_y_um; /* Gaussian core; 0 when left to the knife edge */
  double diameter_um;            /* disc core */
  double halo_frac;              /* part of the particles in the halo */
  double halo_diameter_um;       /* uniform disc of the halo; 0 without one */
  gboolean halo_entered;         /* FALSE: the halo is assumed to be absent */
  GPtrArray *layers;             /* AwLayer */
} AwBeamFile;

/**
 * Reads a beam file: [beam] particle, energy-mev, shape, ..., then [layer.1], [layer.2] ... in beam order with name,
 * thickness-um, density-g-cm3 and composition. Errors name file, group, key, value and limit.
 */
AwBeamFile *aw_beam_file_read(const char *path, GError **error);
AwBeamFile *aw_beam_file_parse(const char *bytes, gsize n_bytes, const char *name, GError **error);
void aw_beam_file_free(AwBeamFile *file);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwBeamFile, aw_beam_file_free)

/* The beam where it meets the nucleus: the far side of the last layer. */
typedef struct {
  double energy_mev;
  double let_kev_per_um; /* in water, density 1 */
  double scatter_um;     /* rms displacement per axis by scattering in the layers */
  double scatter_rad;    /* rms angle per axis */
  double range_left_um;  /* in water, behind the last layer */
} AwBeamAtNucleus;

/**
 * Slows the particle down through the layers (as water of equal stopping) and adds their scattering by Highland's
 * formula: one angle for the whole stack, shared by radiation length, each share thrown over its own distance.
 * AW_ERROR_RANGE names the layer in which the particle stops or leaves the table.
 */
gboolean aw_beam_at_nucleus(const AwBeamFile *file, AwBeamAtNucleus *at, GError **error);

#endif

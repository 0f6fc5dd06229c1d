/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_POPULATION_H
#define AW_NUCLEI_POPULATION_H

#include "nuclei/truth.h"

/**
 * An invented population of adherent cells, as true geometry for core/nuclei/render. The sizes are common practice
 * (nuclei of adherent cells are 10 to 20 um across); the rest is invented.
 */
typedef struct {
  AwScanPoint from, to;      /* the rectangle whose every corner may hold nuclei; from below to in x and y */
  int n_nuclei;              /* interphase and mitotic; a late mitosis counts as two */
  double clump_frac;         /* part of the nuclei that lies against another one */
  double mitotic_frac;       /* part of the nuclei that is a mitotic figure */
  double debris_per_nucleus; /* specks and fragments of dead cells */
  double gap_um;             /* nuclei that are not laid against another keep at least this distance */
  double patchy_frac;        /* 0: even; to 1: bare places and crowded ones */
  double light_e;            /* photoelectrons of a nucleus before its DNA doubles */
  guint64 seed;
} AwPopulationPlan;

/**
 * aw_population_new: AwTruth in the order they were laid down; gaps are measured up to 30 um.
 *
 * DNA content is 1 (55 %), 2 (25 %) or between, and light follows it with a spread of 7 %; every twentieth
 * interphase nucleus has taken up only about half the stain. The same plan gives the
 * same population. AW_ERROR_RANGE when the rectangle is too small for so many nuclei: it says how many found room.
 */
GPtrArray *aw_population_new(const AwPopulationPlan *plan, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BEAM_BUDGET_H
#define AW_BEAM_BUDGET_H

#include "beam/bead.h"
#include "geometry/registration.h"

/* One draw for the whole run, or a fresh one at every target (docs/geometry.md). */
typedef enum { AW_TERM_DISH, AW_TERM_TARGET } AwTermKind;

/* The sources of aim error. */
typedef enum {
  AW_TERM_SCALE,        /* pixel map; grows with the distance from the frame's centre */
  AW_TERM_RELOCATION,   /* scan stage to beam stage; grows away from the marks */
  AW_TERM_OFFSET,       /* where the beam is against the crosshair */
  AW_TERM_DRIFT,        /* of the beam since its last check */
  AW_TERM_OUTLINE,      /* outlines that are too far to one side throughout */
  AW_TERM_LOCALISATION, /* of a nucleus in its picture, with the scan stage's reading */
  AW_TERM_STAGE,        /* repeatability of the beam stage */
  AW_TERM_MOVEMENT,     /* of the cell since the scan */
  AW_N_TERMS
} AwTermId;

/* "pixel-scale", "relocation", "offset", "drift", "outline", "localisation", "stage", "movement". */
const char *aw_term_name(AwTermId id);
gboolean aw_term_parse(const char *name, AwTermId *id, GError **error);
AwTermKind aw_term_kind(AwTermId id);

/* What an entered number of that term means: "um per axis", "um per mm from the frame's centre", ... */
const char *aw_term_unit(AwTermId id);

typedef struct {
  AwTermId id;
  AwOrigin origin;
  double sx_um, sy_um; /* rms per axis */
  double share;        /* of the total variance, 0 ... 1 */
} AwBudgetTerm;

typedef struct {
  AwBudgetTerm term[AW_N_TERMS]; /* by id */
  double dish_sx_um, dish_sy_um; /* rms per axis of the dish-wide terms together */
  double target_sx_um, target_sy_um;
  double sx_um, sy_um;            /* all */
  double scan_age_s, check_age_s; /* as given; NaN unknown */
} AwBudget;

/* What is known. A term that nothing is known of is assumed (docs/methods-calibration.md), never zero. */
typedef struct {
  gboolean is_entered[AW_N_TERMS];   /* entered numbers win over fits */
  double entered[AW_N_TERMS];        /* in aw_term_unit, 0 or above */
  AwMatrix um_per_px;                /* A */
  const AwMatrix *map_covariance;    /* of a row of A, (um/px)2; NULL unknown */
  const AwRegistration *relocation;  /* NULL unknown */
  const AwMatrix *offset_covariance; /* um2; NULL unknown */
  double drift_um2_per_h;            /* random walk; NaN unknown */
  double localisation_um;            /* per axis, from the scan's overlaps; NaN unknown */
  double scan_age_s, check_age_s;    /* NaN unknown: an hour and four hours are assumed; below 0: later */
} AwBudgetInput;

typedef struct {
  AwScanPoint q;
  AwPixelPoint from_centre; /* p - c in its frame */
} AwBudgetTarget;

/* The budget at one target. */
void aw_budget_for_target(const AwBudgetInput *input, const AwBudgetTarget *target, AwBudget *budget);

/* The budget at the target with the median total; without targets at the frame's centre and the marks' centroid. */
void aw_budget_for_dish(const AwBudgetInput *input, const AwBudgetTarget *targets, gsize n, AwBudget *budget);

#endif

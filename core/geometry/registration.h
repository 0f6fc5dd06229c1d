/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_GEOMETRY_REGISTRATION_H
#define AW_GEOMETRY_REGISTRATION_H

#include <glib.h>

#include "base/point.h"
#include "geometry/pixelmap.h"

/* What the relocation T from scan to beam stage may do. */
typedef enum { AW_FIT_RIGID, AW_FIT_SIMILARITY, AW_FIT_AFFINE } AwFitKind;

/* "rigid", "similarity" or "affine". */
const char *aw_fit_kind_name(AwFitKind kind);
gboolean aw_fit_kind_parse(const char *name, AwFitKind *kind, GError **error);

/* The fitted parameters of a kind: 3, 4 or 6. */
int aw_fit_kind_n_parameters(AwFitKind kind);

/* One mark read on both stages. */
typedef struct {
  AwScanPoint scan;
  AwBeamPoint beam;
} AwMarkPair;

/**
 * AwRegistration: b = m q + t with what its fit knows about its own error.
 *
 * localisation_um is the rms error per axis of reading one mark, both stages together: estimated from the residuals
 * (origin fitted, then widened for the few degrees of freedom) or entered.
 */
typedef struct {
  AwFitKind kind;
  AwMatrix m;
  double tx_um, ty_um;
  gboolean mirrored;      /* m has a negative determinant */
  gsize n;                /* marks */
  int n_free;             /* degrees of freedom 2 n - parameters */
  double rss_um2;         /* residual sum of squares over both axes */
  double rms_um;          /* radial rms residual */
  double localisation_um; /* per axis */
  AwOrigin localisation_origin;
  double widening;      /* 95 % quantile of Student's t over the normal one; 1 when the error was entered */
  AwScanPoint centroid; /* of the marks on the scan stage */
  AwMatrix scatter;     /* sum of (q - centroid)(q - centroid)' over the marks, um2 */
} AwRegistration;

/**
 * aw_registration_fit: least squares over n pairs (Umeyama 1991 for rigid and similarity; normal equations for affine).
 *
 * mirrored: rigid and similarity only; asks for the best map that mirrors. localisation_um > 0 is the entered error
 * per axis; 0 takes it from the residuals, which needs degrees of freedom. AW_ERROR_RANGE: fewer than 3 marks, marks on
 * one line or one spot, no degrees of freedom without an entered error.
 */
gboolean aw_registration_fit(const AwMarkPair *pairs, gsize n, AwFitKind kind, gboolean mirrored,
                             double localisation_um, AwRegistration *registration, GError **error);

AwBeamPoint aw_registration_apply(const AwRegistration *registration, AwScanPoint q);

/* The inverse map. */
AwScanPoint aw_registration_invert(const AwRegistration *registration, AwBeamPoint b);

/* b - T(q) of one pair. */
AwBeamPoint aw_registration_residual(const AwRegistration *registration, const AwMarkPair *pair);

/**
 * Expected mean square target error at q over the mean square localisation error (both per axis or both radial):
 * rigid (1/N)(1 + r2/2F2), similarity (1/N)(1 + r2/F2), affine 1/N + r'S^-1 r, r from the marks' centroid and
 * F2 = mean |r|2 of the marks (after Fitzpatrick, West & Maurer 1998, IEEE Trans. Med. Imaging 17:694).
 */
double aw_registration_error_ratio(const AwRegistration *registration, AwScanPoint q);

/* Covariance of the target error at q in beam um2, without widening. */
AwMatrix aw_registration_error_covariance(const AwRegistration *registration, AwScanPoint q);

/* Expected rms target error per axis at q, um, without widening. */
double aw_registration_error_um(const AwRegistration *registration, AwScanPoint q);

/* Standard errors of angle (rad) and scale (plain number); 0 where the kind does not fit them. Affine gives both NaN.
 */
void aw_registration_standard_errors(const AwRegistration *registration, double *angle_rad, double *scale);

/* Mean scale (square root of |det m|) and rotation of the x axis, rad. */
double aw_registration_scale(const AwRegistration *registration);
double aw_registration_angle_rad(const AwRegistration *registration);

/* What a second look at the marks found. */
typedef struct {
  gboolean mirror_fits_better; /* the mirrored map leaves far smaller residuals: an axis sign is wrong */
  gssize suspect, partner; /* index of a mark that does not fit the others; partner when two look swapped; else -1 */
  double p_value;          /* probability of such a misfit by chance, for the number of marks looked at */
} AwMarkCheck;

/**
 * aw_registration_check: looks for a wrong axis sign (any n) and, from five marks on, for two swapped marks or one
 * that belongs elsewhere (F test of the residuals with and without it, Bonferroni for the choices).
 */
void aw_registration_check(const AwMarkPair *pairs, gsize n, AwFitKind kind, const AwRegistration *fitted,
                           AwMarkCheck *check);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/registration.h"

#include <gsl/gsl_cdf.h>
#include <string.h>

#include "base/error.h"

/* Marks count as lying on one line when their spread across it is below this part of the spread along it. */
#define MIN_SPREAD_RATIO 1e-3
#define NORMAL_95 1.959963984540054

static const char *const kind_names[] = { "rigid", "similarity", "affine" };

const char *aw_fit_kind_name(AwFitKind kind)
{
  return kind_names[kind];
}

gboolean aw_fit_kind_parse(const char *name, AwFitKind *kind, GError **error)
{
  for (int i = 0; i <= AW_FIT_AFFINE; i++)
    if (strcmp(name, kind_names[i]) == 0) {
      *kind = (AwFitKind)i;
      return TRUE;
    }
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "there is no fit \"%s\"; rigid, similarity and affine are known",
              name);
  return FALSE;
}

int aw_fit_kind_n_parameters(AwFitKind kind)
{
  return kind == AW_FIT_RIGID ? 3 : kind == AW_FIT_SIMILARITY ? 4 : 6;
}

/* Sums over the centred pairs. */
typedef struct {
  AwScanPoint q; /* centroids */
  AwBeamPoint b;
  AwMatrix s; /* sum q q' */
  AwMatrix c; /* sum b q' */
} Moments;

static Moments moments_of(const AwMarkPair *pairs, gsize n)
{
  Moments m = { 0 };
  for (gsize i = 0; i < n; i++) {
    m.q.x_um += pairs[i].scan.x_um / (double)n;
    m.q.y_um += pairs[i].scan.y_um / (double)n;
    m.b.bx_um += pairs[i].beam.bx_um / (double)n;
    m.b.by_um += pairs[i].beam.by_um / (double)n;
  }
  for (gsize i = 0; i < n; i++) {
    double x = pairs[i].scan.x_um - m.q.x_um, y = pairs[i].scan.y_um - m.q.y_um;
    double u = pairs[i].beam.bx_um - m.b.bx_um, v = pairs[i].beam.by_um - m.b.by_um;
    m.s = (AwMatrix){ m.s.xx + x * x, m.s.xy + x * y, m.s.yx + x * y, m.s.yy + y * y };
    m.c = (AwMatrix){ m.c.xx + u * x, m.c.xy + u * y, m.c.yx + v * x, m.c.yy + v * y };
  }
  return m;
}

/* Closed form in two dimensions: the rotation angle that maximises the trace of R' C (Umeyama 1991). */
static AwMatrix turn(const Moments *m, AwFitKind kind, gboolean mirrored)
{
  double sign = mirrored ? -1 : 1; /* a mirrored map is a rotation after x -> -x */
  double a = sign * m->c.xx + m->c.yy, b = sign * m->c.yx - m->c.xy;
  double norm = hypot(a, b);
  double scale = kind == AW_FIT_RIGID ? 1 : norm / (m->s.xx + m->s.yy);
  double c = norm > 0 ? a / norm * scale : scale, s = norm > 0 ? b / norm * scale : 0;
  return (AwMatrix){ sign * c, -s, sign * s, c };
}

static double smaller_eigenvalue(AwMatrix s)
{
  double half = (s.xx + s.yy) / 2;
  return half - hypot((s.xx - s.yy) / 2, s.xy);
}

static gboolean check_marks(const Moments *m, gsize n, GError **error)
{
  if (n < 3) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%" G_GSIZE_FORMAT " marks are too few; a relocation needs at least 3",
                n);
    return FALSE;
  }
  double spread = m->s.xx + m->s.yy;
  if (spread > 0 && smaller_eigenvalue(m->s) > MIN_SPREAD_RATIO * MIN_SPREAD_RATIO * spread)
    return TRUE;
  g_set_error_literal(error, AW_ERROR, AW_ERROR_RANGE,
                      spread > 0 ? "the marks lie on one line; a relocation needs marks spread over the dish"
                                 : "the marks lie on one spot; a relocation needs marks spread over the dish");
  return FALSE;
}

static double residual_sum(const AwRegistration *r, const AwMarkPair *pairs, gsize n)
{
  double sum = 0;
  for (gsize i = 0; i < n; i++) {
    AwBeamPoint e = aw_registration_residual(r, &pairs[i]);
    sum += e.bx_um * e.bx_um + e.by_um * e.by_um;
  }
  return sum;
}

/* Fits without judging the error; the marks have been checked. */
static void fit_map(const AwMarkPair *pairs, gsize n, AwFitKind kind, gboolean mirrored, AwRegistration *r)
{
  Moments m = moments_of(pairs, n);
  *r = (AwRegistration){ .kind = kind, .n = n, .centroid = m.q, .scatter = m.s };
  r->m = kind == AW_FIT_AFFINE ? aw_matrix_multiply(m.c, aw_matrix_inverse(m.s)) : turn(&m, kind, mirrored);
  r->tx_um = m.b.bx_um - r->m.xx * m.q.x_um - r->m.xy * m.q.y_um;
  r->ty_um = m.b.by_um - r->m.yx * m.q.x_um - r->m.yy * m.q.y_um;
  r->mirrored = aw_matrix_det(r->m) < 0;
  r->n_free = 2 * (int)n - aw_fit_kind_n_parameters(kind);
  r->rss_um2 = residual_sum(r, pairs, n);
  r->rms_um = sqrt(r->rss_um2 / (double)n);
}

gboolean aw_registration_fit(const AwMarkPair *pairs, gsize n, AwFitKind kind, gboolean mirrored,
                             double localisation_um, AwRegistration *r, GError **error)
{
  Moments m = moments_of(pairs, n);
  if (!check_marks(&m, n, error))
    return FALSE;
  fit_map(pairs, n, kind, mirrored, r);
  r->widening = 1;
  if (localisation_um > 0) {
    r->localisation_um = localisation_um;
    r->localisation_origin = AW_ORIGIN_ENTERED;
    return TRUE;
  }
  if (r->n_free < 1) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "%" G_GSIZE_FORMAT
                " marks fit any %s map exactly and prove nothing; enter a localisation error or read more marks",
                n, aw_fit_kind_name(kind));
    return FALSE;
  }
  r->localisation_um = sqrt(r->rss_um2 / r->n_free);
  r->localisation_origin = AW_ORIGIN_FITTED;
  r->widening = gsl_cdf_tdist_Pinv(0.975, r->n_free) / NORMAL_95;
  return TRUE;
}

AwBeamPoint aw_registration_apply(const AwRegistration *r, AwScanPoint q)
{
  return (AwBeamPoint){ r->m.xx * q.x_um + r->m.xy * q.y_um + r->tx_um,
                        r->m.yx * q.x_um + r->m.yy * q.y_um + r->ty_um };
}

AwScanPoint aw_registration_invert(const AwRegistration *r, AwBeamPoint b)
{
  AwMatrix inv = aw_matrix_inverse(r->m);
  double u = b.bx_um - r->tx_um, v = b.by_um - r->ty_um;
  return (AwScanPoint){ inv.xx * u + inv.xy * v, inv.yx * u + inv.yy * v };
}

AwBeamPoint aw_registration_residual(const AwRegistration *r, const AwMarkPair *pair)
{
  AwBeamPoint b = aw_registration_apply(r, pair->scan);
  return (AwBeamPoint){ pair->beam.bx_um - b.bx_um, pair->beam.by_um - b.by_um };
}

double aw_registration_error_ratio(const AwRegistration *r, AwScanPoint q)
{
  AwMatrix c = aw_registration_error_covariance(r, q);
  return (c.xx + c.yy) / (2 * r->localisation_um * r->localisation_um);
}

/* A rotation error moves the target across its radius, a scale error along it; an affine one depends on the scatter. */
AwMatrix aw_registration_error_covariance(const AwRegistration *r, AwScanPoint q)
{
  double x = q.x_um - r->centroid.x_um, y = q.y_um - r->centroid.y_um;
  double var = r->localisation_um * r->localisation_um, base = 1.0 / (double)r->n;
  double spread = r->scatter.xx + r->scatter.yy;
  if (r->kind == AW_FIT_AFFINE) {
    AwMatrix inv = aw_matrix_inverse(r->scatter);
    double ratio = base + x * x * inv.xx + x * y * (inv.xy + inv.yx) + y * y * inv.yy;
    return (AwMatrix){ var * ratio, 0, 0, var * ratio };
  }
  if (r->kind == AW_FIT_SIMILARITY) {
    double ratio = base + (x * x + y * y) / spread;
    return (AwMatrix){ var * ratio, 0, 0, var * ratio };
  }
  double u = r->m.xx * x + r->m.xy * y, v = r->m.yx * x + r->m.yy * y;
  return (AwMatrix){ var * (base + v * v / spread), -var * u * v / spread, -var * u * v / spread,
                     var * (base + u * u / spread) };
}

double aw_registration_error_um(const AwRegistration *r, AwScanPoint q)
{
  AwMatrix c = aw_registration_error_covariance(r, q);
  return sqrt((c.xx + c.yy) / 2);
}

void aw_registration_standard_errors(const AwRegistration *r, double *angle_rad, double *scale)
{
  double spread = r->scatter.xx + r->scatter.yy;
  double error = r->localisation_um / sqrt(spread);
  *angle_rad = r->kind == AW_FIT_AFFINE ? NAN : error / aw_registration_scale(r);
  *scale = r->kind == AW_FIT_AFFINE ? NAN : r->kind == AW_FIT_SIMILARITY ? error : 0;
}

double aw_registration_scale(const AwRegistration *r)
{
  return sqrt(fabs(aw_matrix_det(r->m)));
}

double aw_registration_angle_rad(const AwRegistration *r)
{
  return r->mirrored ? atan2(-r->m.yx, -r->m.xx) : atan2(r->m.yx, r->m.xx);
}

/* Tests whether `smaller` with `lost` fewer degrees of freedom is too small a part of `rss` for chance, times
 * `choices`. */
static double improvement_p(double rss, int n_free, double smaller, int lost, double choices)
{
  int left = n_free - lost;
  if (left < 1 || rss <= 0)
    return 1;
  double f = (rss - smaller) / lost / (fmax(smaller, 1e-12 * rss) / left);
  return fmin(1, choices * gsl_cdf_fdist_Q(fmax(f, 0), lost, left));
}

static void try_swaps(AwMarkPair *pairs, gsize n, AwFitKind kind, const AwRegistration *fitted, AwMarkCheck *check)
{
  double choices = (double)(n * (n - 1)) / 2;
  for (gsize i = 0; i < n; i++)
    for (gsize k = i + 1; k < n; k++) {
      AwRegistration r;
      AwBeamPoint kept = pairs[i].beam;
      pairs[i].beam = pairs[k].beam;
      pairs[k].beam = kept;
      fit_map(pairs, n, kind, fitted->mirrored, &r);
      pairs[k].beam = pairs[i].beam;
      pairs[i].beam = kept;
      double p = improvement_p(fitted->rss_um2, fitted->n_free, r.rss_um2, 2, choices);
      if (p < check->p_value)
        *check = (AwMarkCheck){ check->mirror_fits_better, (gssize)i, (gssize)k, p };
    }
}

static void try_without(const AwMarkPair *pairs, gsize n, AwFitKind kind, const AwRegistration *fitted,
                        AwMarkCheck *check)
{
  g_autofree AwMarkPair *rest = g_new(AwMarkPair, n);
  for (gsize i = 0; i < n; i++) {
    AwRegistration r;
    memcpy(rest, pairs, i * sizeof *rest);
    memcpy(rest + i, pairs + i + 1, (n - i - 1) * sizeof *rest);
    Moments m = moments_of(rest, n - 1);
    if (!check_marks(&m, n - 1, NULL))
      continue;
    fit_map(rest, n - 1, kind, fitted->mirrored, &r);
    double p = improvement_p(fitted->rss_um2, fitted->n_free, r.rss_um2, 2, (double)n);
    if (p < check->p_value)
      *check = (AwMarkCheck){ check->mirror_fits_better, (gssize)i, -1, p };
  }
}

void aw_registration_check(const AwMarkPair *pairs, gsize n, AwFitKind kind, const AwRegistration *fitted,
                           AwMarkCheck *check)
{
  static const double suspect_p = 0.01;
  *check = (AwMarkCheck){ FALSE, -1, -1, 1 };
  if (kind != AW_FIT_AFFINE) {
    AwRegistration other;
    fit_map(pairs, n, kind, !fitted->mirrored, &other);
    check->mirror_fits_better = other.rss_um2 < 0.01 * fitted->rss_um2;
  }
  if (n < 5 || check->mirror_fits_better)
    return;
  g_autofree AwMarkPair *copy = g_memdup2(pairs, n * sizeof *pairs);
  try_without(pairs, n, kind, fitted, check);
  try_swaps(copy, n, kind, fitted, check);
  if (check->p_value >= suspect_p)
    *check = (AwMarkCheck){ check->mirror_fits_better, -1, -1, check->p_value };
}

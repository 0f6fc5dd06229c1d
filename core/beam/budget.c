/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "beam/budget.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/error.h"

#define ASSUMED_SCAN_AGE_S 3600.0
#define ASSUMED_CHECK_AGE_S (4 * 3600.0)

/* The assumptions stand in for what nobody measured: large enough to be worth a measurement. */
static const struct {
  const char *name;
  AwTermKind kind;
  double assumed;
  const char *unit;
} terms[AW_N_TERMS] = {
  { "pixel-scale", AW_TERM_DISH, 2, "um per mm from the frame's centre" },
  { "relocation", AW_TERM_DISH, 2, "um" },
  { "offset", AW_TERM_DISH, 1, "um" },
  { "drift", AW_TERM_DISH, 0.3, "um after one hour" },
  { "outline", AW_TERM_DISH, 0.2, "um" },
  { "localisation", AW_TERM_TARGET, 0.3, "um" },
  { "stage", AW_TERM_TARGET, 0.5, "um" },
  { "movement", AW_TERM_TARGET, 1, "um after one hour" },
};

const char *aw_term_name(AwTermId id)
{
  return terms[id].name;
}

AwTermKind aw_term_kind(AwTermId id)
{
  return terms[id].kind;
}

const char *aw_term_unit(AwTermId id)
{
  return terms[id].unit;
}

gboolean aw_term_parse(const char *name, AwTermId *id, GError **error)
{
  g_autoptr(GString) known = g_string_new(NULL);
  for (int i = 0; i < AW_N_TERMS; i++) {
    if (strcmp(name, terms[i].name) == 0) {
      *id = (AwTermId)i;
      return TRUE;
    }
    g_string_append_printf(known, "%s%s", i ? ", " : "", terms[i].name);
  }
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "the aim-error budget has no term \"%s\"; it has %s", name,
              known->str);
  return FALSE;
}

static AwBudgetTerm make_term(AwTermId id, AwOrigin origin, double var_x, double var_y)
{
  return (AwBudgetTerm){ id, origin, sqrt(var_x), sqrt(var_y), 0 };
}

/* Distance from the frame's centre in mm, or the square root of the hours passed, or 1: what a number grows with. */
static double growth(const AwBudgetInput *in, const AwBudgetTarget *t, AwTermId id)
{
  if (id == AW_TERM_SCALE) {
    double dx = in->um_per_px.xx * t->from_centre.x_px + in->um_per_px.xy * t->from_centre.y_px;
    double dy = in->um_per_px.yx * t->from_centre.x_px + in->um_per_px.yy * t->from_centre.y_px;
    return hypot(dx, dy) / 1000;
  }
  double scan_s = isnan(in->scan_age_s) ? ASSUMED_SCAN_AGE_S : fabs(in->scan_age_s);
  double check_s = isnan(in->check_age_s) ? ASSUMED_CHECK_AGE_S : fabs(in->check_age_s);
  return id == AW_TERM_DRIFT ? sqrt(check_s / 3600) : id == AW_TERM_MOVEMENT ? sqrt(scan_s / 3600) : 1;
}

/* TRUE when a measurement gives the term. */
static gboolean fitted_term(const AwBudgetInput *in, const AwBudgetTarget *t, AwTermId id, AwBudgetTerm *term)
{
  double x = t->from_centre.x_px, y = t->from_centre.y_px;
  const AwMatrix *c = id == AW_TERM_OFFSET ? in->offset_covariance : in->map_covariance;
  if ((id == AW_TERM_SCALE || id == AW_TERM_OFFSET) && (!c || !isfinite(c->xx) || !isfinite(c->yy)))
    return FALSE;
  if (id == AW_TERM_SCALE) {
    double var = c->xx * x * x + (c->xy + c->yx) * x * y + c->yy * y * y;
    *term = make_term(id, AW_ORIGIN_FITTED, var, var);
  } else if (id == AW_TERM_OFFSET) {
    *term = make_term(id, AW_ORIGIN_FITTED, c->xx, c->yy);
  } else if (id == AW_TERM_RELOCATION && in->relocation) {
    AwMatrix e = aw_registration_error_covariance(in->relocation, t->q);
    double widened = in->relocation->widening * in->relocation->widening;
    *term = make_term(id, in->relocation->localisation_origin, widened * e.xx, widened * e.yy);
  } else if (id == AW_TERM_DRIFT && isfinite(in->drift_um2_per_h)) {
    double var = in->drift_um2_per_h * pow(growth(in, t, id), 2);
    *term = make_term(id, AW_ORIGIN_FITTED, var, var);
  } else if (id == AW_TERM_LOCALISATION && isfinite(in->localisation_um)) {
    double var = in->localisation_um * in->localisation_um;
    *term = make_term(id, AW_ORIGIN_FITTED, var, var);
  } else {
    return FALSE;
  }
  return TRUE;
}

static void total(AwBudget *b)
{
  double x[2] = { 0 }, y[2] = { 0 };
  for (int i = 0; i < AW_N_TERMS; i++) {
    x[terms[i].kind] += b->term[i].sx_um * b->term[i].sx_um;
    y[terms[i].kind] += b->term[i].sy_um * b->term[i].sy_um;
  }
  double all = x[0] + x[1] + y[0] + y[1];
  for (int i = 0; i < AW_N_TERMS; i++) {
    double own = b->term[i].sx_um * b->term[i].sx_um + b->term[i].sy_um * b->term[i].sy_um;
    b->term[i].share = all > 0 ? own / all : 0;
  }
  b->dish_sx_um = sqrt(x[AW_TERM_DISH]);
  b->dish_sy_um = sqrt(y[AW_TERM_DISH]);
  b->target_sx_um = sqrt(x[AW_TERM_TARGET]);
  b->target_sy_um = sqrt(y[AW_TERM_TARGET]);
  b->sx_um = sqrt(x[0] + x[1]);
  b->sy_um = sqrt(y[0] + y[1]);
}

void aw_budget_for_target(const AwBudgetInput *input, const AwBudgetTarget *target, AwBudget *budget)
{
  *budget = (AwBudget){ .scan_age_s = input->scan_age_s, .check_age_s = input->check_age_s };
  for (int i = 0; i < AW_N_TERMS; i++) {
    AwTermId id = (AwTermId)i;
    if (!input->is_entered[i] && fitted_term(input, target, id, &budget->term[i]))
      continue;
    double each = input->is_entered[i] ? input->entered[i] : terms[i].assumed;
    double var = pow(each * growth(input, target, id), 2);
    budget->term[i] = make_term(id, input->is_entered[i] ? AW_ORIGIN_ENTERED : AW_ORIGIN_ASSUMED, var, var);
  }
  total(budget);
}

typedef struct {
  double variance;
  gsize i;
} Ranked;

static int compare_ranked(const void *a, const void *b)
{
  const Ranked *x = a, *y = b;
  if (x->variance != y->variance)
    return x->variance > y->variance ? 1 : -1;
  return (x->i > y->i) - (x->i < y->i);
}

void aw_budget_for_dish(const AwBudgetInput *input, const AwBudgetTarget *targets, gsize n, AwBudget *budget)
{
  if (n == 0) {
    AwBudgetTarget middle = { input->relocation ? input->relocation->centroid : (AwScanPoint){ 0, 0 }, { 0, 0 } };
    aw_budget_for_target(input, &middle, budget);
    return;
  }
  g_autofree Ranked *ranked = g_new(Ranked, n);
  for (gsize i = 0; i < n; i++) {
    aw_budget_for_target(input, &targets[i], budget);
    ranked[i] = (Ranked){ budget->sx_um * budget->sx_um + budget->sy_um * budget->sy_um, i };
  }
  qsort(ranked, n, sizeof *ranked, compare_ranked);
  aw_budget_for_target(input, &targets[ranked[(n - 1) / 2].i], budget);
}

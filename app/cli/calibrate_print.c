/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "base/text.h"
#include "cli/calibrate_parts.h"
#include "cli/cli.h"
#include "cli/text.h"

#define DEGREES (180 / G_PI)

/* "LABEL  VALUE +- SE UNIT"; a NaN error says so. */
static void print_estimate(const char *label, double value, double se, int decimals, const char *unit)
{
  g_autofree char *text = cli_number(value, decimals), *error = cli_number(se, decimals);
  cli_print("%-13s %s +- %s %s\n", label, text, error, unit);
}

static void print_point(const char *label, double x, double y, int decimals, const char *rest)
{
  g_autofree char *across = cli_number(x, decimals), *up = cli_number(y, decimals);
  cli_print("%-13s (%s, %s) %s\n", label, across, up, rest);
}

void cli_print_pixel(const AwPixelSummary *s, const char *dish)
{
  const AwMarkMap *m = &s->fit;
  g_autofree char *rms = cli_number(m->map.rms_um, 3), *sx = cli_number(m->scale_x, 5), *sy = cli_number(m->scale_y, 5);
  cli_print("Pixel map from one mark at %" G_GSIZE_FORMAT " readings\n", m->n);
  print_estimate("Scale", m->scale, m->scale_se, 5, "um per pixel");
  cli_print("%-13s %s um per pixel along the rows, %s along the columns\n", "", sx, sy);
  print_estimate("Rotation", m->angle_rad * DEGREES, m->angle_se * DEGREES, 3, "degrees");
  print_estimate("Shear", m->shear_rad * DEGREES, m->shear_se * DEGREES, 3, "degrees");
  cli_print("%-13s %s\n", "Axes", s->words[0] ? s->words : m->mirrored ? "mirrored" : "as the camera's, none flipped");
  cli_print("%-13s %s um rms per axis, %d degrees of freedom\n", "Residual", rms, m->n_free);
  for (guint i = 0; i < s->views->len; i++) {
    const AwMarkView *views = (const AwMarkView *)(const void *)s->views->data;
    AwScanPoint r = aw_mark_map_residual(m, views, s->views->len, i);
    g_autofree char *label = g_strdup_printf("  view %u", i + 1);
    print_point(label, r.x_um, r.y_um, 3, "um");
  }
  if (m->n_free == 0)
    cli_print("Three readings fit any map exactly and prove nothing; take more.\n");
  if (s->segmented)
    cli_print("The nuclei rest on another pixel map: segment again to use this one (aimwell segment %s).\n", dish);
}

static void print_suspect(const AwMarksSummary *s)
{
  if (s->pairs->len < 5) {
    cli_print("%-13s not looked for with fewer than five marks\n", "Wrong pairs");
  } else if (s->check.suspect < 0) {
    cli_print("%-13s none stands out\n", "Wrong pairs");
  } else {
    g_autofree char *p = cli_number(s->check.p_value, 4);
    const char *one = s->names->pdata[s->check.suspect];
    if (s->check.partner >= 0)
      cli_print("%-13s marks %s and %s look exchanged (probability by chance %s)\n", "Wrong pairs", one,
                (const char *)s->names->pdata[s->check.partner], p);
    else
      cli_print("%-13s mark %s does not fit the others (probability by chance %s)\n", "Wrong pairs", one, p);
  }
}

static void print_map(const AwRegistration *r, const char *from)
{
  g_autofree char *scale = cli_number(aw_registration_scale(r), 6), *rms = cli_number(r->rms_um, 3);
  g_autofree char *angle = cli_number(aw_registration_angle_rad(r) * DEGREES, 4);
  cli_print("Relocation from %" G_GSIZE_FORMAT " %s, %s%s\n", r->n, from, r->mirrored ? "mirrored " : "",
            aw_fit_kind_name(r->kind));
  cli_print("%-13s scale %s, rotation %s degrees\n", "Map", scale, angle);
  print_point("Shift", r->tx_um, r->ty_um, 2, "um");
  cli_print("%-13s %s um rms radial, %d degrees of freedom\n", "Residual", rms, r->n_free);
}

static void print_target_error(const AwMarksSummary *s)
{
  if (isfinite(s->min_um)) {
    g_autofree char *min = cli_number(s->min_um, 3), *median = cli_number(s->median_um, 3);
    g_autofree char *max = cli_number(s->max_um, 3);
    cli_print("%-13s %s least, %s median, %s most, um rms per axis at the %u nuclei\n", "Target error", min, median,
              max, s->places->len);
  }
  cli_print("Small residuals are no proof of accuracy at a target.\n");
}

void cli_print_marks(const AwMarksSummary *s)
{
  const AwRegistration *r = &s->fit;
  g_autofree char *localisation = cli_number(r->localisation_um, 3), *widening = cli_number(r->widening, 2);
  print_map(r, "marks");
  for (guint i = 0; i < s->pairs->len; i++) {
    AwBeamPoint e = aw_registration_residual(r, &g_array_index(s->pairs, AwMarkPair, i));
    g_autofree char *label = g_strdup_printf("  %s", (const char *)s->names->pdata[i]);
    print_point(label, e.bx_um, e.by_um, 3, "um");
  }
  cli_print("%-13s %s um per axis (%s); intervals widened %s times for few marks\n", "Localisation", localisation,
            aw_origin_name(r->localisation_origin), widening);
  print_suspect(s);
  print_target_error(s);
}

void cli_print_fields(const AwFieldsSummary *s)
{
  const AwMatch *m = &s->match;
  g_autofree char *moved = cli_number(m->movement_um, 2), *se = cli_number(m->movement_se_um, 2);
  cli_print("%u nuclei in %u fields; %" G_GSIZE_FORMAT " have a partner among the scan's, %u of them surely\n",
            s->n_nuclei, s->n_fields, m->n_matched, s->marks.pairs->len);
  cli_print("%-13s %s\n", "Match", m->note);
  cli_print("%-13s %s\n", "Camera", s->camera_words);
  print_map(&s->marks.fit, "nuclei");
  cli_print("%-13s %s +- %s um rms per axis since the scan, localisation included\n", "Movement", moved, se);
  if (s->hours > 0) {
    g_autofree char *hours = cli_number(s->hours, 2), *hourly = cli_number(m->movement_um / sqrt(s->hours), 2);
    cli_print("%-13s in %s h; as a random walk, %s um after one hour (calibrate ... error --term movement)\n", "",
              hours, hourly);
  }
  print_target_error(&s->marks);
}

static void print_edge_notes(const AwEdgeFit *f)
{
  static const struct {
    guint note;
    const char *text;
  } notes[] = {
    { AW_EDGE_REVERSED, "the positions do not rise; they were sorted" },
    { AW_EDGE_REPEATED, "a position stands more than once" },
    { AW_EDGE_COARSE, "fewer than three points on the slope: the width rests on the step between points" },
    { AW_EDGE_NOT_GAUSSIAN, "the profile is not Gaussian: a uniform disc fits far better; use the disc's diameter" },
    { AW_EDGE_POOR_FIT, "the counts scatter more than chance allows" },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(notes); i++)
    if (f->notes & notes[i].note)
      cli_print("%-13s %s\n", "Note", notes[i].text);
}

void cli_print_edge(const AwEdgeSummary *s, const AwEdgeScan *scan)
{
  const AwEdgeFit *f = &s->fit;
  cli_print("Knife edge in %c, %u points, %s\n", scan->axis, s->points->len,
            s->counts ? "binomial counts" : "transmitted fractions");
  print_estimate("Centre", f->centre_um.value, f->centre_um.se, 3, "um");
  print_estimate("Sigma", f->sigma_um.value, f->sigma_um.se, 3, "um");
  print_estimate("FWHM", f->fwhm_um.value, f->fwhm_um.se, 3, "um");
  print_estimate("10-90 %", f->w1090_um.value, f->w1090_um.se, 3, "um");
  print_estimate("16-84 %", f->w1684_um.value, f->w1684_um.se, 3, "um");
  if (scan->fit_plateaus) {
    print_estimate("Low plateau", f->low.value, f->low.se, 4, "");
    print_estimate("High plateau", f->high.value, f->high.se, 4, "");
  }
  g_autofree char *disc = cli_number(f->disc_diameter_um, 3), *p = cli_number(f->p_value, 3);
  cli_print("%-13s %s um across, as a uniform disc\n", "Disc", disc);
  if (s->counts)
    cli_print("%-13s p %s by chi square, %d degrees of freedom\n", "Fit", p, f->n_judged_free);
  if (!isnan(scan->crosshair_um))
    print_estimate("Offset", f->centre_um.value - scan->crosshair_um, f->centre_um.se, 3, "um");
  print_edge_notes(f);
}

void cli_print_bead(const AwBeadSummary *s)
{
  const AwBeadFit *f = &s->fit;
  const AwMatrix *c = &f->covariance_um2;
  g_autofree char *correlation = cli_number(c->xy / sqrt(c->xx * c->yy), 2), *p = cli_number(f->p_value, 3);
  cli_print("Bead scan, %u points, %s bump\n", s->points->len, f->elliptical ? "elliptical" : "round");
  print_estimate("Centre x", f->centre.bx_um, sqrt(c->xx), 3, "um");
  print_estimate("Centre y", f->centre.by_um, sqrt(c->yy), 3, "um");
  cli_print("%-13s %s between x and y\n", "Correlation", correlation);
  print_estimate("Sigma x", f->sigma_x.value, f->sigma_x.se, 3, "um, beam and bead together");
  print_estimate("Sigma y", f->sigma_y.value, f->sigma_y.se, 3, "um");
  cli_print("%-13s p %s by chi square, %d degrees of freedom\n", "Fit", p, f->n_judged_free);
  if (f->notes & AW_BEAD_POOR_FIT)
    cli_print("%-13s the counts scatter more than chance allows: is the bead round and alone?\n", "Note");
  if (f->notes & AW_BEAD_COARSE)
    cli_print("%-13s the bump is narrower than the steps of the grid; take finer ones\n", "Note");
  if (s->has_mark) {
    print_point("Bead's pixel", s->mark.at.x_px, s->mark.at.y_px, 2, "px");
    print_point("Crosshair", s->crosshair.bx_um, s->crosshair.by_um, 2, "um, reading that centres the bead");
  }
  if (!s->has_offset) {
    cli_print("No offset without the reading that puts the bead on the crosshair (--crosshair or --image).\n");
    return;
  }
  print_point("Offset", s->offset.x_um, s->offset.y_um, 3, "um, beam minus crosshair");
  if (isfinite(s->drift_um2_per_h)) {
    g_autofree char *drift = cli_number(sqrt(s->drift_um2_per_h), 3);
    cli_print("%-13s %s um per axis after one hour, from this and earlier checks\n", "Drift", drift);
  }
}

void cli_print_beam(const AwBeamAtNucleus *at)
{
  g_autofree char *energy = cli_number(at->energy_mev, 3), *let = cli_number(at->let_kev_per_um, 2);
  g_autofree char *scatter = cli_number(at->scatter_um, 3), *angle = cli_number(at->scatter_rad * 1000, 2);
  g_autofree char *range = cli_number(at->range_left_um, 1);
  cli_print("Beam at the nucleus\n%-13s %s MeV\n%-13s %s keV/um in water\n", "Energy", energy, "LET", let);
  cli_print("%-13s %s um rms per axis (angle %s mrad) by scattering in the layers\n", "Spread", scatter, angle);
  cli_print("%-13s %s um of water left\n", "Range", range);
}

static void print_age(const char *label, double age_s, const char *unknown)
{
  g_autofree char *hours = cli_number(fabs(age_s) / 3600, 1);
  const char *when = isnan(age_s) ? "" : age_s < 0 ? " h later than the time asked for; check the clocks" : " h ago";
  cli_print("%-13s %s%s\n", label, isnan(age_s) ? unknown : hours, when);
}

static void print_budget(const AwCalibrationView *view)
{
  const AwBudget *b = &view->budget;
  cli_print("\nAim error at the median of %" G_GSIZE_FORMAT " targets, um rms per axis\n", view->n_targets);
  cli_print("  %-13s %-11s %8s %8s %6s  %s\n", "term", "kind", "x", "y", "share", "origin");
  for (int i = 0; i < AW_N_TERMS; i++) {
    const AwBudgetTerm *t = &b->term[i];
    g_autofree char *x = cli_number(t->sx_um, 3), *y = cli_number(t->sy_um, 3), *share = cli_number(100 * t->share, 0);
    cli_print("  %-13s %-11s %8s %8s %4s %%  %s\n", aw_term_name(t->id),
              aw_term_kind(t->id) == AW_TERM_DISH ? "dish-wide" : "per target", x, y, share,
              t->origin == AW_ORIGIN_ASSUMED ? "ASSUMED" : aw_origin_name(t->origin));
  }
  const double sums[3][2] = { { b->dish_sx_um, b->dish_sy_um },
                              { b->target_sx_um, b->target_sy_um },
                              { b->sx_um, b->sy_um } };
  static const char *const names[] = { "dish-wide", "per target", "together" };
  for (int i = 0; i < 3; i++) {
    g_autofree char *x = cli_number(sums[i][0], 3), *y = cli_number(sums[i][1], 3);
    cli_print("  %-13s %-11s %8s %8s\n", names[i], "", x, y);
  }
  print_age("Scan", b->scan_age_s, "of unknown age; one hour is assumed");
  print_age("Beam check", b->check_age_s, "never; four hours are assumed");
}

void cli_print_calibrations(const AwCalibrationView *view)
{
  cli_print("%u calibrations; the newest of a kind counts\n", view->calibrations->len);
  for (guint i = 0; i < view->calibrations->len; i++) {
    const AwCalibration *c = view->calibrations->pdata[i];
    g_autofree char *at = aw_text_from_time(c->at_unix_s);
    gboolean counts = aw_calibration_newest(view->calibrations, c->kind) == c;
    cli_print("  %s  %-18s %s%s%s%s\n", at, c->kind, aw_origin_name(c->origin), c->source[0] ? " from " : "", c->source,
              counts ? "" : " (superseded)");
  }
  cli_print("%s\n", view->origin);
  print_budget(view);
}

static void json_terms(GString *json, const AwBudget *b)
{
  g_string_append(json, ", \"budget\": [");
  for (int i = 0; i < AW_N_TERMS; i++) {
    const AwBudgetTerm *t = &b->term[i];
    g_string_append(json, i ? ", {" : "{");
    cli_json_text(json, "term", aw_term_name(t->id));
    cli_json_text(json, "kind", aw_term_kind(t->id) == AW_TERM_DISH ? "dish-wide" : "per target");
    cli_json_text(json, "origin", aw_origin_name(t->origin));
    cli_json_number(json, "sx_um", t->sx_um);
    cli_json_number(json, "sy_um", t->sy_um);
    cli_json_number(json, "share_frac", t->share);
    g_string_append_c(json, '}');
  }
  g_string_append_c(json, ']');
}

void cli_print_calibrations_json(const AwCalibrationView *view)
{
  g_autoptr(GString) json = g_string_new("{\"calibrations\": [");
  for (guint i = 0; i < view->calibrations->len; i++) {
    const AwCalibration *c = view->calibrations->pdata[i];
    g_autofree char *at = aw_text_from_time(c->at_unix_s);
    g_string_append(json, i ? ", {" : "{");
    cli_json_text(json, "kind", c->kind);
    cli_json_text(json, "at", at);
    cli_json_text(json, "origin", aw_origin_name(c->origin));
    cli_json_text(json, "source", c->source);
    cli_json_text(json, "sha256", c->sha256);
    cli_json_text(json, "numbers", c->text);
    g_string_append_c(json, '}');
  }
  g_string_append_c(json, ']');
  json_terms(json, &view->budget);
  g_string_append(json, ", \"aim_error\": {");
  cli_json_number(json, "dish_sx_um", view->budget.dish_sx_um);
  cli_json_number(json, "dish_sy_um", view->budget.dish_sy_um);
  cli_json_number(json, "target_sx_um", view->budget.target_sx_um);
  cli_json_number(json, "target_sy_um", view->budget.target_sy_um);
  cli_json_number(json, "scan_age_s", view->budget.scan_age_s);
  cli_json_number(json, "check_age_s", view->budget.check_age_s);
  cli_print("%s}}\n", json->str);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "geometry/overlap.h"

#include <gsl/gsl_statistics_double.h>

#include "base/error.h"
#include "base/text.h"
#include "geometry/overlap_parts.h"

/* A map is believed when it gives this part of the views in its own overlaps a partner; by chance few would have one.
 */
#define MIN_EXPLAINED 0.3
#define MIN_POSSIBLE 8
#define MIN_ON_LINE 5
/* A shift of one pair of frames alone says something only beyond this evidence. */
#define STRONG_EVIDENCE 5

void aw_overlap_fit_clear(AwOverlapFit *fit)
{
  g_clear_pointer(&fit->note, g_free);
}

static char *matrix_text(AwMatrix a)
{
  g_autofree char *xx = aw_text_from_double(a.xx, 5), *xy = aw_text_from_double(a.xy, 5);
  g_autofree char *yx = aw_text_from_double(a.yx, 5), *yy = aw_text_from_double(a.yy, 5);
  return g_strdup_printf("%s, %s, %s, %s", xx, xy, yx, yy);
}

static gsize count_frame_pairs(const GArray *pairs)
{
  gsize n = 0;
  for (guint i = 0; i < pairs->len; i++) {
    const AwOverlapPair *p = &g_array_index(pairs, AwOverlapPair, i);
    n += i == 0 || p->a != p[-1].a || p->b != p[-1].b;
  }
  return n;
}

/* TRUE when in every direction that should show enough shared views a fair part of them found their partners. */
static gboolean is_explained(const GArray *pairs, const gsize *possible)
{
  gsize matched[AW_OVERLAP_SECTORS] = { 0 }, n_directions = 0;
  for (guint i = 0; i < pairs->len; i++) {
    const AwOverlapPair *p = &g_array_index(pairs, AwOverlapPair, i);
    matched[aw_overlap_sector(p->sx, p->sy)]++;
  }
  for (int k = 0; k < AW_OVERLAP_SECTORS; k++) {
    if (possible[k] < MIN_POSSIBLE)
      continue;
    if ((double)matched[k] < MIN_EXPLAINED * (double)possible[k])
      return FALSE;
    n_directions++;
  }
  return n_directions > 0;
}

/* Matches and solves twice, the second time closer; FALSE when A stays undetermined or explains too little. */
static gboolean refine(const AwOverlapFrame *frames, gsize n_frames, double mark_px, AwMatrix *a, AwOverlapFit *fit)
{
  gboolean explained = FALSE;
  for (int round = 0; round < 2; round++) {
    gsize possible[AW_OVERLAP_SECTORS];
    double tolerance_px = round == 0 ? MAX(4.0, 0.4 * mark_px) : MAX(3.0, 0.25 * mark_px);
    g_autoptr(GArray) pairs = aw_overlap_match(frames, n_frames, *a, tolerance_px, mark_px, possible);
    if (!aw_overlap_solve(pairs, a, &fit->map.rms_um))
      return FALSE;
    fit->n_marks = pairs->len;
    fit->n_frame_pairs = count_frame_pairs(pairs);
    explained = is_explained(pairs, possible);
  }
  return explained;
}

/* Largest distance by which the two maps part one mark seen at opposite edges of a frame, um. */
static double parting_um(const AwOverlapFrame *frames, gsize n_frames, AwMatrix a, AwMatrix b)
{
  double w = 0, h = 0;
  for (gsize f = 0; f < n_frames; f++) {
    w = MAX(w, frames[f].width_px);
    h = MAX(h, frames[f].height_px);
  }
  return MAX(w * hypot(a.xx - b.xx, a.yx - b.yx), h * hypot(a.xy - b.xy, a.yy - b.yy));
}

static gboolean refuse(const AwPixelMap *start, AwMatrix fitted, const AwOverlapFit *fit, GError **error)
{
  g_autofree char *difference = aw_overlap_name_difference(start->um_per_px, fitted);
  g_autofree char *was = matrix_text(start->um_per_px), *is = matrix_text(fitted);
  g_autofree char *rms = aw_text_from_double(fit->map.rms_um, 2);
  g_set_error(
      error, AW_ERROR, AW_ERROR_RANGE,
      "the overlaps of the frames contradict the %s pixel map (%s um per px): they fit when %s, that is with the "
      "pixel map %s um per px (%s um rms per axis over %" G_GSIZE_FORMAT " nuclei in %" G_GSIZE_FORMAT
      " pairs of frames)",
      aw_origin_name(start->origin), was, difference, is, rms, fit->n_marks, fit->n_frame_pairs);
  return FALSE;
}

static char *fitted_note(const AwOverlapFit *fit, const char *lead)
{
  AwMatrix a = fit->map.um_per_px;
  gboolean mirrored = aw_matrix_det(a) < 0;
  double sign = mirrored ? -1 : 1;
  g_autofree char *pixel = aw_text_from_double(aw_pixel_map_scale(&fit->map), 5);
  g_autofree char *turn = aw_text_from_double(atan2(a.yx - sign * a.xy, a.xx + sign * a.yy) * 180 / G_PI, 2);
  g_autofree char *rms = aw_text_from_double(fit->map.rms_um, 2);
  return g_strdup_printf("%s %" G_GSIZE_FORMAT " nuclei seen in %" G_GSIZE_FORMAT
                         " pairs of frames: pixel %s um, camera turned by %s degrees%s, %s um rms per axis",
                         lead, fit->n_marks, fit->n_frame_pairs, pixel, turn, mirrored ? " and mirrored" : "", rms);
}

/* What the whole fit works on. */
typedef struct {
  const AwOverlapFrame *frames;
  gsize n_frames;
  const AwPixelMap *start;
  AwOverlapMode mode;
  double mark_px;
} Job;

/* The overlaps have spoken: take their map, keep the caller's, or refuse. */
static gboolean judge(const Job *job, AwMatrix fitted, AwOverlapFit *fit, GError **error)
{
  AwMatrix start = job->start->um_per_px;
  if (job->mode == AW_OVERLAP_FIT) {
    if (!aw_overlap_is_near(start, fitted))
      return refuse(job->start, fitted, fit, error);
    fit->map.um_per_px = fitted;
    fit->map.origin = AW_ORIGIN_FITTED;
    fit->note = fitted_note(fit, "fitted to");
    return TRUE;
  }
  double limit = 0.5 * job->mark_px * aw_pixel_map_scale(job->start);
  if (parting_um(job->frames, job->n_frames, start, fitted) > limit)
    return refuse(job->start, fitted, fit, error);
  AwOverlapFit own = *fit;
  own.map.um_per_px = fitted;
  fit->note = fitted_note(&own, "kept as entered; it agrees with");
  fit->map = *job->start;
  return TRUE;
}

/* Median of the factors (complex numbers) that take the start map's moves to the stage's, over strong shifts. */
static gsize common_factor(const GArray *shifts, AwMatrix a, double *scale, double *turn)
{
  g_autofree double *scales = g_new(double, shifts->len + 1);
  g_autofree double *turns = g_new(double, shifts->len + 1);
  gsize n = 0;
  for (guint i = 0; i < shifts->len; i++) {
    AwOverlapShift s = g_array_index(shifts, AwOverlapShift, i);
    double x = a.xx * s.dx + a.xy * s.dy, y = a.yx * s.dx + a.yy * s.dy;
    if (s.evidence < STRONG_EVIDENCE)
      continue;
    scales[n] = hypot(s.sx, s.sy) / hypot(x, y);
    /* Angles near half a turn either way are one direction, so the cut lies at a quarter turn. */
    double angle = atan2(x * s.sy - y * s.sx, x * s.sx + y * s.sy);
    turns[n++] = angle < -G_PI_2 ? angle + 2 * G_PI : angle;
  }
  *scale = n ? gsl_stats_median(scales, 1, n) : 1;
  *turn = n ? gsl_stats_median(turns, 1, n) : 0;
  return n;
}

static gboolean refuse_line(const Job *job, AwMatrix along, gsize n, GError **error)
{
  g_autofree char *difference = aw_overlap_name_difference(job->start->um_per_px, along);
  g_autofree char *was = matrix_text(job->start->um_per_px);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "the overlaps of the frames contradict the %s pixel map (%s um per px): along the one line of the stage "
              "readings they fit when %s (%" G_GSIZE_FORMAT " nuclei seen in two frames)",
              aw_origin_name(job->start->origin), was, difference, n);
  return FALSE;
}

/* Readings on one line: A cannot be fitted, but a wrong sign or pixel size along the line still shows. */
static gboolean check_line(const Job *job, const GArray *shifts, AwOverlapFit *fit, GError **error)
{
  double scale = 1, turn = 0;
  AwMatrix a = job->start->um_per_px;
  gsize possible[AW_OVERLAP_SECTORS];
  gsize n = common_factor(shifts, a, &scale, &turn);
  AwMatrix z = { scale * cos(turn), -scale * sin(turn), scale * sin(turn), scale * cos(turn) };
  AwMatrix along = aw_matrix_multiply(z, a);
  g_autoptr(GArray) pairs =
      aw_overlap_match(job->frames, job->n_frames, along, MAX(4.0, 0.4 * job->mark_px), job->mark_px, possible);
  const char *origin = aw_origin_name(job->start->origin);
  if (n == 0 || pairs->len < MIN_ON_LINE || !is_explained(pairs, possible)) {
    fit->note = g_strdup_printf("%s: too few nuclei are seen in two frames to fit it", origin);
    return TRUE;
  }
  if (!aw_overlap_is_near(a, along))
    return refuse_line(job, along, pairs->len, error);
  fit->note =
      g_strdup_printf("%s: the stage readings of the overlapping frames lie on one line, which cannot fix it; %u "
                      "nuclei seen in two frames agree with it along that line",
                      origin, pairs->len);
  return TRUE;
}

static gboolean has_nothing_to_fit(const Job *job, AwOverlapFit *fit)
{
  if (job->n_frames >= 2 && job->mark_px > 0)
    return FALSE;
  fit->note = g_strdup_printf("%s: %s", aw_origin_name(job->start->origin),
                              job->n_frames < 2 ? "one frame has no overlaps to fit it" : "no nucleus to fit it with");
  return TRUE;
}

/* The caller's map speaks first: only when it leaves the overlaps unexplained are other ones sought. */
gboolean aw_overlap_fit(const AwOverlapFrame *frames, gsize n_frames, const AwPixelMap *start, AwOverlapMode mode,
                        AwOverlapFit *fit, GError **error)
{
  g_return_val_if_fail(start && fit && fabs(aw_matrix_det(start->um_per_px)) > 0, FALSE);
  Job job = { frames, n_frames, start, mode, aw_overlap_mark_px(frames, n_frames) };
  *fit = (AwOverlapFit){ .map = *start };
  if (has_nothing_to_fit(&job, fit))
    return TRUE;
  AwMatrix a = start->um_per_px;
  if (refine(frames, n_frames, job.mark_px, &a, fit))
    return judge(&job, a, fit, error);
  g_autoptr(GArray) shifts = aw_overlap_shifts(frames, n_frames, start->um_per_px, job.mark_px);
  const AwOverlapShift *shift = (const AwOverlapShift *)(const void *)shifts->data;
  if (aw_overlap_consensus(shift, shifts->len, MAX(6.0, 0.3 * job.mark_px), &a) &&
      refine(frames, n_frames, job.mark_px, &a, fit))
    return judge(&job, a, fit, error);
  *fit = (AwOverlapFit){ .map = *start };
  return check_line(&job, shifts, fit, error);
}

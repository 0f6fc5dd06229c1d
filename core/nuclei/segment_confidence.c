/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/limits.h"
#include "nuclei/segment_work.h"

static void object_features(const AwSegmentWork *w, const AwObject *o, double f[AW_N_OBJECT_FEATURES])
{
  double height = MAX(o->plateau - o->background, 1e-30), r = w->scale.radius_px, n = MAX(o->n_edge, 1);
  double radius = sqrt(o->n_px / G_PI), outer = radius + w->rules->ring_to * r,
         inner = radius + w->rules->ring_from * r;
  double mean = o->slope / n, spread = sqrt(MAX(o->slope_square / n - mean * mean, 0));
  f[0] = o->convexity;
  f[1] = aw_moments_ellipse(&o->shape);
  f[2] = log(o->n_px / (G_PI * r * r));
  f[3] = log(aw_moments_elongation(&o->shape));
  f[4] = log(height / w->scale.height);
  f[5] = MIN(log(height / MAX(w->scale.noise, 1e-6 * height)), 4);
  f[6] = log(aw_object_edge_width(w, o));
  f[7] = mean > 0 ? spread / mean : 2;
  f[8] = o->neck;
  f[9] = CLAMP(o->split_odds, -8, 8);
  f[10] = CLAMP(o->merge_odds, -8, 8);
  f[11] = o->n_touching / (o->n_touching + n);
  f[12] = o->n_ring / (G_PI * (outer * outer - inner * inner));
  f[13] = o->ring_spread / height;
  f[14] = (o->n_edge + o->n_touching) / sqrt(o->n_px);
  f[15] = (o->cut - o->background) / height;
}

/* Shapes and sizes beyond all that the fit has seen lose certainty the farther they lie outside. */
static double beyond_known(const double f[AW_N_OBJECT_FEATURES])
{
  return 2 * MAX(f[2] - log(6), 0) + 4 * MAX(f[3] - log(3.5), 0);
}

static double logistic(double odds)
{
  return 1 / (1 + exp(-odds));
}

static void judge(const AwSegmentWork *w, guint32 k)
{
  AwObject *o = aw_segment_object(w, k);
  double f[AW_N_OBJECT_FEATURES];
  object_features(w, o, f);
  o->confidence = logistic(aw_object_odds(f) - beyond_known(f));
}

AwSegmentInfo *aw_segment_infos(AwSegmentWork *w, GError **error)
{
  guint32 n = w->labels->n_labels;
  double disc = G_PI * w->scale.radius_px * w->scale.radius_px;
  /* Who asks for more splitting wants the pieces, doubtful or not. */
  double doubtful = w->rules->debris_confidence * (1 - MAX(w->settings->splitting, 0));
  g_autofree guint8 *drop = g_new0(guint8, (gsize)n + 1);
  aw_segment_edges(w);
  for (guint32 k = 1; k <= n; k++) {
    const AwObject *o = aw_segment_object(w, k);
    drop[k] = o->n_px == 0;
    if (drop[k])
      continue;
    judge(w, k);
    drop[k] = !(w->probe && w->probe->object) && o->confidence < doubtful && o->n_px < w->rules->debris_area * disc;
  }
  aw_segment_renumber(w, drop);
  n = w->labels->n_labels;
  AwSegmentInfo *info = aw_try_alloc((gsize)n + 1, sizeof *info, "the nuclei's notes", error);
  for (guint32 k = 1; info && k <= n; k++) {
    const AwObject *o = aw_segment_object(w, k);
    double f[AW_N_OBJECT_FEATURES], height = o->plateau - o->background;
    if (w->probe && w->probe->object) {
      object_features(w, o, f);
      w->probe->object(f, k, w->probe->data);
    }
    info[k] = (AwSegmentInfo){ o->confidence, height / MAX(w->scale.noise, 1e-6 * height), o->neck };
  }
  return info;
}

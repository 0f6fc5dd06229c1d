/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_ROUTE_H
#define AW_STEPS_ROUTE_H

#include "plan/tour.h"
#include "steps/common.h"

/* How the tour is asked for; coordinates are in the frame of the points routed. */
typedef struct {
  gboolean closed;
  const AwStop *from, *to; /* places where the stage starts and must end, or NULL */
  gint64 n_steps;          /* -1: default */
  double budget_s;         /* 0: by steps */
  guint64 seed;
} AwRouteSettings;

/* Lengths in um. */
typedef struct {
  gsize n;
  double unsorted, nearest, two_opt, final;
  gint64 n_steps;
} AwRouteSummary;

/* Orders the accepted nuclei of a dish and stores the tour. AW_ERROR_EMPTY when nothing is accepted. */
gboolean aw_step_route(const char *path, const AwRouteSettings *settings, const AwStepContext *context,
                       AwRouteSummary *summary, GError **error);

/* Orders the points of a CSV (x_um, y_um) and writes them with an `order` column. Warns of points on one spot. */
gboolean aw_step_route_points(const char *points, const char *out, const AwRouteSettings *settings,
                              const AwStepContext *context, AwRouteSummary *summary, GError **error);

#endif

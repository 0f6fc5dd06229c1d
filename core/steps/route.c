/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/route.h"

#include "base/error.h"
#include "base/text.h"
#include "plan/points.h"

static AwTourSettings tour_settings(const AwRouteSettings *s)
{
  return (AwTourSettings){ .closed = s->closed,
                           .first = -1,
                           .last = -1,
                           .from = s->from,
                           .to = s->to,
                           .n_steps = s->n_steps,
                           .budget_s = s->budget_s,
                           .seed = s->seed };
}

static AwRouteSummary summarise(const AwTour *tour)
{
  return (AwRouteSummary){ tour->n, tour->unsorted, tour->nearest, tour->two_opt, tour->final, tour->n_steps_used };
}

/* The accepted nuclei as stops, ids beside. */
static GArray *accepted_stops(AwRecord *record, GArray **ids, GError **error)
{
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(record, FALSE, error);
  g_autofree AwState *states = nuclei ? aw_step_states(record, nuclei, error) : NULL;
  if (!states)
    return NULL;
  g_autoptr(GArray) stops = g_array_new(FALSE, FALSE, sizeof(AwStop));
  *ids = g_array_new(FALSE, FALSE, sizeof(gint64));
  gsize n_proposed = 0;
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *nucleus = nuclei->pdata[i];
    n_proposed += states[i] == AW_STATE_PROPOSED;
    if (states[i] != AW_STATE_ACCEPTED)
      continue;
    AwStop stop = { nucleus->centroid.x_um, nucleus->centroid.y_um };
    g_array_append_val(stops, stop);
    g_array_append_val(*ids, nucleus->id);
  }
  if (stops->len)
    return g_steal_pointer(&stops);
  g_clear_pointer(ids, g_array_unref);
  g_set_error(error, AW_ERROR, AW_ERROR_EMPTY,
              "%s has no target: of %u nuclei none is accepted and %" G_GSIZE_FORMAT
              " are proposed; accept some first (aimwell choose %s --accept proposed)",
              aw_record_path(record), nuclei->len, n_proposed, aw_record_path(record));
  return NULL;
}

static gboolean store_tour(AwRecord *record, const AwTour *tour, const GArray *ids, const AwRouteSettings *settings,
                           GError **error)
{
  g_autofree gint64 *ordered = g_new(gint64, tour->n);
  for (gsize i = 0; i < tour->n; i++)
    ordered[i] = g_array_index(ids, gint64, tour->order[i]);
  g_autofree char *budget = aw_text_from_double(settings->budget_s, 3);
  g_autofree char *how = settings->budget_s > 0 ? g_strdup_printf("searched for %s s, not repeatable", budget)
                                                : g_strdup_printf("%" G_GINT64_FORMAT " steps, seed %" G_GUINT64_FORMAT,
                                                                  tour->n_steps_used, settings->seed);
  return aw_record_set_tour(record, ordered, tour->n, error) &&
         aw_record_set_fact_double(record, AW_FACT_TOUR_UM, tour->final, error) &&
         aw_record_set_fact(record, AW_FACT_TOUR_HOW, how, error);
}

gboolean aw_step_route(const char *path, const AwRouteSettings *settings, const AwStepContext *context,
                       AwRouteSummary *summary, GError **error)
{
  g_autoptr(AwRecord) record = aw_step_open(path, context, error);
  g_autoptr(GArray) ids = NULL;
  g_autoptr(GArray) stops = record ? accepted_stops(record, &ids, error) : NULL;
  if (!stops)
    return FALSE;
  AwTourSettings how = tour_settings(settings);
  g_autoptr(AwTour) tour =
      aw_tour_find((const AwStop *)(const void *)stops->data, stops->len, &how, context->progress, error);
  if (!tour || !store_tour(record, tour, ids, settings, error))
    return FALSE;
  *summary = summarise(tour);
  g_autofree char *length = aw_text_from_double(tour->final, 0);
  g_autofree char *action = g_strdup_printf("ordered %" G_GSIZE_FORMAT " targets, %s um of travel", tour->n, length);
  return aw_record_commit(record, action, error);
}

gboolean aw_step_route_points(const char *points, const char *out, const AwRouteSettings *settings,
                              const AwStepContext *context, AwRouteSummary *summary, GError **error)
{
  g_autoptr(AwPoints) table = aw_points_read(points, error);
  if (!table)
    return FALSE;
  AwTourSettings how = tour_settings(settings);
  g_autoptr(AwTour) tour = aw_tour_find(aw_points_stops(table), aw_points_n(table), &how, context->progress, error);
  if (!tour)
    return FALSE;
  aw_points_warn_duplicates(table, context->warnings);
  *summary = summarise(tour);
  return aw_points_write(table, tour->order, out, error);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/view.h"

#include "plan/cautions.h"
#include "steps/common.h"

void aw_dish_view_free(AwDishView *view)
{
  if (!view)
    return;
  g_free(view->name);
  g_free(view->summary);
  g_clear_pointer(&view->frames, g_ptr_array_unref);
  g_clear_pointer(&view->nuclei, g_ptr_array_unref);
  g_free(view->state);
  g_clear_pointer(&view->tour, g_array_unref);
  g_clear_pointer(&view->notes, g_ptr_array_unref);
  g_free(view);
}

static char *summarise(const AwDishView *view)
{
  gsize n[4] = { 0 };
  for (guint i = 0; i < view->nuclei->len; i++)
    n[view->state[i]]++;
  return g_strdup_printf(
      "%u frames, %u nuclei: %" G_GSIZE_FORMAT " accepted, %" G_GSIZE_FORMAT " proposed, %" G_GSIZE_FORMAT " rejected",
      view->frames->len, view->nuclei->len, n[AW_STATE_ACCEPTED], n[AW_STATE_PROPOSED], n[AW_STATE_REJECTED]);
}

static GPtrArray *collect_notes(const AwDishView *view, char *map_note)
{
  GPtrArray *notes = g_ptr_array_new_with_free_func(g_free);
  g_ptr_array_add(notes, map_note ? g_strdup_printf("Pixel map (%s): %s", aw_origin_name(view->map.origin), map_note)
                                  : g_strdup("Pixel map: assumed; segment the dish to fit it"));
  g_free(map_note);
  if (aw_cautions[0])
    g_ptr_array_add(notes, g_strdup(aw_cautions[0]));
  g_ptr_array_add(notes, NULL);
  return notes;
}

AwDishView *aw_step_view(const char *path, GError **error)
{
  GError *failure = NULL;
  g_autoptr(AwRecord) record = aw_record_open(path, AW_RECORD_READ, error);
  if (!record)
    return NULL;
  g_autoptr(AwDishView) view = g_new0(AwDishView, 1);
  view->name = aw_step_name(record);
  if (!aw_record_read_begin(record, error) || !(view->frames = aw_record_frames(record, error)) ||
      !aw_record_pixel_map(record, &view->map, error) || !(view->nuclei = aw_record_nuclei(record, TRUE, error)) ||
      !(view->state = aw_step_states(record, view->nuclei, error)) || !(view->tour = aw_record_tour(record, error)))
    return NULL;
  char *map_note = aw_record_fact(record, AW_FACT_MAP_NOTE, &failure);
  if (failure) {
    g_propagate_error(error, failure);
    return NULL;
  }
  view->summary = summarise(view);
  view->notes = collect_notes(view, map_note);
  return g_steal_pointer(&view);
}

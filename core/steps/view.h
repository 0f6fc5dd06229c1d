/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_VIEW_H
#define AW_STEPS_VIEW_H

#include "record/record.h"

/* All that a picture of a dish needs, read in one go. */
typedef struct {
  char *name, *summary;
  GPtrArray *frames; /* AwFrame */
  AwPixelMap map;
  GPtrArray *nuclei; /* AwNucleus with shapes */
  AwState *state;    /* one per nucleus */
  GArray *tour;      /* gint64 nucleus ids */
  GPtrArray *notes;  /* char *, NULL-terminated: pixel map, first caution */
} AwDishView;

void aw_dish_view_free(AwDishView *view);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwDishView, aw_dish_view_free)

AwDishView *aw_step_view(const char *path, GError **error);

#endif

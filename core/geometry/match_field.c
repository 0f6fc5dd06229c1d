/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <gsl/gsl_statistics_double.h>

#include "base/error.h"
#include "base/text.h"
#include "geometry/match_parts.h"

/*
 * The field answers one question very often: does a place lie near one of its points? A raster of bits, a third of the
 * tolerance to the cell, holds the answer. Neighbours of every point are listed once, so that all pairs of a given
 * length are found by bisection.
 */
#define N_NEAR 8
#define LEAST_SPACING_UM 1e-3
/* Tolerance as part of the spacing: a chance hit in one of eight places, yet wide for movement and a seed's error. */
#define TOLERANCE_FRAC 0.2
#define MOVEMENTS 2.7
#define REACH_SPACINGS 5.2
#define CELLS_PER_TOLERANCE 3
#define MAX_CELLS ((double)(1 << 29))

double *aw_spot_density(const AwGrid *grid, const AwSpot *spots, gsize n)
{
  double *density = g_new(double, n + 1);
  for (gsize i = 0; i < n; i++) {
    AwGridHit hits[N_NEAR + 1];
    gsize k = aw_grid_nearest(grid, spots[i].x, spots[i].y, N_NEAR + 1, hits);
    double d = MAX(hits[k - 1].distance, LEAST_SPACING_UM);
    density[i] = (double)(k - 1) / (G_PI * d * d);
  }
  return density;
}

static double median_spacing(const double *density, gsize n)
{
  g_autofree double *sorted = g_memdup2(density, n * sizeof *density);
  double middle = gsl_stats_median(sorted, 1, n);
  return 1 / sqrt(middle);
}

static void list_neighbours(AwField *field)
{
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  g_autoptr(GArray) all = g_array_new(FALSE, FALSE, sizeof(AwSpotNear));
  field->near_first = g_new0(gsize, field->n + 1);
  for (gsize i = 0; i < field->n; i++) {
    aw_grid_within(field->grid, field->spots[i].x, field->spots[i].y, field->reach_um, hits);
    for (guint k = 0; k < hits->len; k++) {
      const AwGridHit *hit = &g_array_index(hits, AwGridHit, k);
      AwSpotNear near = { (float)hit->distance, (guint32)hit->index };
      if (hit->index != i)
        g_array_append_val(all, near);
    }
    field->near_first[i + 1] = all->len;
  }
  field->near = (AwSpotNear *)(void *)g_array_free(g_steal_pointer(&all), FALSE);
}

static void set_row(AwField *field, double y, double x_low, double x_high)
{
  gsize row = (gsize)((y - field->y0) / field->cell_um);
  gsize first = (gsize)MAX(0, ceil((x_low - field->x0) / field->cell_um - 0.5));
  gsize last = (gsize)MAX(0, floor((x_high - field->x0) / field->cell_um - 0.5));
  for (gsize u = first; u <= last && u < field->columns; u++) {
    gsize bit = row * field->columns + u;
    field->bits[bit >> 6] |= G_GUINT64_CONSTANT(1) << (bit & 63);
  }
}

static void draw_disc(AwField *field, AwSpot p)
{
  double r = field->tolerance_um;
  gsize first = (gsize)((p.y - r - field->y0) / field->cell_um);
  for (gsize row = first; row < field->rows; row++) {
    double y = field->y0 + ((double)row + 0.5) * field->cell_um, half = r * r - (y - p.y) * (y - p.y);
    if (y > p.y + r)
      break;
    if (half > 0)
      set_row(field, y, p.x - sqrt(half), p.x + sqrt(half));
  }
}

static gboolean draw_raster(AwField *field, const char *name, GError **error)
{
  double x1 = -G_MAXDOUBLE, y1 = -G_MAXDOUBLE, margin = 2 * field->tolerance_um;
  field->x0 = field->y0 = G_MAXDOUBLE;
  for (gsize i = 0; i < field->n; i++) {
    field->x0 = MIN(field->x0, field->spots[i].x - margin);
    field->y0 = MIN(field->y0, field->spots[i].y - margin);
    x1 = MAX(x1, field->spots[i].x + margin);
    y1 = MAX(y1, field->spots[i].y + margin);
  }
  field->cell_um = field->tolerance_um / CELLS_PER_TOLERANCE;
  double columns = ceil((x1 - field->x0) / field->cell_um), rows = ceil((y1 - field->y0) / field->cell_um);
  if (!(columns * rows < MAX_CELLS)) {
    g_autofree char *width = aw_text_from_double((x1 - field->x0) / 1000, 1);
    g_autofree char *spacing = aw_text_from_double(field->spacing_um, 1);
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                "The points of %s spread over %s mm at a typical spacing of %s um: too thin for matching; are their "
                "units right?",
                name, width, spacing);
    return FALSE;
  }
  field->columns = (gsize)columns;
  field->rows = (gsize)rows;
  field->bits = g_try_new0(guint64, field->columns * field->rows / 64 + 1);
  if (!field->bits) {
    g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "There is no memory for matching the points of %s.", name);
    return FALSE;
  }
  for (gsize i = 0; i < field->n; i++)
    draw_disc(field, field->spots[i]);
  return TRUE;
}

AwField *aw_field_new(const AwMatchPattern *pattern, AwSpot centre, double movement_um, GError **error)
{
  g_autoptr(AwField) field = g_new0(AwField, 1);
  field->n = pattern->n;
  field->spots = g_new(AwSpot, field->n);
  for (gsize i = 0; i < field->n; i++)
    field->spots[i] = (AwSpot){ pattern->xy_um[2 * i] - centre.x, pattern->xy_um[2 * i + 1] - centre.y };
  field->grid = aw_grid_new((const double *)(const void *)field->spots, field->n);
  field->density = aw_spot_density(field->grid, field->spots, field->n);
  field->spacing_um = median_spacing(field->density, field->n);
  if (!(field->spacing_um > LEAST_SPACING_UM)) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "Most points of %s lie on one spot; they cannot be matched.",
                pattern->name);
    return NULL;
  }
  field->tolerance_um = TOLERANCE_FRAC * field->spacing_um;
  if (movement_um > 0)
    field->tolerance_um = CLAMP(MOVEMENTS * movement_um, field->tolerance_um / 4, 2 * field->tolerance_um);
  field->reach_um = REACH_SPACINGS * field->spacing_um;
  if (!draw_raster(field, pattern->name, error))
    return NULL;
  list_neighbours(field);
  return g_steal_pointer(&field);
}

void aw_field_free(AwField *field)
{
  if (!field)
    return;
  g_clear_pointer(&field->grid, aw_grid_free);
  g_free(field->spots);
  g_free(field->density);
  g_free(field->near);
  g_free(field->near_first);
  g_free(field->bits);
  g_free(field);
}

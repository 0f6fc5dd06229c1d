/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "support/pattern.h"

#define TRIES_PER_POINT 400

void aw_test_pattern_clear(AwTestPattern *pattern)
{
  g_clear_pointer(&pattern->xy_um, g_free);
  g_clear_pointer(&pattern->truth, g_free);
  pattern->n = 0;
}

/* Cells of side `least` that hold the points laid so far, so that a new one looks at its own neighbours only. */
typedef struct {
  double least_um, x0, y0;
  int side;
  GArray **cells; /* of gsize */
} Cells;

static Cells cells_new(double x0, double y0, double width, double least)
{
  Cells c = { MAX(least, width / 1000), x0, y0, 0, NULL };
  c.side = (int)(width / c.least_um) + 1;
  c.cells = g_new0(GArray *, (gsize)c.side * (gsize)c.side);
  return c;
}

static void cells_clear(Cells *c)
{
  for (gsize i = 0; i < (gsize)c->side * (gsize)c->side; i++)
    if (c->cells[i])
      g_array_unref(c->cells[i]);
  g_free(c->cells);
}

static int place(const Cells *c, double v)
{
  return CLAMP((int)floor(v / c->least_um), 0, c->side - 1);
}

static gboolean is_free(const Cells *c, const double *xy, double x, double y, double least)
{
  int cx = place(c, x - c->x0), cy = place(c, y - c->y0);
  for (int v = MAX(cy - 1, 0); v <= MIN(cy + 1, c->side - 1); v++)
    for (int u = MAX(cx - 1, 0); u <= MIN(cx + 1, c->side - 1); u++) {
      const GArray *cell = c->cells[(gsize)v * (gsize)c->side + (gsize)u];
      for (guint k = 0; cell && k < cell->len; k++) {
        gsize i = g_array_index(cell, gsize, k);
        if (hypot(xy[2 * i] - x, xy[2 * i + 1] - y) < least)
          return FALSE;
      }
    }
  return TRUE;
}

static void put(Cells *c, double *xy, gsize i, double x, double y)
{
  gsize at = (gsize)place(c, y - c->y0) * (gsize)c->side + (gsize)place(c, x - c->x0);
  if (!c->cells[at])
    c->cells[at] = g_array_new(FALSE, FALSE, sizeof(gsize));
  xy[2 * i] = x;
  xy[2 * i + 1] = y;
  g_array_append_val(c->cells[at], i);
}

/* Adds points i ... n-1 at random; after TRIES_PER_POINT failures a point may lie anywhere. */
static void scatter(AwRandom *random, Cells *c, double *xy, gsize i, gsize n, double width, double least)
{
  for (; i < n; i++) {
    double x = 0, y = 0;
    for (int k = 0; k < TRIES_PER_POINT; k++) {
      x = c->x0 + width * aw_random_unit(random);
      y = c->y0 + width * aw_random_unit(random);
      if (is_free(c, xy, x, y, least))
        break;
    }
    put(c, xy, i, x, y);
  }
}

AwTestPattern aw_test_dish(AwRandom *random, gsize n, double spacing_um, double least_um)
{
  double width = spacing_um * sqrt((double)n);
  AwTestPattern dish = { g_new0(double, 2 * n), n, NULL };
  Cells cells = cells_new(1000, -3000, width, least_um);
  scatter(random, &cells, dish.xy_um, 0, n, width, least_um);
  cells_clear(&cells);
  return dish;
}

AwTestChange aw_test_change(AwRandom *random, double least_um)
{
  AwTestChange change = { 0.3, 0.2, 3, least_um, 1, 0, 0, 0, FALSE };
  change.scale = 0.98 + 0.04 * aw_random_unit(random);
  change.angle_rad = 2 * G_PI * aw_random_unit(random);
  change.shift_x_um = 20000 * (aw_random_unit(random) - 0.5);
  change.shift_y_um = 20000 * (aw_random_unit(random) - 0.5);
  change.mirrored = aw_random_below(random, 2) == 1;
  return change;
}

static void apply(const AwTestChange *c, double x, double y, double *u, double *v)
{
  double yy = c->mirrored ? -y : y, cs = c->scale * cos(c->angle_rad), sn = c->scale * sin(c->angle_rad);
  *u = cs * x - sn * yy + c->shift_x_um;
  *v = sn * x + cs * yy + c->shift_y_um;
}

AwTestPattern aw_test_changed(AwRandom *random, const AwTestPattern *dish, const AwTestChange *change)
{
  gsize n_new = (gsize)(change->new_frac * (double)dish->n + 0.5), n = 0;
  AwTestPattern b = { g_new0(double, 2 * (dish->n + n_new)), 0, g_new0(gssize, dish->n + n_new) };
  double x0 = G_MAXDOUBLE, y0 = G_MAXDOUBLE, x1 = -G_MAXDOUBLE, y1 = -G_MAXDOUBLE;
  for (gsize i = 0; i < dish->n; i++) {
    x0 = MIN(x0, dish->xy_um[2 * i]);
    x1 = MAX(x1, dish->xy_um[2 * i]);
    y0 = MIN(y0, dish->xy_um[2 * i + 1]);
    y1 = MAX(y1, dish->xy_um[2 * i + 1]);
  }
  double width = MAX(x1 - x0, y1 - y0);
  Cells cells = cells_new(x0, y0, width, change->least_um);
  for (gsize i = 0; i < dish->n; i++)
    if (aw_random_unit(random) >= change->lost_frac) {
      b.truth[n] = (gssize)i;
      put(&cells, b.xy_um, n++, dish->xy_um[2 * i], dish->xy_um[2 * i + 1]);
    }
  for (gsize k = n; k < n + n_new; k++)
    b.truth[k] = -1;
  scatter(random, &cells, b.xy_um, n, n + n_new, width, change->least_um);
  cells_clear(&cells);
  b.n = n + n_new;
  for (gsize k = 0; k < b.n; k++) {
    double u, v;
    apply(change, b.xy_um[2 * k], b.xy_um[2 * k + 1], &u, &v);
    b.xy_um[2 * k] = u + (k < n ? change->movement_um * aw_random_normal(random) : 0);
    b.xy_um[2 * k + 1] = v + (k < n ? change->movement_um * aw_random_normal(random) : 0);
  }
  for (gsize k = b.n - 1; k > 0; k--) {
    gsize j = aw_random_below(random, (guint32)(k + 1));
    gssize t = b.truth[k];
    double x = b.xy_um[2 * k], y = b.xy_um[2 * k + 1];
    b.truth[k] = b.truth[j];
    b.xy_um[2 * k] = b.xy_um[2 * j];
    b.xy_um[2 * k + 1] = b.xy_um[2 * j + 1];
    b.truth[j] = t;
    b.xy_um[2 * j] = x;
    b.xy_um[2 * j + 1] = y;
  }
  return b;
}

void aw_test_score(const AwMatch *match, const AwTestPattern *b, AwTestScore *score)
{
  for (gsize j = 0; j < b->n; j++) {
    gssize partner = match->of_b[j].partner;
    gboolean right = partner >= 0 && partner == b->truth[j], high = partner >= 0 && match->of_b[j].confidence >= 0.95;
    score->n_true += b->truth[j] >= 0;
    score->n_found += right;
    score->n_wrong += partner >= 0 && !right;
    score->n_high += high;
    score->n_high_right += high && right;
  }
}

double aw_test_map_error(const AwMatch *match, const AwTestPattern *a, const AwTestChange *change)
{
  double worst = 0;
  for (gsize i = 0; i < a->n; i++) {
    double x = a->xy_um[2 * i], y = a->xy_um[2 * i + 1], u, v;
    apply(change, x, y, &u, &v);
    u -= match->m.xx * x + match->m.xy * y + match->shift_x_um;
    v -= match->m.yx * x + match->m.yy * y + match->shift_y_um;
    worst = MAX(worst, hypot(u, v));
  }
  return worst;
}

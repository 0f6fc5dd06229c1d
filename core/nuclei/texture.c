/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/texture.h"

#include "base/random.h"

#define N_GRIDS 2
#define MAX_NUCLEOLI 4

/* Standard deviation of white noise of unit variance after cubic B-spline interpolation in two dimensions. */
#define SPLINE_SD (151.0 / 315.0)

/* Fine clumps of chromatin and coarse shading; weights make the sum's variance 1. */
static const double spacing_um[N_GRIDS] = { 1.1, 3.2 };
static const double weight[N_GRIDS] = { 0.8, 0.6 };

typedef struct {
  int n_x, n_y;
  double *node; /* n_x x n_y normal deviates; the first stands at (x0_um, y0_um) */
} Grid;

typedef struct {
  double dx_um, dy_um, radius_um, depth_frac;
} Nucleolus;

struct AwTexture {
  double x0_um, y0_um; /* corner of the outline's extent from the centroid */
  double strength;
  Grid grid[N_GRIDS];
  int n_nucleoli;
  Nucleolus nucleolus[MAX_NUCLEOLI];
};

static Grid make_grid(double width_um, double height_um, double step_um, AwRandom random)
{
  Grid grid = { (int)ceil(width_um / step_um) + 4, (int)ceil(height_um / step_um) + 4, NULL };
  gsize n = (gsize)grid.n_x * (gsize)grid.n_y;
  grid.node = g_new(double, n);
  for (gsize i = 0; i < n; i++)
    grid.node[i] = aw_random_normal(&random);
  return grid;
}

static void place_nucleoli(AwTexture *texture, const AwTruth *truth, AwRandom random)
{
  double c = cos(truth->angle_rad), s = sin(truth->angle_rad);
  texture->n_nucleoli = 1 + (int)aw_random_below(&random, MAX_NUCLEOLI);
  for (int i = 0; i < texture->n_nucleoli; i++) {
    double r = 0.6 * sqrt(aw_random_unit(&random)), t = 2.0 * G_PI * aw_random_unit(&random);
    double u = r * cos(t) * truth->major_um / 2.0, v = r * sin(t) * truth->minor_um / 2.0;
    double radius = truth->minor_um * (0.05 + 0.06 * aw_random_unit(&random));
    texture->nucleolus[i] = (Nucleolus){ u * c - v * s, u * s + v * c, radius, 0.25 + 0.3 * aw_random_unit(&random) };
  }
}

AwTexture *aw_texture_new(const AwTruth *truth)
{
  double x0 = INFINITY, x1 = -INFINITY, y0 = INFINITY, y1 = -INFINITY;
  for (gsize i = 0; i < truth->n_outline; i++) {
    x0 = MIN(x0, truth->outline[i].x_um), x1 = MAX(x1, truth->outline[i].x_um);
    y0 = MIN(y0, truth->outline[i].y_um), y1 = MAX(y1, truth->outline[i].y_um);
  }
  AwTexture *texture = g_new0(AwTexture, 1);
  texture->x0_um = x0 - truth->centroid.x_um;
  texture->y0_um = y0 - truth->centroid.y_um;
  texture->strength = truth->texture_frac;
  for (int k = 0; k < N_GRIDS; k++)
    texture->grid[k] = make_grid(x1 - x0, y1 - y0, spacing_um[k], aw_random_stream(truth->seed, (guint64)k));
  if (truth->kind == AW_TRUTH_INTERPHASE)
    place_nucleoli(texture, truth, aw_random_stream(truth->seed, N_GRIDS));
  return texture;
}

void aw_texture_free(AwTexture *texture)
{
  if (!texture)
    return;
  for (int k = 0; k < N_GRIDS; k++)
    g_free(texture->grid[k].node);
  g_free(texture);
}

/* The four cubic B-spline weights at fraction f of a grid step. */
static void spline_weights(double f, double *w)
{
  double g = 1.0 - f;
  w[0] = g * g * g / 6.0;
  w[1] = (4.0 + 3.0 * f * f * (f - 2.0)) / 6.0;
  w[2] = (4.0 + 3.0 * g * g * (g - 2.0)) / 6.0;
  w[3] = f * f * f / 6.0;
}

/* (x, y) in grid steps from the first node's inner neighbour. */
static double grid_at(const Grid *grid, double x, double y)
{
  int ix = CLAMP((int)floor(x), 0, grid->n_x - 4), iy = CLAMP((int)floor(y), 0, grid->n_y - 4);
  double wx[4], wy[4], sum = 0.0;
  spline_weights(CLAMP(x - ix, 0.0, 1.0), wx);
  spline_weights(CLAMP(y - iy, 0.0, 1.0), wy);
  for (int j = 0; j < 4; j++) {
    const double *row = grid->node + (gsize)(iy + j) * (gsize)grid->n_x + ix;
    sum += wy[j] * (wx[0] * row[0] + wx[1] * row[1] + wx[2] * row[2] + wx[3] * row[3]);
  }
  return sum / SPLINE_SD;
}

double aw_texture_at(const AwTexture *texture, double dx_um, double dy_um)
{
  double field = 0.0, factor = 1.0;
  for (int k = 0; k < N_GRIDS; k++)
    field += weight[k] * grid_at(&texture->grid[k], (dx_um - texture->x0_um) / spacing_um[k],
                                 (dy_um - texture->y0_um) / spacing_um[k]);
  for (int i = 0; i < texture->n_nucleoli; i++) {
    const Nucleolus *n = texture->nucleolus + i;
    double x = (dx_um - n->dx_um) / n->radius_um, y = (dy_um - n->dy_um) / n->radius_um;
    factor *= 1.0 - n->depth_frac * exp(-0.5 * (x * x + y * y));
  }
  return factor * exp(texture->strength * field);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/render.h"

#include "base/limits.h"
#include "base/random.h"
#include "nuclei/patch.h"
#include "nuclei/texture.h"

#define REACH_SIGMA 4.0   /* blur and haze end here */
#define HAZE_STEP_PX 8    /* haze is so smooth that every eighth pixel will do, the rest is interpolated */
#define DOME_BLUR 0.45    /* sigma of the thickness profile over the radius of the circle of equal area */
#define POISSON_BY_SUM 30 /* electrons; above it shot noise is a normal deviate corrected for its skew */

/* What drawing some rows of one frame needs. */
typedef struct {
  const AwRenderView *view;
  const AwRenderCamera *camera;
  AwPixelPoint centre;
  double um_per_px;
  double px_per_um; /* an upper bound in any direction */
  int y0, y1;
  double *light; /* electrons per pixel of the rows, from objects alone */
  int haze_columns, haze_row0, haze_rows;
  double
      *haze; /* electrons per pixel at the haze nodes; row haze_row0 + j stands at y = HAZE_STEP_PX (haze_row0 + j) */
  AwPatch patch, dome;
} Board;

static AwPixelPoint to_pixel(const Board *board, AwScanPoint q)
{
  return aw_scan_to_pixel(&board->view->map, board->view->stage, board->centre, q);
}

AwPixelPoint *aw_render_outline(const AwTruth *truth, const AwRenderView *view)
{
  AwPixelPoint centre = aw_frame_centre(view->width_px, view->height_px);
  AwPixelPoint *outline = g_new(AwPixelPoint, truth->n_outline);
  for (gsize i = 0; i < truth->n_outline; i++)
    outline[i] = aw_scan_to_pixel(&view->map, view->stage, centre, truth->outline[i]);
  return outline;
}

static double object_blur_px(const Board *board, const AwTruth *truth)
{
  return hypot(board->camera->blur_px, truth->blur_um / board->um_per_px);
}

/* Whether an object around `p`, reaching `reach_px`, may show in the rows. */
static gboolean in_sight(const Board *board, AwPixelPoint p, double reach_px)
{
  return p.x_px + reach_px > -1.0 && p.x_px - reach_px < board->view->width_px && p.y_px + reach_px > board->y0 - 1.0 &&
         p.y_px - reach_px < board->y1;
}

/* Thickness: the blurred mask falls from the middle to the edge. dome_frac > 0 follows it, < 0 hollows the middle. */
static gboolean shade_dome(Board *board, const AwTruth *truth, const AwPixelPoint *outline, GError **error)
{
  if (!aw_patch_cover(&board->dome, outline, truth->n_outline, board->patch.rect, error))
    return FALSE;
  aw_patch_blur(&board->dome, DOME_BLUR * sqrt(truth->area_um2 / G_PI) / board->um_per_px);
  gsize n = (gsize)aw_patch_width(&board->patch) * (gsize)aw_patch_height(&board->patch);
  double top = 0.0, *value = board->patch.value, *thick = board->dome.value;
  for (gsize i = 0; i < n; i++)
    top = MAX(top, thick[i]);
  for (gsize i = 0; i < n; i++) {
    double rise = thick[i] / top;
    value[i] *= truth->dome_frac >= 0.0 ? 1.0 + truth->dome_frac * (rise - 1.0) : 1.0 + truth->dome_frac * rise * rise;
  }
  return TRUE;
}

static void shade_texture(Board *board, const AwTruth *truth)
{
  g_autoptr(AwTexture) texture = aw_texture_new(truth);
  AwPixelPoint at = to_pixel(board, truth->centroid);
  AwMatrix a = board->view->map.um_per_px;
  double *value = board->patch.value;
  for (int y = board->patch.rect.y0; y < board->patch.rect.y1; y++)
    for (int x = board->patch.rect.x0; x < board->patch.rect.x1; x++, value++)
      if (*value > 0.0) {
        double dx = x - at.x_px, dy = y - at.y_px;
        *value *= aw_texture_at(texture, -(a.xx * dx + a.xy * dy), -(a.yx * dx + a.yy * dy));
      }
}

static gboolean draw_object(Board *board, const AwTruth *truth, GError **error)
{
  double sigma = object_blur_px(board, truth), margin = REACH_SIGMA * sigma + 2.0;
  if (!in_sight(board, to_pixel(board, truth->centroid), truth->reach_um * board->px_per_um + margin))
    return TRUE;
  g_autofree AwPixelPoint *outline = aw_render_outline(truth, board->view);
  AwRect rect = aw_points_rect(outline, truth->n_outline, margin);
  if (!aw_patch_cover(&board->patch, outline, truth->n_outline, rect, error))
    return FALSE;
  if (truth->dome_frac != 0.0 && !shade_dome(board, truth, outline, error))
    return FALSE;
  if (truth->texture_frac > 0.0)
    shade_texture(board, truth);
  double sum = aw_patch_sum(&board->patch);
  if (sum <= 0.0)
    return TRUE;
  aw_patch_blur(&board->patch, sigma);
  double light = truth->light_e * (1.0 - board->camera->haze_frac);
  aw_patch_add(&board->patch, light / sum, board->light, board->view->width_px, board->y0, board->y1);
  return TRUE;
}

/* Spreads part of an object's light as a wide Gaussian over the haze nodes. */
static void draw_haze(Board *board, const AwTruth *truth, double *column)
{
  double sigma = board->camera->haze_um / board->um_per_px, reach = REACH_SIGMA * sigma;
  AwPixelPoint p = to_pixel(board, truth->centroid);
  if (!in_sight(board, p, reach + 2 * HAZE_STEP_PX))
    return;
  double peak = truth->light_e * board->camera->haze_frac / (2.0 * G_PI * sigma * sigma);
  int i0 = MAX((int)ceil((p.x_px - reach) / HAZE_STEP_PX), 0);
  int i1 = MIN((int)floor((p.x_px + reach) / HAZE_STEP_PX), board->haze_columns - 1);
  for (int i = i0; i <= i1; i++) {
    double d = (i * HAZE_STEP_PX - p.x_px) / sigma;
    column[i] = exp(-0.5 * d * d);
  }
  int j0 = MAX((int)ceil((p.y_px - reach) / HAZE_STEP_PX), board->haze_row0);
  int j1 = MIN((int)floor((p.y_px + reach) / HAZE_STEP_PX), board->haze_row0 + board->haze_rows - 1);
  for (int j = j0; j <= j1; j++) {
    double d = (j * HAZE_STEP_PX - p.y_px) / sigma, here = peak * exp(-0.5 * d * d);
    double *row = board->haze + (gsize)(j - board->haze_row0) * (gsize)board->haze_columns;
    for (int i = i0; i <= i1; i++)
      row[i] += here * column[i];
  }
}

/* The light of row y before noise: objects, haze and background under uneven light, electrons per pixel. */
static void light_row(const Board *board, int y, double *mean)
{
  const AwRenderCamera *camera = board->camera;
  int width = board->view->width_px;
  const double *light = board->light + (gsize)(y - board->y0) * (gsize)width;
  int j = y / HAZE_STEP_PX;
  const double *upper = board->haze + (gsize)(j - board->haze_row0) * (gsize)board->haze_columns;
  const double *lower = upper + board->haze_columns;
  double fy = (double)(y % HAZE_STEP_PX) / HAZE_STEP_PX, dy = y - board->centre.y_px;
  double corner2 = board->centre.x_px * board->centre.x_px + board->centre.y_px * board->centre.y_px;
  for (int x = 0; x < width; x++) {
    int i = x / HAZE_STEP_PX;
    double fx = (double)(x % HAZE_STEP_PX) / HAZE_STEP_PX, dx = x - board->centre.x_px;
    double haze =
        (1.0 - fy) * ((1.0 - fx) * upper[i] + fx * upper[i + 1]) + fy * ((1.0 - fx) * lower[i] + fx * lower[i + 1]);
    double even = (1.0 - camera->vignette_frac * (dx * dx + dy * dy) / MAX(corner2, 1.0)) *
                  (1.0 + camera->slope_x * dx / MAX(board->centre.x_px, 1.0) +
                   camera->slope_y * dy / MAX(board->centre.y_px, 1.0));
    mean[x] = MAX(even, 0.0) * (camera->background_e + haze + light[x]);
  }
}

/* A hot pixel's charge is the camera's: position and strength do not change from frame to frame. */
static void add_hot_pixels(const Board *board, int y, double *mean)
{
  AwRandom random = aw_random_stream(board->camera->seed, 0);
  for (int k = 0; k < board->camera->n_hot; k++) {
    guint32 x = aw_random_below(&random, (guint32)board->view->width_px);
    guint32 row = aw_random_below(&random, (guint32)board->view->height_px);
    double charge = board->camera->hot_e * aw_random_unit(&random);
    if ((int)row == y)
      mean[x] += charge;
  }
}

/*
 * Photon noise with z normal: the first two terms of the Cornish-Fisher expansion of the Poisson quantile (Cornish &
 * Fisher 1938); at 30 electrons its skewness is right and its error far below the read noise.
 */
static double shot(AwRandom *random, double mean, double z)
{
  if (mean <= POISSON_BY_SUM)
    return aw_random_poisson(random, MAX(mean, 0.0));
  return floor(mean + sqrt(mean) * z + (z * z - 1.0) / 6.0 + 0.5);
}

/* One Box-Muller pair a pixel: one deviate for the photons, one for the read noise. */
static void expose_row(const Board *board, int y, const double *mean, guint16 *counts)
{
  const AwRenderCamera *camera = board->camera;
  AwRandom random = aw_random_stream(camera->seed, ((guint64)board->view->frame << 32) + (guint64)y + 1);
  for (int x = 0; x < board->view->width_px; x++) {
    double r = sqrt(-2.0 * log(1.0 - aw_random_unit(&random))), t = 2.0 * G_PI * aw_random_unit(&random);
    double charge = shot(&random, mean[x], r * cos(t)) + camera->read_noise_e * r * sin(t);
    double value = floor(camera->offset + camera->counts_per_e * charge + 0.5);
    counts[x] = (guint16)CLAMP(value, 0.0, camera->full_scale);
  }
}

static gboolean board_open(Board *board, GError **error)
{
  const AwRenderView *view = board->view;
  AwMatrix inverse = aw_matrix_inverse(view->map.um_per_px);
  board->centre = aw_frame_centre(view->width_px, view->height_px);
  board->um_per_px = aw_pixel_map_scale(&view->map);
  board->px_per_um = hypot(hypot(inverse.xx, inverse.xy), hypot(inverse.yx, inverse.yy));
  board->haze_columns = (view->width_px - 1) / HAZE_STEP_PX + 2;
  board->haze_row0 = board->y0 / HAZE_STEP_PX;
  board->haze_rows = (board->y1 - 1) / HAZE_STEP_PX + 2 - board->haze_row0;
  aw_patch_init(&board->patch);
  aw_patch_init(&board->dome);
  gsize n = (gsize)(board->y1 - board->y0) * (gsize)view->width_px;
  board->light = aw_try_alloc(n, sizeof *board->light, "the light of a drawn frame", error);
  board->haze = board->light ? aw_try_alloc((gsize)board->haze_columns * (gsize)board->haze_rows, sizeof *board->haze,
                                            "the haze of a drawn frame", error)
                             : NULL;
  return board->haze != NULL;
}

static void board_clear(Board *board)
{
  g_free(board->light);
  g_free(board->haze);
  aw_patch_clear(&board->patch);
  aw_patch_clear(&board->dome);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Board, board_clear)

gboolean aw_render_rows(const GPtrArray *truths, const AwRenderView *view, const AwRenderCamera *camera, int y0, int y1,
                        guint16 *counts, GError **error)
{
  g_return_val_if_fail(0 <= y0 && y0 < y1 && y1 <= view->height_px, FALSE);
  g_return_val_if_fail(camera->full_scale <= 65535.0, FALSE);
  g_auto(Board) board = { .view = view, .camera = camera, .y0 = y0, .y1 = y1 };
  if (!board_open(&board, error))
    return FALSE;
  g_autofree double *column = g_new(double, (gsize)board.haze_columns);
  for (guint i = 0; i < truths->len; i++) {
    if (!draw_object(&board, truths->pdata[i], error))
      return FALSE;
    if (camera->haze_frac > 0.0)
      draw_haze(&board, truths->pdata[i], column);
  }
  g_autofree double *mean = g_new(double, (gsize)view->width_px);
  for (int y = y0; y < y1; y++) {
    light_row(&board, y, mean);
    add_hot_pixels(&board, y, mean);
    expose_row(&board, y, mean, counts + (gsize)(y - y0) * (gsize)view->width_px);
  }
  return TRUE;
}

AwImage *aw_render_frame(const GPtrArray *truths, const AwRenderView *view, const AwRenderCamera *camera,
                         GError **error)
{
  g_autoptr(AwImage) image = aw_image_new(view->width_px, view->height_px, AW_SAMPLE_U16, error);
  if (!image || !aw_render_rows(truths, view, camera, 0, view->height_px, image->pixels, error))
    return NULL;
  image->full_scale = camera->full_scale;
  return g_steal_pointer(&image);
}

static gboolean label_object(AwLabels *labels, AwPatch *patch, const AwTruth *truth, const AwRenderView *view,
                             guint32 label, GError **error)
{
  g_autofree AwPixelPoint *outline = aw_render_outline(truth, view);
  AwRect r = aw_points_rect(outline, truth->n_outline, 1.0);
  if (r.x1 <= 0 || r.y1 <= 0 || r.x0 >= view->width_px || r.y0 >= view->height_px)
    return TRUE;
  if (!aw_patch_cover(patch, outline, truth->n_outline, r, error))
    return FALSE;
  for (int y = MAX(r.y0, 0); y < MIN(r.y1, view->height_px); y++)
    for (int x = MAX(r.x0, 0); x < MIN(r.x1, view->width_px); x++)
      if (patch->value[(gsize)(y - r.y0) * (gsize)aw_patch_width(patch) + (gsize)(x - r.x0)] >= 0.5)
        labels->label[(gsize)y * (gsize)view->width_px + (gsize)x] = label;
  return TRUE;
}

AwLabels *aw_render_labels(const GPtrArray *truths, const AwRenderView *view, GError **error)
{
  g_autoptr(AwLabels) labels = aw_labels_new(view->width_px, view->height_px, error);
  if (!labels)
    return NULL;
  g_auto(AwPatch) patch;
  aw_patch_init(&patch);
  for (guint i = 0; i < truths->len; i++)
    if (!label_object(labels, &patch, truths->pdata[i], view, i + 1, error))
      return NULL;
  labels->n_labels = truths->len;
  return g_steal_pointer(&labels);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/noise.h"

#include <math.h>

#include "image/rank.h"

#define TILE 16
#define MAX_SAMPLES (1 << 18)

/* [1 -2 1; -2 4 -2; 1 -2 1] / 6 has unit response to white noise of unit variance. */
static double residual(const AwImage *im, int x, int y)
{
  double corner = aw_image_value(im, x - 1, y - 1) + aw_image_value(im, x + 1, y - 1) +
                  aw_image_value(im, x - 1, y + 1) + aw_image_value(im, x + 1, y + 1);
  double side = aw_image_value(im, x, y - 1) + aw_image_value(im, x, y + 1) + aw_image_value(im, x - 1, y) +
                aw_image_value(im, x + 1, y);
  return fabs(corner - 2 * side + 4 * aw_image_value(im, x, y)) / 6;
}

static gsize sample_tile(const AwImage *im, int x0, int y0, float *out)
{
  gsize n = 0;
  for (int y = y0; y < MIN(y0 + TILE, im->height_px - 1); y++)
    for (int x = x0; x < MIN(x0 + TILE, im->width_px - 1); x++)
      out[n++] = (float)residual(im, x, y);
  return n;
}

double aw_image_noise(const AwImage *image)
{
  int w = image->width_px, h = image->height_px;
  if (w < 3 || h < 3)
    return 0;
  gint64 n_px = (gint64)w * h;
  int every = (int)(n_px / MAX_SAMPLES) + 1; /* tiles along diagonals, so rows and columns are treated alike */
  gint64 n_tiles = (gint64)((w - 2 + TILE - 1) / TILE) * ((h - 2 + TILE - 1) / TILE);
  g_autofree float *sample = g_new(float, (gsize)((n_tiles / every + h / TILE + 2) * TILE * TILE));
  gsize n = 0;
  for (int j = 0; 1 + j * TILE < h - 1; j++)
    for (int i = 0; 1 + i * TILE < w - 1; i++)
      if ((i + j) % every == 0)
        n += sample_tile(image, 1 + i * TILE, 1 + j * TILE, sample + n);
  return aw_quantile(sample, n, 0.5) / 0.6745;
}

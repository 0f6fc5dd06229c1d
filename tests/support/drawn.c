/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "support/drawn.h"

#include <math.h>

#include "base/random.h"
#include "nuclei/patch.h"

#define N_ELLIPSE_POINTS 180

AwImage *drawn_image(int width_px, int height_px, AwSample sample, double level)
{
  AwImage *image = aw_image_new(width_px, height_px, sample, NULL);
  g_assert_nonnull(image);
  for (int y = 0; y < height_px; y++)
    for (int x = 0; x < width_px; x++)
      drawn_set(image, x, y, level);
  return image;
}

void drawn_set(AwImage *image, int x, int y, double value)
{
  g_assert_true(x >= 0 && y >= 0 && x < image->width_px && y < image->height_px);
  gsize i = (gsize)y * (gsize)image->width_px + (gsize)x;
  if (image->sample == AW_SAMPLE_F32)
    ((float *)image->pixels)[i] = (float)value;
  else if (image->sample == AW_SAMPLE_U16)
    ((guint16 *)image->pixels)[i] = (guint16)lrint(CLAMP(value, 0.0, 65535.0));
  else
    ((guint8 *)image->pixels)[i] = (guint8)lrint(CLAMP(value, 0.0, 255.0));
}

static void lay(AwPatch *patch, const AwPixelPoint *polygon, gsize n, double sigma_px)
{
  g_assert_true(aw_patch_cover(patch, polygon, n, aw_points_rect(polygon, n, 4.0 * sigma_px + 2.0), NULL));
  aw_patch_blur(patch, sigma_px);
}

void drawn_polygon(AwImage *image, const AwPixelPoint *polygon, gsize n, double height, double sigma_px)
{
  g_auto(AwPatch) patch;
  aw_patch_init(&patch);
  lay(&patch, polygon, n, sigma_px);
  AwRect r = patch.rect;
  for (int y = MAX(r.y0, 0); y < MIN(r.y1, image->height_px); y++)
    for (int x = MAX(r.x0, 0); x < MIN(r.x1, image->width_px); x++) {
      double v = patch.value[(gsize)(y - r.y0) * (gsize)aw_patch_width(&patch) + (gsize)(x - r.x0)];
      drawn_set(image, x, y, aw_image_value(image, x, y) + height * v);
    }
}

/* The polygon has the ellipse's area: its vertices lie a little outside. */
static void ellipse(DrawnBlob blob, AwPixelPoint *polygon)
{
  double step = 2.0 * G_PI / N_ELLIPSE_POINTS, grow = sqrt(step / sin(step));
  for (gsize i = 0; i < N_ELLIPSE_POINTS; i++) {
    double u = grow * blob.major_px / 2.0 * cos((double)i * step),
           v = grow * blob.minor_px / 2.0 * sin((double)i * step);
    polygon[i].x_px = blob.x_px + u * cos(blob.angle_rad) - v * sin(blob.angle_rad);
    polygon[i].y_px = blob.y_px + u * sin(blob.angle_rad) + v * cos(blob.angle_rad);
  }
}

void drawn_blob(AwImage *image, DrawnBlob blob)
{
  AwPixelPoint polygon[N_ELLIPSE_POINTS];
  ellipse(blob, polygon);
  drawn_polygon(image, polygon, N_ELLIPSE_POINTS, blob.height, blob.sigma_px);
}

void drawn_disc(AwImage *image, double x_px, double y_px, double r_px, double height, double sigma_px)
{
  drawn_blob(image, (DrawnBlob){ x_px, y_px, 2.0 * r_px, 2.0 * r_px, 0.0, height, sigma_px });
}

void drawn_slope(AwImage *image, double dx_per_px, double dy_per_px)
{
  for (int y = 0; y < image->height_px; y++)
    for (int x = 0; x < image->width_px; x++)
      drawn_set(image, x, y, aw_image_value(image, x, y) + dx_per_px * x + dy_per_px * y);
}

void drawn_noise(AwImage *image, double sd, guint64 seed)
{
  for (int y = 0; y < image->height_px; y++) {
    AwRandom r = aw_random_stream(seed, (guint64)y);
    for (int x = 0; x < image->width_px; x++)
      drawn_set(image, x, y, aw_image_value(image, x, y) + sd * aw_random_normal(&r));
  }
}

void drawn_label(AwLabels *labels, DrawnBlob blob, guint32 label)
{
  AwPixelPoint polygon[N_ELLIPSE_POINTS];
  ellipse(blob, polygon);
  g_auto(AwPatch) patch;
  aw_patch_init(&patch);
  lay(&patch, polygon, N_ELLIPSE_POINTS, 0.0);
  AwRect r = patch.rect;
  for (int y = MAX(r.y0, 0); y < MIN(r.y1, labels->height_px); y++)
    for (int x = MAX(r.x0, 0); x < MIN(r.x1, labels->width_px); x++)
      if (patch.value[(gsize)(y - r.y0) * (gsize)aw_patch_width(&patch) + (gsize)(x - r.x0)] >= 0.5)
        labels->label[(gsize)y * (gsize)labels->width_px + (gsize)x] = label;
  labels->n_labels = MAX(labels->n_labels, label);
}

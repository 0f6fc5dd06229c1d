/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Prints one plane for the outside checks of test_images.py:
 *   dump_plane FILE PAGE CHANNEL [X0 Y0 X1 Y1]
 * one line of JSON, then the pixels, native byte order. An error goes to stderr; exit 1. */
#include <stdio.h>
#include <stdlib.h>

#include "base/text.h"
#include "image/reader.h"

static void print_number(const char *name, double value)
{
  g_autofree char *text = isnan(value) ? g_strdup("null") : aw_text_from_double_exact(value);
  printf(", \"%s\": %s", name, text);
}

static void print_info(const AwImageReader *reader, const AwImage *image)
{
  static const char *const samples[] = { "u1", "u2", "f4" };
  const AwImageInfo *info = aw_image_reader_info(reader);
  printf("{\"width\": %d, \"height\": %d, \"sample\": \"%s\"", info->width_px, info->height_px, samples[info->sample]);
  printf(", \"pages\": %d, \"channels\": %d", aw_image_reader_n_pages(reader), aw_image_reader_n_channels(reader));
  print_number("full_scale", image->full_scale);
  print_number("pixel_um", info->pixel_um);
  print_number("pixel_y_um", info->pixel_y_um);
  print_number("stage_x_um", info->has_position ? info->stage.x_um : NAN);
  print_number("stage_y_um", info->has_position ? info->stage.y_um : NAN);
  print_number("taken_at", info->taken_at_unix_s);
  printf(", \"reference_frame\": %s}\n", info->position_is_reference_frame ? "true" : "false");
}

static gboolean dump(int argc, char **argv, GError **error)
{
  g_autoptr(AwImageReader) reader = aw_image_reader_open(argv[1], atoi(argv[2]), atoi(argv[3]), error);
  if (!reader)
    return FALSE;
  const AwImageInfo *info = aw_image_reader_info(reader);
  AwRect rect = { 0, 0, info->width_px, info->height_px };
  if (argc == 8)
    rect = (AwRect){ atoi(argv[4]), atoi(argv[5]), atoi(argv[6]), atoi(argv[7]) };
  g_autoptr(AwImage) image = aw_image_reader_read(reader, rect, error);
  if (!image)
    return FALSE;
  print_info(reader, image);
  gsize n = (gsize)image->width_px * (gsize)image->height_px;
  return fwrite(image->pixels, aw_sample_bytes(image->sample), n, stdout) == n;
}

int main(int argc, char **argv)
{
  g_autoptr(GError) error = NULL;
  if (argc != 4 && argc != 8)
    return 2;
  if (dump(argc, argv, &error))
    return 0;
  fprintf(stderr, "%s\n", error ? error->message : "cannot write");
  return 1;
}

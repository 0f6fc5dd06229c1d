/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Writes TIFF files for the outside checks of test_images.py:
 *   write_plane FROM TO PIXEL_UM      copies page 0
 *   write_plane --labels TOP TO       301 x 257 labels, pixel i has label 7 i mod (TOP + 1)
 * An error goes to stderr; exit 1. */
#include <stdio.h>
#include <string.h>

#include "base/text.h"
#include "image/reader.h"
#include "image/writer.h"

static gboolean copy(char **argv, GError **error)
{
  double pixel_um;
  if (!aw_text_to_double(argv[3], "PIXEL_UM", &pixel_um, error))
    return FALSE;
  g_autoptr(AwImage) image = aw_image_load(argv[1], 0, -1, NULL, error);
  return image && aw_image_write_tiff(image, argv[2], pixel_um, error);
}

static gboolean write_labels(char **argv, GError **error)
{
  gint64 top;
  g_autoptr(AwLabels) labels = aw_labels_new(301, 257, error);
  if (!labels || !aw_text_to_int(argv[2], "TOP", 1, 1000000, &top, error))
    return FALSE;
  labels->n_labels = (guint32)top;
  for (guint32 i = 0; i < 301 * 257; i++)
    labels->label[i] = i * 7 % ((guint32)top + 1);
  return aw_labels_write_tiff(labels, argv[3], error);
}

int main(int argc, char **argv)
{
  g_autoptr(GError) error = NULL;
  if (argc != 4)
    return 2;
  if (strcmp(argv[1], "--labels") == 0 ? write_labels(argv, &error) : copy(argv, &error))
    return 0;
  fprintf(stderr, "%s\n", error ? error->message : "cannot write");
  return 1;
}

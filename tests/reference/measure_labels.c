/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* measure_labels LABELS.tif IMAGE.tif: the features of every label as CSV on stdout, pixels; for test_features.py. */
#include <stdio.h>

#include "base/error.h"
#include "base/text.h"
#include "image/reader.h"
#include "nuclei/measure.h"

static AwLabels *labels_of(const AwImage *image, GError **error)
{
  AwLabels *labels = aw_labels_new(image->width_px, image->height_px, error);
  for (int y = 0; labels && y < image->height_px; y++)
    for (int x = 0; x < image->width_px; x++) {
      guint32 k = (guint32)aw_image_value(image, x, y);
      labels->label[(gsize)y * (gsize)image->width_px + (gsize)x] = k;
      labels->n_labels = MAX(labels->n_labels, k);
    }
  return labels;
}

static void print_number(double value)
{
  g_autofree char *text = isfinite(value) ? aw_text_from_double_exact(value) : g_strdup("inf");
  printf(",%s", text);
}

static void print_nucleus(guint number, const AwNucleus *a)
{
  gsize n = 0;
  const AwFeature *features = aw_features(&n);
  printf("%u", number);
  print_number(a->centroid_px.x_px);
  print_number(a->centroid_px.y_px);
  for (gsize i = 0; i < n; i++)
    print_number(aw_feature_value(&features[i], a));
  g_autofree char *flags = aw_flags_text(a->flags);
  printf(",%s\n", flags);
}

static void print_heading(void)
{
  gsize n = 0;
  const AwFeature *features = aw_features(&n);
  printf("label,x_px,y_px");
  for (gsize i = 0; i < n; i++) {
    g_autofree char *name = aw_feature_name(&features[i], FALSE);
    printf(",%s", name);
  }
  printf(",flags\n");
}

static gboolean run(const char *labels_path, const char *image_path, GError **error)
{
  g_autoptr(AwImage) plane = aw_image_load(labels_path, 0, -1, NULL, error);
  g_autoptr(AwImage) image = plane ? aw_image_load(image_path, 0, -1, NULL, error) : NULL;
  g_autoptr(AwLabels) labels = image ? labels_of(plane, error) : NULL;
  if (!labels)
    return FALSE;
  AwPlacement loose = aw_placement_loose(image->width_px, image->height_px);
  g_autoptr(GPtrArray) nuclei = aw_measure_nuclei(image, labels, NULL, &loose, aw_saturation_level(image), error);
  if (!nuclei)
    return FALSE;
  print_heading();
  for (guint i = 0; i < nuclei->len; i++)
    print_nucleus(i + 1, nuclei->pdata[i]);
  return TRUE;
}

int main(int argc, char **argv)
{
  g_autoptr(GError) error = NULL;
  if (argc == 3 && run(argv[1], argv[2], &error))
    return 0;
  fprintf(stderr, "measure_labels: %s\n", error ? error->message : "usage: measure_labels LABELS.tif IMAGE.tif");
  return 1;
}

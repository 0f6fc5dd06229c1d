/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * segment_scan SCAN.csv [THREADS]: the nuclei of a scan as CSV on stdout, what was found out about the scan as lines
 * that begin with '#', among them the largest memory in use; for test_sample_scan.py and load tests.
 */
#include <stdio.h>
#include <stdlib.h>
#include <sys/resource.h>

#include "base/text.h"
#include "image/reader.h"
#include "nuclei/scan.h"
#include "nuclei/scantable.h"

static AwScanFrame *frames_of(GPtrArray *rows, double *pixel_um, GError **error)
{
  g_autofree AwScanFrame *frames = g_new0(AwScanFrame, rows->len + 1);
  for (guint i = 0; i < rows->len; i++) {
    const AwScanRow *row = rows->pdata[i];
    g_autoptr(AwImageReader) reader = aw_image_reader_open(row->path, row->page, row->channel, error);
    if (!reader)
      return NULL;
    const AwImageInfo *info = aw_image_reader_info(reader);
    frames[i] = (AwScanFrame){ row->path, row->page, row->channel, info->width_px, info->height_px, row->stage };
    *pixel_um = row->pixel_um > 0 ? row->pixel_um : *pixel_um;
  }
  return g_steal_pointer(&frames);
}

static void print_number(double value, int decimals)
{
  g_autofree char *text = isfinite(value) ? aw_text_from_double(value, decimals) : g_strdup("inf");
  printf(",%s", text);
}

static void print_nucleus(guint number, const AwNucleus *a)
{
  gsize n = 0;
  const AwFeature *features = aw_features(&n);
  printf("%u,%d,%d", number, a->frame, a->n_views);
  print_number(a->centroid_px.x_px, 4);
  print_number(a->centroid_px.y_px, 4);
  print_number(a->centroid.x_um, 4);
  print_number(a->centroid.y_um, 4);
  for (gsize i = 0; i < n; i++)
    print_number(aw_feature_value(&features[i], a), 5);
  g_autofree char *flags = aw_flags_text(a->flags);
  printf(",%s\n", flags);
}

static void print_result(const AwScanResult *result)
{
  struct rusage usage;
  getrusage(RUSAGE_SELF, &usage);
  g_autofree char *rms = aw_text_from_double(result->n_overlap_pairs ? result->overlap_rms_um : -1, 4);
  g_autofree char *radius = aw_text_from_double(result->scale.weight > 0 ? result->scale.radius_px : 0, 2);
  printf(
      "# map: %s\n# overlap pairs: %d, rms %s um per axis, cut views dropped: %d\n# radius: %s px\n# memory: %ld KiB\n",
      result->map_note, (int)result->n_overlap_pairs, rms, (int)result->n_cut_dropped, radius, usage.ru_maxrss);
  gsize n = 0;
  const AwFeature *features = aw_features(&n);
  printf("number,frame,n_views,x_px,y_px,x_um,y_um");
  for (gsize i = 0; i < n; i++) {
    g_autofree char *name = aw_feature_name(&features[i], TRUE);
    printf(",%s", name);
  }
  printf(",flags\n");
  for (guint i = 0; i < result->nuclei->len; i++)
    print_nucleus(i + 1, result->nuclei->pdata[i]);
}

static gboolean run(const char *table, guint n_threads, GError **error)
{
  double pixel_um = 1;
  g_autoptr(GPtrArray) rows = aw_scan_table_read(table, NULL, error);
  g_autofree AwScanFrame *frames = rows ? frames_of(rows, &pixel_um, error) : NULL;
  if (!frames)
    return FALSE;
  AwScanSettings settings = { .n_threads = n_threads, .pixel_um = pixel_um, .fit_map = TRUE };
  settings.map.um_per_px = (AwMatrix){ pixel_um, 0, 0, pixel_um };
  g_autoptr(AwScanResult) result = aw_scan_segment(frames, rows->len, &settings, NULL, error);
  if (result)
    print_result(result);
  return result != NULL;
}

int main(int argc, char **argv)
{
  g_autoptr(GError) error = NULL;
  if (argc >= 2 && run(argv[1], argc > 2 ? (guint)atoi(argv[2]) : 0, &error))
    return 0;
  fprintf(stderr, "segment_scan: %s\n", error ? error->message : "usage: segment_scan SCAN.csv [THREADS]");
  return 1;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/calibrate_tables.h"

#include <math.h>

#include "base/csv.h"
#include "base/error.h"
#include "base/limits.h"
#include "image/reader.h"

/* Numbers of one row under `n` headings. */
static gboolean read_row(const AwCsv *csv, gsize row, const gsize *column, gsize n, double *values, GError **error)
{
  for (gsize i = 0; i < n; i++) {
    if (!aw_csv_double(csv, row, column[i], &values[i], error))
      return FALSE;
    if (fabs(values[i]) > AW_MAX_COORDINATE_UM && g_str_has_suffix(aw_csv_heading(csv, column[i]), "_um")) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                  "%s, line %" G_GSIZE_FORMAT ", column %s: '%s' is beyond 10000000 um; is it in another unit?",
                  aw_csv_name(csv), aw_csv_line(csv, row), aw_csv_heading(csv, column[i]),
                  aw_csv_text(csv, row, column[i]));
      return FALSE;
    }
  }
  return TRUE;
}

static gboolean need_columns(const AwCsv *csv, const char *const *headings, gsize n, gsize *column, GError **error)
{
  for (gsize i = 0; i < n; i++)
    if (!aw_csv_need(csv, headings[i], &column[i], error))
      return FALSE;
  return TRUE;
}

/* The mark in the image that a row names, relative to the table's folder, and the image's centre. */
static gboolean find_mark(const AwCsv *csv, gsize row, gsize file, const AwMarkSettings *settings, AwPixelPoint *p,
                          AwPixelPoint *centre, GError **error)
{
  g_autofree char *folder = g_path_get_dirname(aw_csv_name(csv));
  g_autofree char *path = g_canonicalize_filename(aw_csv_text(csv, row, file), NULL);
  if (!g_path_is_absolute(aw_csv_text(csv, row, file))) {
    g_free(path);
    path = g_build_filename(folder, aw_csv_text(csv, row, file), NULL);
  }
  g_autoptr(AwImage) image = aw_image_load(path, 0, -1, NULL, error);
  AwMark mark;
  if (!image)
    return FALSE;
  if (!aw_mark_find(image, settings, &mark, error)) {
    g_prefix_error(error, "%s: ", path);
    return FALSE;
  }
  *p = mark.at;
  *centre = aw_frame_centre(image->width_px, image->height_px);
  return TRUE;
}

static gboolean need_mark_settings(const AwCalibrateSource *source, const char *columns, GError **error)
{
  if (source->marks)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND,
              "%s has no columns %s; to find the marks in its images say how large they are (--mark-px)", source->table,
              columns);
  return FALSE;
}

/* Every view in which image the mark is looked for gets pixels from the image's centre on. */
GArray *aw_table_views(const AwCalibrateSource *source, GError **error)
{
  static const char *const headings[] = { "stage_x_um", "stage_y_um", "x_px", "y_px" };
  g_autoptr(AwCsv) csv = aw_csv_read(source->table, ',', error);
  gsize column[4], file = 0;
  if (!csv)
    return NULL;
  gboolean images = aw_csv_find(csv, "x_px") < 0 && aw_csv_find(csv, "file") >= 0;
  if (!need_columns(csv, headings, images ? 2 : 4, column, error) ||
      (images && (!need_mark_settings(source, "x_px and y_px", error) || !aw_csv_need(csv, "file", &file, error))))
    return NULL;
  g_autoptr(GArray) views = g_array_new(FALSE, FALSE, sizeof(AwMarkView));
  for (gsize row = 0; row < aw_csv_n_rows(csv); row++) {
    double v[4] = { 0 };
    AwPixelPoint p = { 0, 0 }, centre = { 0, 0 };
    if (!read_row(csv, row, column, images ? 2 : 4, v, error) ||
        (images && !find_mark(csv, row, file, source->marks, &p, &centre, error)))
      return NULL;
    AwMarkView view = { { v[0], v[1] },
                        { images ? p.x_px - centre.x_px : v[2], images ? p.y_px - centre.y_px : v[3] } };
    g_array_append_val(views, view);
  }
  return g_steal_pointer(&views);
}

GArray *aw_table_pairs(const AwCalibrateSource *source, AwRecord *record, GPtrArray **names, GError **error)
{
  static const char *const headings[] = { "beam_x_um", "beam_y_um", "scan_x_um", "scan_y_um" };
  static const char *const with_images[] = { "beam_x_um", "beam_y_um", "stage_x_um", "stage_y_um" };
  g_autoptr(AwCsv) csv = aw_csv_read(source->table, ',', error);
  gsize column[4], file = 0;
  AwPixelMap map;
  if (!csv || !aw_record_pixel_map(record, &map, error))
    return NULL;
  gboolean images = aw_csv_find(csv, "scan_x_um") < 0 && aw_csv_find(csv, "file") >= 0;
  if (!need_columns(csv, images ? with_images : headings, 4, column, error) ||
      (images &&
       (!need_mark_settings(source, "scan_x_um and scan_y_um", error) || !aw_csv_need(csv, "file", &file, error))))
    return NULL;
  g_autoptr(GArray) pairs = g_array_new(FALSE, FALSE, sizeof(AwMarkPair));
  int name = aw_csv_find(csv, "name");
  *names = g_ptr_array_new_with_free_func(g_free);
  for (gsize row = 0; row < aw_csv_n_rows(csv); row++) {
    double v[4];
    AwPixelPoint p, centre;
    if (!read_row(csv, row, column, 4, v, error) ||
        (images && !find_mark(csv, row, file, source->marks, &p, &centre, error)))
      return NULL;
    AwMarkPair pair = { { v[2], v[3] }, { v[0], v[1] } };
    if (images)
      pair.scan = aw_pixel_to_scan(&map, pair.scan, centre, p);
    g_array_append_val(pairs, pair);
    g_ptr_array_add(*names, name >= 0 ? g_strdup(aw_csv_text(csv, row, (gsize)name))
                                      : g_strdup_printf("%" G_GSIZE_FORMAT, row + 1));
  }
  return g_steal_pointer(&pairs);
}

GArray *aw_table_edge(const char *table, gboolean *counts, GError **error)
{
  static const char *const headings[] = { "position_um", "n_full", "n_degraded" };
  static const char *const fractions[] = { "position_um", "fraction" };
  g_autoptr(AwCsv) csv = aw_csv_read(table, ',', error);
  gsize column[3];
  if (!csv)
    return NULL;
  *counts = aw_csv_find(csv, "fraction") < 0;
  gsize n = *counts ? 3 : 2;
  if (!need_columns(csv, *counts ? headings : fractions, n, column, error))
    return NULL;
  g_autoptr(GArray) points = g_array_new(FALSE, FALSE, sizeof(AwEdgePoint));
  for (gsize row = 0; row < aw_csv_n_rows(csv); row++) {
    double v[3] = { 0 };
    if (!read_row(csv, row, column, n, v, error))
      return NULL;
    AwEdgePoint point = { .position_um = v[0] };
    if (*counts) {
      point.n_full = v[1];
      point.n_degraded = v[2];
    } else {
      point.fraction = v[1];
    }
    g_array_append_val(points, point);
  }
  return g_steal_pointer(&points);
}

GArray *aw_table_bead(const char *table, GError **error)
{
  static const char *const headings[] = { "x_um", "y_um", "n_full", "n_degraded" };
  g_autoptr(AwCsv) csv = aw_csv_read(table, ',', error);
  gsize column[4];
  if (!csv || !need_columns(csv, headings, 4, column, error))
    return NULL;
  g_autoptr(GArray) points = g_array_new(FALSE, FALSE, sizeof(AwBeadPoint));
  for (gsize row = 0; row < aw_csv_n_rows(csv); row++) {
    double v[4];
    if (!read_row(csv, row, column, 4, v, error))
      return NULL;
    AwBeadPoint point = { { v[0], v[1] }, v[2], v[3] };
    g_array_append_val(points, point);
  }
  return g_steal_pointer(&points);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/points.h"

#include <math.h>
#include <stdlib.h>

#include "base/csv.h"
#include "base/error.h"
#include "base/limits.h"
#include "base/output.h"

#define MAX_DUPLICATES_NAMED 10

struct AwPoints {
  AwCsv *csv;
  AwStop *stops;
};

void aw_points_free(AwPoints *points)
{
  if (!points)
    return;
  aw_csv_free(points->csv);
  g_free(points->stops);
  g_free(points);
}

static gboolean read_coordinate(const AwCsv *csv, gsize row, gsize column, double *value, GError **error)
{
  if (!aw_csv_double(csv, row, column, value, error))
    return FALSE;
  if (fabs(*value) <= AW_MAX_COORDINATE_UM)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "%s, line %" G_GSIZE_FORMAT ", column %s: '%s' is beyond 10000000 um; is it in another unit?",
              aw_csv_name(csv), aw_csv_line(csv, row), aw_csv_heading(csv, column), aw_csv_text(csv, row, column));
  return FALSE;
}

static gboolean read_stops(AwPoints *points, GError **error)
{
  gsize x, y;
  if (!aw_csv_need(points->csv, "x_um", &x, error) || !aw_csv_need(points->csv, "y_um", &y, error))
    return FALSE;
  points->stops = g_new0(AwStop, aw_csv_n_rows(points->csv));
  for (gsize row = 0; row < aw_csv_n_rows(points->csv); row++)
    if (!read_coordinate(points->csv, row, x, &points->stops[row].x, error) ||
        !read_coordinate(points->csv, row, y, &points->stops[row].y, error))
      return FALSE;
  return TRUE;
}

AwPoints *aw_points_read(const char *path, GError **error)
{
  g_autoptr(AwPoints) points = g_new0(AwPoints, 1);
  points->csv = aw_csv_read(path, ',', error);
  if (!points->csv)
    return NULL;
  if (aw_csv_n_rows(points->csv) == 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_EMPTY, "%s has a header but no point", path);
    return NULL;
  }
  if (aw_csv_find(points->csv, "order") >= 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s has a column \"order\" already; remove or rename it", path);
    return NULL;
  }
  return read_stops(points, error) ? g_steal_pointer(&points) : NULL;
}

gsize aw_points_n(const AwPoints *points)
{
  return aw_csv_n_rows(points->csv);
}

const AwStop *aw_points_stops(const AwPoints *points)
{
  return points->stops;
}

typedef struct {
  AwStop at;
  gsize row;
} Place;

static int compare_places(const void *a, const void *b)
{
  const Place *p = a, *q = b;
  if (p->at.x != q->at.x)
    return p->at.x < q->at.x ? -1 : 1;
  if (p->at.y != q->at.y)
    return p->at.y < q->at.y ? -1 : 1;
  return (p->row > q->row) - (p->row < q->row);
}

void aw_points_warn_duplicates(const AwPoints *points, GPtrArray *warnings)
{
  gsize n = aw_points_n(points), n_found = 0;
  g_autofree Place *places = g_new(Place, n);
  for (gsize i = 0; i < n; i++)
    places[i] = (Place){ points->stops[i], i };
  qsort(places, n, sizeof *places, compare_places);
  for (gsize i = 1; i < n; i++) {
    if (places[i].at.x != places[i - 1].at.x || places[i].at.y != places[i - 1].at.y)
      continue;
    if (n_found++ < MAX_DUPLICATES_NAMED)
      g_ptr_array_add(warnings, g_strdup_printf("%s: the points of lines %" G_GSIZE_FORMAT " and %" G_GSIZE_FORMAT
                                                " lie on one spot",
                                                aw_csv_name(points->csv), aw_csv_line(points->csv, places[i - 1].row),
                                                aw_csv_line(points->csv, places[i].row)));
  }
  if (n_found > MAX_DUPLICATES_NAMED)
    g_ptr_array_add(warnings, g_strdup_printf("%s: %" G_GSIZE_FORMAT " further points lie on the spot of another",
                                              aw_csv_name(points->csv), n_found - MAX_DUPLICATES_NAMED));
}

static void append_row(GString *out, const AwCsv *csv, gsize row, gsize order)
{
  for (gsize column = 0; column < aw_csv_n_columns(csv); column++) {
    aw_csv_append(out, aw_csv_text(csv, row, column), ',');
    g_string_append_c(out, ',');
  }
  g_string_append_printf(out, "%" G_GSIZE_FORMAT "\n", order);
}

gboolean aw_points_write(const AwPoints *points, const guint32 *order, const char *path, GError **error)
{
  const AwCsv *csv = points->csv;
  g_autoptr(GString) out = g_string_new(NULL);
  for (const char *const *comment = aw_csv_comments(csv); *comment; comment++)
    g_string_append_printf(out, "# %s\n", *comment);
  for (gsize column = 0; column < aw_csv_n_columns(csv); column++) {
    aw_csv_append(out, aw_csv_heading(csv, column), ',');
    g_string_append_c(out, ',');
  }
  g_string_append(out, "order\n");
  for (gsize i = 0; i < aw_points_n(points); i++)
    append_row(out, csv, order[i], i + 1);
  return aw_output_write(path, out->str, out->len, error);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/start.h"

#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/pool.h"
#include "base/text.h"
#include "image/overview.h"
#include "image/reader.h"
#include "nuclei/scantable.h"
#include "record/files.h"

#define OVERVIEW_SIDE_PX 512

/* The scan on its way into the record; item i of every array is frame i. */
typedef struct {
  const AwStartSettings *settings;
  GPtrArray *rows;     /* AwScanRow */
  GPtrArray *frames;   /* AwFrame */
  AwRecord *record;    /* borrowed */
  double *low, *high;  /* contrast range of each frame */
  AwImage **small;     /* shrunk planes until the common contrast is known */
  double black, white; /* pixel values that the overviews show as 0 and 255 */
} Scan;

static void scan_clear(Scan *scan)
{
  for (guint i = 0; scan->small && i < scan->rows->len; i++)
    aw_image_free(scan->small[i]);
  g_free(scan->small);
  g_clear_pointer(&scan->rows, g_ptr_array_unref);
  g_clear_pointer(&scan->frames, g_ptr_array_unref);
  g_free(scan->low);
  g_free(scan->high);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Scan, scan_clear)

static GPtrArray *rows_of_table(const char *table, const AwStepContext *context, GError **error)
{
  g_auto(GStrv) unknown = NULL;
  GPtrArray *rows = aw_scan_table_read(table, &unknown, error);
  for (char **name = unknown; name && *name; name++)
    aw_step_warn(context, "%s: column \"%s\" is not known and was passed over", table, *name);
  return rows;
}

/* Images without a table: the position must come from the file, see open_frame. */
static GPtrArray *rows_of_images(const char *const *images)
{
  GPtrArray *rows = g_ptr_array_new_with_free_func((GDestroyNotify)aw_scan_row_free);
  for (; *images; images++) {
    AwScanRow *row = g_new0(AwScanRow, 1);
    row->path = g_strdup(*images);
    row->channel = -1;
    row->stage = (AwScanPoint){ NAN, NAN };
    row->taken_at_unix_s = NAN;
    g_ptr_array_add(rows, row);
  }
  return rows;
}

static gboolean need_position(AwScanRow *row, const AwImageInfo *info, GError **error)
{
  if (!isnan(row->stage.x_um))
    return TRUE;
  if (info->has_position) {
    row->stage = info->stage;
    return TRUE;
  }
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s %s; give a scan table with --scan", row->path,
              info->position_is_reference_frame
                  ? "carries a stage position in \"reference frame\", which is not a unit of length"
                  : "carries no stage position");
  return FALSE;
}

static void fill_frame(AwFrame *frame, const AwScanRow *row, const AwImageInfo *info, const AwStartSettings *settings)
{
  frame->page = row->page;
  frame->channel = row->channel >= 0 ? row->channel : settings->channel;
  frame->width_px = info->width_px;
  frame->height_px = info->height_px;
  frame->full_scale = info->full_scale;
  frame->stage = row->stage;
  frame->pixel_um = row->pixel_um > 0 ? row->pixel_um : settings->pixel_um > 0 ? settings->pixel_um : info->pixel_um;
  frame->taken_at_unix_s = isnan(row->taken_at_unix_s) ? info->taken_at_unix_s : row->taken_at_unix_s;
}

/* Reads one image, hashes it, shrinks it and measures its contrast. */
static gboolean take_frame(gsize item, guint worker, gpointer data, GError **error)
{
  (void)worker;
  Scan *scan = data;
  AwScanRow *row = scan->rows->pdata[item];
  AwFrame *frame = scan->frames->pdata[item];
  int channel = row->channel >= 0 ? row->channel : scan->settings->channel;
  g_autoptr(AwImageReader) reader = aw_image_reader_open(row->path, row->page, channel, error);
  if (!reader || !need_position(row, aw_image_reader_info(reader), error))
    return FALSE;
  fill_frame(frame, row, aw_image_reader_info(reader), scan->settings);
  frame->file = aw_record_file_relative(scan->record, row->path);
  scan->small[item] = aw_image_reader_shrink(reader, OVERVIEW_SIDE_PX, error);
  return scan->small[item] && aw_image_contrast(scan->small[item], &scan->low[item], &scan->high[item], error) &&
         aw_frame_identify(frame, row->path, error);
}

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static double middle(const double *values, gsize n)
{
  g_autofree double *sorted = g_memdup2(values, n * sizeof *values);
  qsort(sorted, n, sizeof *sorted, compare_doubles);
  return sorted[n / 2];
}

/* One contrast for all frames, so that the map shows no patchwork. */
static gboolean make_overviews(Scan *scan, GError **error)
{
  scan->black = middle(scan->low, scan->rows->len);
  scan->white = middle(scan->high, scan->rows->len);
  for (guint i = 0; i < scan->rows->len; i++) {
    AwFrame *frame = scan->frames->pdata[i];
    frame->overview = aw_image_overview(scan->small[i], OVERVIEW_SIDE_PX, scan->black, scan->white, error);
    if (!frame->overview)
      return FALSE;
  }
  return TRUE;
}

static gboolean read_images(Scan *scan, const AwStepContext *context, GError **error)
{
  gsize n = scan->rows->len;
  scan->low = g_new0(double, n);
  scan->high = g_new0(double, n);
  scan->small = g_new0(AwImage *, n);
  for (gsize i = 0; i < n; i++)
    g_ptr_array_add(scan->frames, aw_frame_new());
  return aw_pool_run(context->n_threads, n, take_frame, scan, "reading images", context->progress, error) &&
         make_overviews(scan, error);
}

/* The scan has one pixel size; frames that disagree cannot share a map. */
static gboolean check_pixel_sizes(const Scan *scan, double *pixel_um, GError **error)
{
  const AwFrame *first = scan->frames->pdata[0];
  *pixel_um = first->pixel_um;
  for (guint i = 1; i < scan->frames->len; i++) {
    const AwFrame *frame = scan->frames->pdata[i];
    if (fabs(frame->pixel_um - first->pixel_um) <= 1e-3 * first->pixel_um)
      continue;
    g_autofree char *a = aw_text_from_double_exact(first->pixel_um), *b = aw_text_from_double_exact(frame->pixel_um);
    g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s has pixels of %s um but %s of %s um; a scan has one pixel size",
                first->file, a, frame->file, b);
    return FALSE;
  }
  return TRUE;
}

/* TRUE when the rectangles of two frames, camera taken as unturned, meet. */
static gboolean frames_meet(const AwFrame *a, const AwFrame *b, double pixel_um)
{
  double dx = fabs(a->stage.x_um - b->stage.x_um) / pixel_um, dy = fabs(a->stage.y_um - b->stage.y_um) / pixel_um;
  return dx <= (a->width_px + b->width_px) / 2.0 && dy <= (a->height_px + b->height_px) / 2.0;
}

static gboolean meets_any(const Scan *scan, guint i, double pixel_um)
{
  for (guint k = 0; k < scan->frames->len; k++)
    if (k != i && frames_meet(scan->frames->pdata[i], scan->frames->pdata[k], pixel_um))
      return TRUE;
  return FALSE;
}

static void warn_of_gaps(const Scan *scan, double pixel_um, const AwStepContext *context)
{
  if (pixel_um <= 0) {
    aw_step_warn(context, "no pixel size is known; give --pixel-um, a pixel_um column, or files that say it");
    return;
  }
  gsize n_alone = 0;
  guint first = 0;
  for (guint i = 0; scan->frames->len > 1 && i < scan->frames->len; i++)
    if (!meets_any(scan, i, pixel_um))
      first = n_alone++ ? first : i;
  if (n_alone)
    aw_step_warn(context,
                 "%" G_GSIZE_FORMAT
                 " of %u frames touch no other frame (the first is %s); the pixel map cannot be fitted there",
                 n_alone, scan->frames->len, ((const AwFrame *)scan->frames->pdata[first])->file);
}

static void summarise(const Scan *scan, double pixel_um, AwStartSummary *s)
{
  double x0 = INFINITY, x1 = -INFINITY, y0 = INFINITY, y1 = -INFINITY;
  const AwFrame *first = scan->frames->pdata[0];
  *s = (AwStartSummary){
    .n_frames = scan->frames->len, .width_px = first->width_px, .height_px = first->height_px, .pixel_um = pixel_um
  };
  for (guint i = 0; i < scan->frames->len; i++) {
    const AwFrame *frame = scan->frames->pdata[i];
    x0 = fmin(x0, frame->stage.x_um - frame->width_px * pixel_um / 2);
    x1 = fmax(x1, frame->stage.x_um + frame->width_px * pixel_um / 2);
    y0 = fmin(y0, frame->stage.y_um - frame->height_px * pixel_um / 2);
    y1 = fmax(y1, frame->stage.y_um + frame->height_px * pixel_um / 2);
    s->n_bytes += frame->size_bytes;
  }
  s->width_um = x1 - x0;
  s->height_um = y1 - y0;
}

static gboolean store(Scan *scan, double pixel_um, const AwStepContext *context, GError **error)
{
  AwRecord *record = scan->record;
  g_autofree char *now = aw_text_from_time(floor((double)g_get_real_time() / G_USEC_PER_SEC));
  AwPixelMap map = { { pixel_um, 0, 0, pixel_um }, AW_ORIGIN_ASSUMED, 0 };
  if (!aw_record_begin(record, context->who, error) || !aw_record_set_frames(record, scan->frames, error) ||
      !aw_record_set_fact(record, AW_FACT_CREATED_AT, now, error) ||
      !aw_record_set_fact_double(record, AW_FACT_PIXEL_UM, pixel_um, error) ||
      !aw_record_set_fact_double(record, AW_FACT_OVERVIEW_LOW, scan->black, error) ||
      !aw_record_set_fact_double(record, AW_FACT_OVERVIEW_HIGH, scan->white, error) ||
      (pixel_um > 0 && !aw_record_set_pixel_map(record, &map, error)) || aw_progress_stopped(context->progress, error))
    return FALSE;
  g_autofree char *action = g_strdup_printf("started the record from %u frames", scan->frames->len);
  return aw_record_commit(record, action, error);
}

gboolean aw_step_start(const char *path, const AwStartSettings *settings, const AwStepContext *context,
                       AwStartSummary *summary, GError **error)
{
  double pixel_um;
  g_autoptr(AwRecord) record = aw_record_create(path, error);
  if (!record)
    return FALSE;
  g_auto(Scan) scan = { .settings = settings, .record = record };
  scan.frames = g_ptr_array_new_with_free_func((GDestroyNotify)aw_frame_free);
  scan.rows =
      settings->scan_table ? rows_of_table(settings->scan_table, context, error) : rows_of_images(settings->images);
  if (!scan.rows || !read_images(&scan, context, error) || !check_pixel_sizes(&scan, &pixel_um, error))
    return FALSE;
  warn_of_gaps(&scan, pixel_um, context);
  summarise(&scan, pixel_um, summary);
  return store(&scan, pixel_um, context, error);
}

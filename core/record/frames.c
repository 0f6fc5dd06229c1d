/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/error.h"
#include "base/limits.h"
#include "record/private.h"

AwFrame *aw_frame_new(void)
{
  AwFrame *frame = g_new0(AwFrame, 1);
  frame->channel = -1;
  frame->taken_at_unix_s = NAN;
  return frame;
}

void aw_frame_free(AwFrame *frame)
{
  if (!frame)
    return;
  g_free(frame->file);
  g_free(frame->sha256);
  g_clear_pointer(&frame->overview, g_bytes_unref);
  g_free(frame);
}

static void bind_overview(sqlite3_stmt *put, int at, GBytes *overview)
{
  gsize n_bytes = 0;
  const void *bytes = overview ? g_bytes_get_data(overview, &n_bytes) : NULL;
  if (bytes)
    sqlite3_bind_blob64(put, at, bytes, n_bytes, SQLITE_STATIC);
}

static gboolean put_frame(AwRecord *record, gsize number, const AwFrame *frame, GError **error)
{
  sqlite3_stmt *put = aw_sql_prepare(
      record,
      "INSERT INTO frame VALUES(?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?) ON CONFLICT(number) DO UPDATE SET"
      " file = excluded.file, page = excluded.page, channel = excluded.channel, width_px = excluded.width_px,"
      " height_px = excluded.height_px, full_scale = excluded.full_scale, stage_x_um = excluded.stage_x_um,"
      " stage_y_um = excluded.stage_y_um, pixel_um = excluded.pixel_um, taken_at_unix_s = excluded.taken_at_unix_s,"
      " size_bytes = excluded.size_bytes, sha256 = excluded.sha256, overview = excluded.overview",
      error);
  if (!put)
    return FALSE;
  sqlite3_bind_int64(put, 1, (gint64)number);
  aw_sql_bind_text(put, 2, frame->file);
  sqlite3_bind_int(put, 3, frame->page);
  sqlite3_bind_int(put, 4, frame->channel);
  sqlite3_bind_int(put, 5, frame->width_px);
  sqlite3_bind_int(put, 6, frame->height_px);
  aw_sql_bind_double(put, 7, frame->full_scale);
  aw_sql_bind_double(put, 8, frame->stage.x_um);
  aw_sql_bind_double(put, 9, frame->stage.y_um);
  aw_sql_bind_double(put, 10, frame->pixel_um);
  aw_sql_bind_double(put, 11, frame->taken_at_unix_s);
  sqlite3_bind_int64(put, 12, frame->size_bytes);
  aw_sql_bind_text(put, 13, frame->sha256 ? frame->sha256 : "");
  bind_overview(put, 14, frame->overview);
  return aw_sql_run(record, put, error);
}

gboolean aw_frames_put_time(AwRecord *record, const char *file, gint64 mtime_ns, GError **error)
{
  sqlite3_stmt *put = aw_sql_prepare(
      record, "INSERT INTO file_time VALUES(?, ?) ON CONFLICT(file) DO UPDATE SET mtime_ns = excluded.mtime_ns", error);
  if (!put)
    return FALSE;
  aw_sql_bind_text(put, 1, file);
  sqlite3_bind_int64(put, 2, mtime_ns);
  return aw_sql_run(record, put, error);
}

/* Removes the frames from number `n` on; nuclei must not lie in them. */
static gboolean drop_frames_from(AwRecord *record, gsize n, GError **error)
{
  g_autoptr(sqlite3_stmt) used = aw_sql_prepare(record, "SELECT max(frame) FROM nucleus", error);
  if (!used || aw_sql_row(record, used, error) < 0)
    return FALSE;
  if (sqlite3_column_type(used, 0) != SQLITE_NULL && sqlite3_column_int64(used, 0) >= (gint64)n) {
    g_set_error(error, AW_ERROR, AW_ERROR_STATE,
                "cannot leave %" G_GSIZE_FORMAT " frames in %s: nuclei lie in frame %lld", n, record->path,
                (long long)sqlite3_column_int64(used, 0));
    return FALSE;
  }
  sqlite3_stmt *drop = aw_sql_prepare(record, "DELETE FROM frame WHERE number >= ?", error);
  if (!drop)
    return FALSE;
  sqlite3_bind_int64(drop, 1, (gint64)n);
  return aw_sql_run(record, drop, error);
}

gboolean aw_record_set_frames(AwRecord *record, GPtrArray *frames, GError **error)
{
  g_return_val_if_fail(record->in_action, FALSE);
  if (frames->len > AW_MAX_FRAMES) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "a scan of %u frames is larger than the limit of %d", frames->len,
                AW_MAX_FRAMES);
    return FALSE;
  }
  for (guint i = 0; i < frames->len; i++) {
    const AwFrame *frame = g_ptr_array_index(frames, i);
    if (!put_frame(record, i, frame, error) || !aw_frames_put_time(record, frame->file, frame->mtime_ns, error))
      return FALSE;
  }
  return drop_frames_from(record, frames->len, error);
}

static AwFrame *take_frame(sqlite3_stmt *get)
{
  AwFrame *frame = aw_frame_new();
  frame->file = g_strdup((const char *)sqlite3_column_text(get, 1)); /* a file name need not be UTF-8 */
  frame->page = sqlite3_column_int(get, 2);
  frame->channel = sqlite3_column_int(get, 3);
  frame->width_px = sqlite3_column_int(get, 4);
  frame->height_px = sqlite3_column_int(get, 5);
  frame->full_scale = sqlite3_column_double(get, 6);
  frame->stage.x_um = sqlite3_column_double(get, 7);
  frame->stage.y_um = sqlite3_column_double(get, 8);
  frame->pixel_um = sqlite3_column_double(get, 9);
  frame->taken_at_unix_s = aw_sql_double(get, 10);
  frame->size_bytes = sqlite3_column_int64(get, 11);
  frame->sha256 = aw_sql_text(get, 12);
  const void *bytes = sqlite3_column_blob(get, 13);
  if (bytes)
    frame->overview = g_bytes_new(bytes, (gsize)sqlite3_column_bytes(get, 13));
  frame->mtime_ns = sqlite3_column_int64(get, 14);
  return frame;
}

static gboolean is_side(int side_px)
{
  return side_px >= 1 && side_px <= AW_MAX_SIDE_PX;
}

static gboolean is_reading(double um)
{
  return isfinite(um) && fabs(um) <= AW_MAX_COORDINATE_UM;
}

static gboolean frame_is_sane(const AwFrame *frame)
{
  return frame->file && *frame->file && frame->page >= 0 && frame->channel >= -1 && is_side(frame->width_px) &&
         is_side(frame->height_px) && is_reading(frame->stage.x_um) && is_reading(frame->stage.y_um) &&
         frame->full_scale >= 0 && frame->pixel_um >= 0 && isfinite(frame->pixel_um);
}

GPtrArray *aw_record_frames(AwRecord *record, GError **error)
{
  g_autoptr(GPtrArray) frames = g_ptr_array_new_with_free_func((GDestroyNotify)aw_frame_free);
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(record,
                                               "SELECT frame.*, ifnull(mtime_ns, 0) FROM frame"
                                               " LEFT JOIN file_time USING(file) ORDER BY number LIMIT 100001",
                                               error);
  int row = get ? aw_sql_row(record, get, error) : -1;
  for (; row > 0; row = aw_sql_row(record, get, error)) {
    AwFrame *frame = take_frame(get);
    g_ptr_array_add(frames, frame);
    if (sqlite3_column_int64(get, 0) != (gint64)frames->len - 1 || !frame_is_sane(frame) ||
        frames->len > AW_MAX_FRAMES) {
      aw_record_damaged(record, error, "frame %u is missing or impossible", frames->len - 1);
      return NULL;
    }
  }
  return row == 0 ? g_steal_pointer(&frames) : NULL;
}

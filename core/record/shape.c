/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/error.h"
#include "base/limits.h"
#include "record/private.h"

/* Both kinds of blob: one byte of version, the count, then differences between neighbours. Every number is a varint:
 * seven bits a byte, lowest first, the top bit set on all bytes but the last; signed numbers are folded as
 * 0, -1, 1, -2, ... -> 0, 1, 2, 3, ... (docs/formats-record.md). */

#define SHAPE_VERSION 1
#define MAX_VARINT_BYTES 10
#define MAX_OUTLINE_UM 1e9

static void put_unsigned(GByteArray *out, guint64 value)
{
  guint8 bytes[MAX_VARINT_BYTES];
  guint n = 0;
  for (; value > 0x7f; value >>= 7)
    bytes[n++] = (guint8)(value | 0x80);
  bytes[n++] = (guint8)value;
  g_byte_array_append(out, bytes, n);
}

static void put_signed(GByteArray *out, gint64 value)
{
  put_unsigned(out, value < 0 ? ~((guint64)value << 1) : (guint64)value << 1);
}

/* What is still to be read of a blob. */
typedef struct {
  const guint8 *at, *end;
} Cursor;

/* SQLite gives NULL for an empty blob, and C has no NULL + 0. */
static Cursor cursor_over(const guint8 *bytes, gsize n_bytes)
{
  return (Cursor){ bytes, n_bytes ? bytes + n_bytes : bytes };
}

static gboolean get_unsigned(Cursor *in, guint64 *value)
{
  *value = 0;
  for (guint shift = 0; shift < 64 && in->at < in->end; shift += 7) {
    guint8 byte = *in->at++;
    *value |= (guint64)(byte & 0x7f) << shift;
    if (!(byte & 0x80))
      return shift < 63 || byte <= 1;
  }
  return FALSE;
}

static gboolean get_signed(Cursor *in, gint64 *value)
{
  guint64 folded;
  if (!get_unsigned(in, &folded))
    return FALSE;
  *value = (gint64)(folded & 1 ? ~(folded >> 1) : folded >> 1);
  return TRUE;
}

static gboolean fail(GError **error, const char *what)
{
  g_set_error_literal(error, AW_ERROR, AW_ERROR_FORMAT, what);
  return FALSE;
}

/* Version and count; `least` is the number of bytes that one item takes at least. */
static gboolean get_header(Cursor *in, gsize least, gsize *n, GError **error)
{
  guint64 count;
  if (in->at == in->end || *in->at++ != SHAPE_VERSION)
    return fail(error, "the blob's version is not 1");
  if (!get_unsigned(in, &count) || count > (guint64)(in->end - in->at) / least)
    return fail(error, "the blob is shorter than its count says");
  *n = (gsize)count;
  return TRUE;
}

static GByteArray *start_blob(gsize n)
{
  GByteArray *out = g_byte_array_new();
  guint8 version = SHAPE_VERSION;
  g_byte_array_append(out, &version, 1);
  put_unsigned(out, n);
  return out;
}

/* TRUE when the run lies in a frame and behind the run before it (row by row, left to right, no overlap). */
static gboolean run_is_sane(const AwRun *run, const AwRun *before)
{
  gboolean inside =
      run->y >= 0 && run->y < AW_MAX_SIDE_PX && run->x0 >= 0 && run->x0 < run->x1 && run->x1 <= AW_MAX_SIDE_PX;
  return inside && (!before || run->y > before->y || (run->y == before->y && run->x0 >= before->x1));
}

GByteArray *aw_shape_pack_runs(const AwRun *runs, gsize n_runs, GError **error)
{
  g_autoptr(GByteArray) out = start_blob(n_runs);
  AwRun before = { 0, 0, 0 };
  for (gsize i = 0; i < n_runs; i++) {
    if (!run_is_sane(&runs[i], i ? &before : NULL)) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "run %" G_GSIZE_FORMAT " (row %d, columns %d to %d) is out of order",
                  i, runs[i].y, runs[i].x0, runs[i].x1);
      return NULL;
    }
    put_unsigned(out, (guint64)(runs[i].y - before.y));
    put_signed(out, runs[i].x0 - before.x0);
    put_unsigned(out, (guint64)(runs[i].x1 - runs[i].x0));
    before = runs[i];
  }
  return g_steal_pointer(&out);
}

static gboolean get_run(Cursor *in, const AwRun *before, AwRun *run)
{
  guint64 dy, length;
  gint64 dx;
  if (!get_unsigned(in, &dy) || !get_signed(in, &dx) || !get_unsigned(in, &length) || dy > AW_MAX_SIDE_PX ||
      dx > AW_MAX_SIDE_PX || dx < -AW_MAX_SIDE_PX || length > AW_MAX_SIDE_PX)
    return FALSE;
  run->y = before->y + (gint32)dy;
  run->x0 = before->x0 + (gint32)dx;
  run->x1 = run->x0 + (gint32)length;
  return TRUE;
}

gboolean aw_shape_unpack_runs(const guint8 *bytes, gsize n_bytes, AwRun **runs, gsize *n_runs, GError **error)
{
  Cursor in = cursor_over(bytes, n_bytes);
  gsize n;
  if (!get_header(&in, 3, &n, error))
    return FALSE;
  g_autofree AwRun *list = aw_try_alloc(n, sizeof *list, "the mask of a nucleus", error);
  if (!list)
    return FALSE;
  const AwRun origin = { 0, 0, 0 };
  for (gsize i = 0; i < n; i++)
    if (!get_run(&in, i ? &list[i - 1] : &origin, &list[i]) || !run_is_sane(&list[i], i ? &list[i - 1] : NULL))
      return fail(error, "a run of the mask is cut off or impossible");
  if (in.at != in.end)
    return fail(error, "bytes are left over behind the mask");
  *runs = g_steal_pointer(&list);
  *n_runs = n;
  return TRUE;
}

static gint64 to_steps(double um)
{
  return (gint64)llround(um * AW_SHAPE_STEPS_PER_UM);
}

static gboolean point_is_sane(AwScanPoint p)
{
  return fabs(p.x_um) <= MAX_OUTLINE_UM && fabs(p.y_um) <= MAX_OUTLINE_UM; /* FALSE for NaN */
}

GByteArray *aw_shape_pack_outline(const AwScanPoint *points, gsize n_points, GError **error)
{
  g_autoptr(GByteArray) out = start_blob(n_points);
  gint64 x = 0, y = 0;
  for (gsize i = 0; i < n_points; i++) {
    if (!point_is_sane(points[i])) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "point %" G_GSIZE_FORMAT " of the outline is beyond 1e9 um", i);
      return NULL;
    }
    put_signed(out, to_steps(points[i].x_um) - x);
    put_signed(out, to_steps(points[i].y_um) - y);
    x = to_steps(points[i].x_um);
    y = to_steps(points[i].y_um);
  }
  return g_steal_pointer(&out);
}

/* Adds a difference read from the blob; FALSE past the largest coordinate, so the sum cannot overflow. */
static gboolean add_step(Cursor *in, gint64 *at)
{
  const gint64 limit = (gint64)(MAX_OUTLINE_UM * AW_SHAPE_STEPS_PER_UM);
  gint64 step;
  if (!get_signed(in, &step) || step > 2 * limit || step < -2 * limit)
    return FALSE;
  *at += step;
  return *at <= limit && *at >= -limit;
}

gboolean aw_shape_unpack_outline(const guint8 *bytes, gsize n_bytes, AwScanPoint **points, gsize *n_points,
                                 GError **error)
{
  Cursor in = cursor_over(bytes, n_bytes);
  gsize n;
  if (!get_header(&in, 2, &n, error))
    return FALSE;
  g_autofree AwScanPoint *list = aw_try_alloc(n, sizeof *list, "the outline of a nucleus", error);
  if (!list)
    return FALSE;
  gint64 x = 0, y = 0;
  for (gsize i = 0; i < n; i++) {
    if (!add_step(&in, &x) || !add_step(&in, &y))
      return fail(error, "a point of the outline is cut off or impossible");
    list[i] = (AwScanPoint){ (double)x / AW_SHAPE_STEPS_PER_UM, (double)y / AW_SHAPE_STEPS_PER_UM };
  }
  if (in.at != in.end)
    return fail(error, "bytes are left over behind the outline");
  *points = g_steal_pointer(&list);
  *n_points = n;
  return TRUE;
}

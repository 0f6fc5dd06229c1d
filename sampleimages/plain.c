/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plain.h"

#include "base/output.h"

enum { SHORT = 3, LONG = 4, LONG8 = 16 };

struct PlainTiff {
  AwOutput *out;
  int width_px, height_px, tile_px;
  gboolean big;
  guint64 at;    /* bytes written */
  GArray *piece; /* guint64 offset and size of each strip or tile */
};

static void put(PlainTiff *tiff, const void *bytes, gsize n)
{
  fwrite(bytes, 1, n, aw_output_stream(tiff->out));
  tiff->at += n;
}

static void put16(PlainTiff *tiff, guint16 value)
{
  put(tiff, &value, sizeof value);
}

/* An offset or count: as wide as the form of TIFF asks for. */
static void put_wide(PlainTiff *tiff, guint64 value)
{
  guint32 narrow = (guint32)value;
  if (tiff->big)
    put(tiff, &value, sizeof value);
  else
    put(tiff, &narrow, sizeof narrow);
}

static guint64 data_bytes(const PlainTiff *tiff)
{
  guint64 t = (guint64)tiff->tile_px, w = (guint64)tiff->width_px, h = (guint64)tiff->height_px;
  return 2 * (t ? (w + t - 1) / t * ((h + t - 1) / t) * t * t : w * h);
}

PlainTiff *plain_tiff_open(const char *path, int width_px, int height_px, int tile_px, gboolean big, GError **error)
{
  AwOutput *out = aw_output_open(path, error);
  if (!out)
    return NULL;
  PlainTiff *tiff = g_new0(PlainTiff, 1);
  *tiff = (PlainTiff){ out, width_px, height_px, tile_px, big, 0, g_array_new(FALSE, FALSE, sizeof(guint64)) };
  put(tiff, G_BYTE_ORDER == G_LITTLE_ENDIAN ? "II" : "MM", 2);
  put16(tiff, big ? 43 : 42);
  if (big) {
    put16(tiff, 8);
    put16(tiff, 0);
  }
  put_wide(tiff, data_bytes(tiff) + (big ? 16 : 8));
  return tiff;
}

void plain_tiff_add(PlainTiff *tiff, const guint16 *pixels, gsize n)
{
  guint64 piece[] = { tiff->at, 2 * n };
  g_array_append_vals(tiff->piece, piece, 2);
  put(tiff, pixels, 2 * n);
}

/* A directory entry; a value that fills less than its field stands at the field's start. */
static void put_entry(PlainTiff *tiff, guint16 tag, guint16 type, guint64 n, guint64 value)
{
  put16(tiff, tag);
  put16(tiff, type);
  put_wide(tiff, n);
  if (type == SHORT) {
    put16(tiff, (guint16)value);
    for (int i = tiff->big ? 3 : 1; i > 0; i--)
      put16(tiff, 0);
  } else {
    put_wide(tiff, value);
  }
}

static void put_directory(PlainTiff *tiff, int rows_per_strip, double full_scale)
{
  guint64 n = tiff->piece->len / 2, wide = tiff->big ? 8 : 4, n_entries = tiff->tile_px ? 11 : 10;
  guint16 type = tiff->big ? LONG8 : LONG;
  guint64 after = tiff->at + (tiff->big ? 8 : 2) + n_entries * (tiff->big ? 20 : 12) + wide;
  const guint64 *piece = (const guint64 *)(const void *)tiff->piece->data;
  guint64 offsets = n == 1 ? piece[0] : after, sizes = n == 1 ? piece[1] : after + n * wide;
  if (tiff->big)
    put(tiff, &n_entries, sizeof n_entries);
  else
    put16(tiff, (guint16)n_entries);
  put_entry(tiff, 256, type, 1, (guint64)tiff->width_px);
  put_entry(tiff, 257, type, 1, (guint64)tiff->height_px);
  put_entry(tiff, 258, SHORT, 1, 16);
  put_entry(tiff, 259, SHORT, 1, 1); /* no compression */
  put_entry(tiff, 262, SHORT, 1, 1); /* black is zero */
  if (!tiff->tile_px)
    put_entry(tiff, 273, type, n, offsets);
  put_entry(tiff, 277, SHORT, 1, 1);
  if (!tiff->tile_px) {
    put_entry(tiff, 278, type, 1, (guint64)rows_per_strip);
    put_entry(tiff, 279, type, n, sizes);
  }
  put_entry(tiff, 281, SHORT, 1, (guint64)full_scale);
  if (tiff->tile_px) {
    put_entry(tiff, 322, type, 1, (guint64)tiff->tile_px);
    put_entry(tiff, 323, type, 1, (guint64)tiff->tile_px);
    put_entry(tiff, 324, type, n, offsets);
    put_entry(tiff, 325, type, n, sizes);
  }
  put_wide(tiff, 0);
  for (guint64 k = 0; n > 1 && k < 2; k++)
    for (guint64 i = 0; i < n; i++)
      put_wide(tiff, piece[2 * i + k]);
}

gboolean plain_tiff_finish(PlainTiff *tiff, int rows_per_strip, double full_scale, GError **error)
{
  put_directory(tiff, rows_per_strip, full_scale);
  return aw_output_commit(tiff->out, error);
}

void plain_tiff_free(PlainTiff *tiff)
{
  if (!tiff)
    return;
  aw_output_free(tiff->out);
  g_array_unref(tiff->piece);
  g_free(tiff);
}

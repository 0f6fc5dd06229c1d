/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/tiff_write.h"

#include <string.h>

#include "base/limits.h"
#include "image/tiff_file.h"

#define STRIP_BYTES ((gsize)1 << 18)
#define MAX_CLASSIC_BYTES G_GINT64_CONSTANT(3500000000)

/* libtiff goes back to fill in its header, which a pipe cannot do; the compressed file is therefore made in memory. */
typedef struct {
  guint8 *data;
  gsize size, capacity, at;
} Memory;

static tmsize_t memory_read(thandle_t handle, void *out, tmsize_t n)
{
  Memory *m = handle;
  gsize left = m->size - MIN(m->at, m->size), take = MIN((gsize)n, left);
  memcpy(out, m->data + m->at, take);
  m->at += take;
  return (tmsize_t)take;
}

static tmsize_t memory_write(thandle_t handle, void *bytes, tmsize_t n)
{
  Memory *m = handle;
  gsize end = m->at + (gsize)n;
  if (end > m->capacity) {
    gsize capacity = MAX(end, m->capacity + m->capacity / 2);
    guint8 *data = g_try_realloc(m->data, capacity);
    if (!data)
      return 0;
    memset(data + m->capacity, 0, capacity - m->capacity);
    m->data = data;
    m->capacity = capacity;
  }
  memcpy(m->data + m->at, bytes, (gsize)n);
  m->at = end;
  m->size = MAX(m->size, end);
  return n;
}

static toff_t memory_seek(thandle_t handle, toff_t to, int from)
{
  Memory *m = handle;
  m->at = from == SEEK_SET ? to : from == SEEK_CUR ? m->at + to : m->size + to;
  return m->at;
}

static int memory_close(thandle_t handle)
{
  (void)handle;
  return 0;
}

static toff_t memory_size(thandle_t handle)
{
  return ((Memory *)handle)->size;
}

static gsize sample_bytes(const AwTiffPicture *p)
{
  return p->label ? (p->wide ? 4 : 2) : aw_sample_bytes(p->sample);
}

static void set_resolution(TIFF *tif, double pixel_um)
{
  TIFFSetField(tif, TIFFTAG_RESOLUTIONUNIT, RESUNIT_CENTIMETER);
  TIFFSetField(tif, TIFFTAG_XRESOLUTION, 1e4 / pixel_um);
  TIFFSetField(tif, TIFFTAG_YRESOLUTION, 1e4 / pixel_um);
}

static void set_tags(TIFF *tif, const AwTiffPicture *p, int rows)
{
  gboolean is_float = !p->label && p->sample == AW_SAMPLE_F32;
  TIFFSetField(tif, TIFFTAG_IMAGEWIDTH, (guint32)p->width_px);
  TIFFSetField(tif, TIFFTAG_IMAGELENGTH, (guint32)p->height_px);
  TIFFSetField(tif, TIFFTAG_BITSPERSAMPLE, (int)sample_bytes(p) * 8);
  TIFFSetField(tif, TIFFTAG_SAMPLESPERPIXEL, 1);
  TIFFSetField(tif, TIFFTAG_SAMPLEFORMAT, is_float ? SAMPLEFORMAT_IEEEFP : SAMPLEFORMAT_UINT);
  TIFFSetField(tif, TIFFTAG_PHOTOMETRIC, PHOTOMETRIC_MINISBLACK);
  TIFFSetField(tif, TIFFTAG_PLANARCONFIG, PLANARCONFIG_CONTIG);
  TIFFSetField(tif, TIFFTAG_ROWSPERSTRIP, (guint32)rows);
  TIFFSetField(tif, TIFFTAG_COMPRESSION, COMPRESSION_ADOBE_DEFLATE);
  if (!is_float)
    TIFFSetField(tif, TIFFTAG_PREDICTOR, PREDICTOR_HORIZONTAL);
  if (!p->label && p->sample == AW_SAMPLE_U16 && p->full_scale > 0 && p->full_scale < 65535)
    TIFFSetField(tif, TIFFTAG_MAXSAMPLEVALUE, (int)p->full_scale);
  if (p->pixel_um > 0)
    set_resolution(tif, p->pixel_um);
}

/* The samples of `n` pixels from pixel `first` on, as the file holds them. */
static void fill(const AwTiffPicture *p, gsize first, gsize n, guint8 *out)
{
  if (!p->label)
    memcpy(out, (const guint8 *)p->pixels + first * sample_bytes(p), n * sample_bytes(p));
  else if (p->wide)
    memcpy(out, p->label + first, n * 4);
  for (gsize i = 0; p->label && !p->wide && i < n; i++) {
    guint16 label = (guint16)p->label[first + i];
    memcpy(out + i * 2, &label, 2);
  }
}

static gboolean write_strips(TIFF *tif, const AwTiffPicture *p, int rows, GError **error)
{
  gsize row_px = (gsize)p->width_px;
  g_autofree guint8 *strip = aw_try_alloc(row_px * (gsize)rows, sample_bytes(p), "a strip of a TIFF file", error);
  if (!strip)
    return FALSE;
  for (int y = 0, i = 0; y < p->height_px; y += rows, i++) {
    gsize n = row_px * (gsize)MIN(rows, p->height_px - y);
    fill(p, (gsize)y * row_px, n, strip);
    tmsize_t bytes = (tmsize_t)(n * sample_bytes(p));
    if (TIFFWriteEncodedStrip(tif, (guint32)i, strip, bytes) == bytes)
      continue;
    g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "not enough memory to compress an image of %d x %d px", p->width_px,
                p->height_px);
    return FALSE;
  }
  return TRUE;
}

static TIFF *open_memory(Memory *memory, AwTiffLog *log, gint64 raw_bytes)
{
  TIFFOpenOptions *options = aw_tiff_options(log);
  TIFF *tif = TIFFClientOpenExt("memory", raw_bytes > MAX_CLASSIC_BYTES ? "wlm8" : "wlm", memory, memory_read,
                                memory_write, memory_seek, memory_close, memory_size, NULL, NULL, options);
  TIFFOpenOptionsFree(options);
  return tif;
}

GBytes *aw_tiff_encode(const AwTiffPicture *p, GError **error)
{
  Memory memory = { 0 };
  AwTiffLog log = { 0 };
  gsize row_bytes = (gsize)p->width_px * sample_bytes(p);
  int rows = (int)CLAMP(STRIP_BYTES / row_bytes, 1, (gsize)p->height_px);
  TIFF *tif = open_memory(&memory, &log, (gint64)row_bytes * p->height_px);
  gboolean ok = tif != NULL;
  if (tif) {
    set_tags(tif, p, rows);
    ok = write_strips(tif, p, rows, error) && TIFFWriteDirectory(tif);
    TIFFClose(tif);
  }
  if (log.complaint)
    ok = FALSE;
  if (!ok && error && !*error)
    g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "an image of %d x %d px cannot be compressed: %s", p->width_px,
                p->height_px, log.complaint ? log.complaint : "not enough memory");
  aw_tiff_log_clear(&log);
  if (ok)
    return g_bytes_new_take(memory.data, memory.size);
  g_free(memory.data);
  return NULL;
}

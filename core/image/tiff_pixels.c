/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/tiff_pixels.h"

#include "base/limits.h"

struct AwTiffPixels {
  AwTiffFile *file;
  const AwTiffForm *form;
  int sample;
  guint8 *strile;   /* decoded strip or tile `held`, or one row of a strip too long to be held */
  gint64 held;      /* -1: none */
  gint64 row_strip; /* the strip that is being read row by row, and the row it stands at */
  int row_next;
};

/* One walk over the rectangle: takes the values, or compares a further plane with what was taken. */
typedef struct {
  AwTiffPixels *pixels;
  AwRect rect;
  AwImage *image;
  int plane;  /* of separate planes; 0 otherwise */
  int sample; /* within a decoded row; -1: all of the row's must agree */
  gboolean compare;
} Walk;

AwTiffPixels *aw_tiff_pixels_new(AwTiffFile *file, const AwTiffForm *form, int sample)
{
  AwTiffPixels *pixels = g_new0(AwTiffPixels, 1);
  *pixels = (AwTiffPixels){ file, form, form->n_samples == 1 ? 0 : sample, NULL, -1, -1, 0 };
  return pixels;
}

void aw_tiff_pixels_free(AwTiffPixels *pixels)
{
  if (!pixels)
    return;
  g_free(pixels->strile);
  g_free(pixels);
}

static guint8 *target(const Walk *walk, int x, int y)
{
  gsize i = (gsize)(y - walk->rect.y0) * (gsize)walk->image->width_px + (gsize)(x - walk->rect.x0);
  return (guint8 *)walk->image->pixels + i * aw_sample_bytes(walk->image->sample);
}

static gboolean fault(const Walk *walk, AwPixelFault what, int x, int y, GError **error)
{
  aw_pixels_fault_error(what, walk->pixels->file->place, walk->pixels->form->n_samples, x, y, error);
  return FALSE;
}

static gboolean check_finite(const Walk *walk, int x0, int x1, int y, GError **error)
{
  int bad = aw_pixels_not_finite(walk->image->sample, target(walk, x0, y), x1 - x0);
  return bad < 0 || fault(walk, AW_PIXELS_NOT_FINITE, x0 + bad, y, error);
}

/* Puts columns x0 ... x1-1 of row y in place; the decoded row at `raw` begins with column raw_x. */
static gboolean place_row(const Walk *walk, const guint8 *raw, int raw_x, int x0, int x1, int y, GError **error)
{
  const AwPixelForm *form = &walk->pixels->form->pixel;
  guint8 *out = target(walk, x0, y);
  int first = x0 - raw_x, n = x1 - x0, from = MAX(walk->sample, 0), to = walk->sample < 0 ? form->n_samples : from + 1;
  if (!walk->compare)
    aw_pixels_take(form, from, raw, first, n, out);
  for (int s = walk->compare ? from : from + 1; s < to; s++) {
    int bad = aw_pixels_differ(form, s, raw, first, n, out);
    if (bad >= 0)
      return fault(walk, AW_PIXELS_COLOURED, x0 + bad, y, error);
  }
  return check_finite(walk, x0, x1, y, error);
}

static gboolean have_buffer(AwTiffPixels *pixels, GError **error)
{
  const AwTiffForm *form = pixels->form;
  gint64 bytes = (gint64)form->row_bytes * form->strile_height_px;
  gsize n = form->is_stored || bytes > AW_TIFF_MAX_STRILE_BYTES ? form->row_bytes : (gsize)bytes;
  if (!pixels->strile)
    pixels->strile = aw_try_alloc(n, 1, "a strip or tile of a TIFF file", error);
  return pixels->strile != NULL;
}

static gboolean decode_strile(AwTiffPixels *pixels, gint64 index, void *out, gsize bytes, GError **error)
{
  AwTiffFile *file = pixels->file;
  aw_tiff_log_clear(&file->log);
  pixels->row_strip = -1;
  tmsize_t got = pixels->form->is_tiled ? TIFFReadEncodedTile(file->tif, (guint32)index, out, (tmsize_t)bytes)
                                        : TIFFReadEncodedStrip(file->tif, (guint32)index, out, (tmsize_t)bytes);
  if (got == (tmsize_t)bytes && !file->log.complaint)
    return TRUE;
  return aw_tiff_fail(file, AW_ERROR_FORMAT, error, "is damaged: %s %" G_GINT64_FORMAT " cannot be decoded",
                      pixels->form->is_tiled ? "tile" : "strip", index);
}

static gboolean hold_strile(AwTiffPixels *pixels, gint64 index, gsize bytes, GError **error)
{
  if (pixels->held == index)
    return TRUE;
  pixels->held = -1;
  if (!have_buffer(pixels, error) || !decode_strile(pixels, index, pixels->strile, bytes, error))
    return FALSE;
  pixels->held = index;
  return TRUE;
}

/* TRUE when the decoded bytes are the values: then a whole strip is decoded straight into the image. */
static gboolean is_plain(const Walk *walk)
{
  const AwTiffForm *form = walk->pixels->form;
  return !walk->compare && form->pixel.n_samples == 1 && !form->pixel.inverted &&
         (form->pixel.bits == 8 || form->pixel.bits == 16 || form->pixel.bits == 32);
}

/* Files may be of the other byte order; libtiff turns round only what it decodes itself. */
static void swap_samples(const AwTiffPixels *pixels, void *values, gsize n)
{
  if (!TIFFIsByteSwapped(pixels->file->tif))
    return;
  if (pixels->form->pixel.bits == 16)
    TIFFSwabArrayOfShort(values, (tmsize_t)n);
  else if (pixels->form->pixel.bits == 32)
    TIFFSwabArrayOfLong(values, (tmsize_t)n);
}

static gboolean read_stored_rows(const Walk *walk, gint64 at, GError **error)
{
  AwTiffPixels *p = walk->pixels;
  const AwPixelForm *form = &p->form->pixel;
  gsize row_bytes = p->form->row_bytes, pixel_bytes = (gsize)(form->bits * form->n_samples) / 8;
  gboolean whole_bytes = form->bits % 8 == 0;
  int first = whole_bytes ? walk->rect.x0 : 0; /* packed rows are read from their beginning */
  gsize skip = (gsize)first * pixel_bytes, n = whole_bytes ? (gsize)walk->image->width_px * pixel_bytes : row_bytes;
  if (!have_buffer(p, error))
    return FALSE;
  for (int y = walk->rect.y0; y < walk->rect.y1; y++) {
    gint64 from = at + (gint64)row_bytes * y + (gint64)skip;
    if (!aw_tiff_file_bytes(p->file, from, p->strile, n, error))
      return FALSE;
    swap_samples(p, p->strile, n * 8 / (gsize)form->bits);
    if (!place_row(walk, p->strile, first, walk->rect.x0, walk->rect.x1, y, error))
      return FALSE;
  }
  return TRUE;
}

static gboolean read_stored(const Walk *walk, GError **error)
{
  AwTiffPixels *p = walk->pixels;
  gint64 at = (gint64)TIFFGetStrileOffset(p->file->tif, (guint32)walk->plane * p->form->n_striles);
  if (!is_plain(walk) || walk->image->width_px != p->form->width_px)
    return read_stored_rows(walk, at, error);
  gsize n = p->form->row_bytes * (gsize)walk->image->height_px;
  if (!aw_tiff_file_bytes(p->file, at + (gint64)p->form->row_bytes * walk->rect.y0, walk->image->pixels, n, error))
    return FALSE;
  swap_samples(p, walk->image->pixels, n * 8 / (gsize)p->form->pixel.bits);
  for (int y = walk->rect.y0; y < walk->rect.y1; y++)
    if (!check_finite(walk, walk->rect.x0, walk->rect.x1, y, error))
      return FALSE;
  return TRUE;
}

static gboolean decode_in_place(const Walk *walk, gint64 index, int y0, int n_rows, GError **error)
{
  gsize bytes = walk->pixels->form->row_bytes * (gsize)n_rows;
  if (!decode_strile(walk->pixels, index, target(walk, 0, y0), bytes, error))
    return FALSE;
  for (int y = y0; y < y0 + n_rows; y++)
    if (!check_finite(walk, 0, walk->image->width_px, y, error))
      return FALSE;
  return TRUE;
}

/* A compressed strip can only be read from its top; reading on from where the last call stopped saves most of that. */
static gboolean read_by_rows(const Walk *walk, gint64 index, int strip_y0, int y0, int y1, GError **error)
{
  AwTiffPixels *p = walk->pixels;
  if (!have_buffer(p, error))
    return FALSE;
  p->held = -1;
  if (TIFFScanlineSize(p->file->tif) != (tmsize_t)p->form->row_bytes)
    return aw_tiff_fail(p->file, AW_ERROR_FORMAT, error, "has rows of an unforeseen length");
  int y = p->row_strip == index && p->row_next <= y0 ? p->row_next : strip_y0;
  aw_tiff_log_clear(&p->file->log);
  for (p->row_strip = -1; y < y1; y++) {
    if (TIFFReadScanline(p->file->tif, p->strile, (guint32)y, (guint16)walk->plane) != 1 || p->file->log.complaint)
      return aw_tiff_fail(p->file, AW_ERROR_FORMAT, error, "is damaged: row %d cannot be decoded", y);
    if (y >= y0 && !place_row(walk, p->strile, 0, walk->rect.x0, walk->rect.x1, y, error))
      return FALSE;
  }
  p->row_strip = index;
  p->row_next = y1;
  return TRUE;
}

static gboolean read_strip(const Walk *walk, gint64 index, int strip_y0, int y1, GError **error)
{
  const AwTiffForm *form = walk->pixels->form;
  int n_rows = aw_tiff_form_strip_rows(form, strip_y0), y0 = MAX(strip_y0, walk->rect.y0);
  if ((gint64)form->row_bytes * form->strile_height_px > AW_TIFF_MAX_STRILE_BYTES)
    return read_by_rows(walk, index, strip_y0, y0, y1, error);
  gboolean whole = walk->image->width_px == form->width_px && y1 - strip_y0 == n_rows && y0 == strip_y0;
  if (whole && is_plain(walk))
    return decode_in_place(walk, index, y0, n_rows, error);
  if (!hold_strile(walk->pixels, index, form->row_bytes * (gsize)n_rows, error))
    return FALSE;
  for (int y = y0; y < y1; y++)
    if (!place_row(walk, walk->pixels->strile + (gsize)(y - strip_y0) * form->row_bytes, 0, walk->rect.x0,
                   walk->rect.x1, y, error))
      return FALSE;
  return TRUE;
}

static gboolean read_tile(const Walk *walk, int column, int row, GError **error)
{
  const AwTiffForm *form = walk->pixels->form;
  gint64 index = (gint64)walk->plane * form->n_striles + (gint64)row * form->n_across + column;
  if (!hold_strile(walk->pixels, index, form->row_bytes * (gsize)form->strile_height_px, error))
    return FALSE;
  int tile_x0 = column * form->strile_width_px, tile_y0 = row * form->strile_height_px;
  int x0 = MAX(tile_x0, walk->rect.x0), x1 = MIN(tile_x0 + form->strile_width_px, walk->rect.x1);
  int y0 = MAX(tile_y0, walk->rect.y0), y1 = MIN(tile_y0 + form->strile_height_px, walk->rect.y1);
  for (int y = y0; y < y1; y++)
    if (!place_row(walk, walk->pixels->strile + (gsize)(y - tile_y0) * form->row_bytes, tile_x0, x0, x1, y, error))
      return FALSE;
  return TRUE;
}

static gboolean walk_striles(const Walk *walk, GError **error)
{
  const AwTiffForm *form = walk->pixels->form;
  if (form->is_stored)
    return read_stored(walk, error);
  int height = form->strile_height_px, width = form->strile_width_px;
  for (int row = walk->rect.y0 / height; row <= (walk->rect.y1 - 1) / height; row++) {
    gint64 strip = (gint64)walk->plane * form->n_striles + row;
    int y1 = MIN(row * height + aw_tiff_form_strip_rows(form, row * height), walk->rect.y1);
    if (!form->is_tiled && !read_strip(walk, strip, row * height, y1, error))
      return FALSE;
    for (int c = walk->rect.x0 / width; form->is_tiled && c <= (walk->rect.x1 - 1) / width; c++)
      if (!read_tile(walk, c, row, error))
        return FALSE;
  }
  return TRUE;
}

gboolean aw_tiff_pixels_read(AwTiffPixels *pixels, AwRect rect, AwImage *image, GError **error)
{
  const AwTiffForm *form = pixels->form;
  image->full_scale = form->pixel.full_scale;
  Walk walk = { pixels, rect, image, 0, pixels->sample, FALSE };
  if (!form->is_separate)
    return walk_striles(&walk, error);
  int from = MAX(pixels->sample, 0), to = pixels->sample < 0 ? form->n_samples : from + 1;
  walk.sample = 0;
  for (walk.plane = from; walk.plane < to; walk.plane++) {
    walk.compare = walk.plane > from;
    if (!walk_striles(&walk, error))
      return FALSE;
  }
  return TRUE;
}

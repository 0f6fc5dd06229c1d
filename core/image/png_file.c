/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/png_file.h"

#include <errno.h>
#include <math.h>
#include <png.h>
#include <string.h>
#include <sys/stat.h>

#include "base/error.h"
#include "base/limits.h"
#include "image/pixels.h"

#define MAX_CHUNK_BYTES (8u << 20)
#define MAX_PIXEL_UM 50 /* as for TIFF: above, the resolution is a screen's or printer's */

struct AwPngFile {
  char *name;
  FILE *file;    /* or */
  GBytes *bytes; /* the source */
  gsize at;
  png_structp png;
  png_infop info;
  char *complaint;
  AwPixelForm form;
  AwImageInfo about;
  int sample;
  int next_row;
  guint8 *row;
};

static void on_error(png_structp png, const char *message)
{
  AwPngFile *p = png_get_error_ptr(png);
  if (!p->complaint)
    p->complaint = g_utf8_make_valid(message, -1);
  png_longjmp(png, 1);
}

static void on_warning(png_structp png, const char *message)
{
  (void)png;
  (void)message;
}

static void read_source(png_structp png, png_bytep out, size_t n)
{
  AwPngFile *p = png_get_io_ptr(png);
  if (p->file) {
    if (fread(out, 1, n, p->file) != n)
      png_error(png, "the file ends too early");
    return;
  }
  gsize size;
  const guint8 *bytes = g_bytes_get_data(p->bytes, &size);
  if (n > size - p->at)
    png_error(png, "the data end too early");
  memcpy(out, bytes + p->at, n);
  p->at += n;
}

/* libpng leaves these by longjmp when something is wrong; none of them keeps a local that changes. */
static gboolean guarded_header(AwPngFile *p)
{
  if (setjmp(png_jmpbuf(p->png)))
    return FALSE;
  png_set_read_fn(p->png, p, read_source);
  png_set_user_limits(p->png, AW_MAX_SIDE_PX, AW_MAX_SIDE_PX);
  png_set_chunk_malloc_max(p->png, MAX_CHUNK_BYTES);
  png_set_chunk_cache_max(p->png, 64);
  png_read_info(p->png, p->info);
  return TRUE;
}

static gboolean guarded_start(AwPngFile *p)
{
  if (setjmp(png_jmpbuf(p->png)))
    return FALSE;
  if (p->form.bits == 16 && G_BYTE_ORDER == G_LITTLE_ENDIAN)
    png_set_swap(p->png);
  png_read_update_info(p->png, p->info);
  return png_get_rowbytes(p->png, p->info) == aw_pixels_row_bytes(&p->form, p->about.width_px);
}

/* The end is read too, so that a broken checksum of the last rows is noticed. */
static gboolean guarded_row(AwPngFile *p)
{
  if (setjmp(png_jmpbuf(p->png)))
    return FALSE;
  png_read_row(p->png, p->row, NULL);
  if (p->next_row == p->about.height_px - 1)
    png_read_end(p->png, NULL);
  p->next_row++;
  return TRUE;
}

static gint64 source_bytes(const AwPngFile *p)
{
  if (!p->file)
    return (gint64)g_bytes_get_size(p->bytes);
  struct stat about;
  return fstat(fileno(p->file), &about) == 0 ? about.st_size : 0;
}

static gboolean fail(const AwPngFile *p, AwErrorCode code, GError **error, const char *text)
{
  g_set_error(error, AW_ERROR, code, "%s %s%s%s", p->name, text, p->complaint ? ": " : "",
              p->complaint ? p->complaint : "");
  return FALSE;
}

static gboolean begin(AwPngFile *p, GError **error)
{
  png_destroy_read_struct(&p->png, &p->info, NULL);
  g_clear_pointer(&p->complaint, g_free);
  p->at = 0;
  if (p->file)
    rewind(p->file);
  p->png = png_create_read_struct(PNG_LIBPNG_VER_STRING, p, on_error, on_warning);
  p->info = p->png ? png_create_info_struct(p->png) : NULL;
  if (!p->info)
    return fail(p, AW_ERROR_MEMORY, error, "cannot be read: not enough memory");
  return guarded_header(p) || fail(p, AW_ERROR_FORMAT, error, "is a damaged PNG");
}

static gboolean check_form(AwPngFile *p, GError **error)
{
  int colour = png_get_color_type(p->png, p->info);
  if (colour & PNG_COLOR_MASK_PALETTE)
    return fail(p, AW_ERROR_UNSUPPORTED, error, "is a palette PNG, which is not read; save it as grey");
  if (colour & PNG_COLOR_MASK_ALPHA)
    return fail(p, AW_ERROR_UNSUPPORTED, error, "is a PNG with transparency, which is not read; save it as grey");
  if (png_get_interlace_type(p->png, p->info) != PNG_INTERLACE_NONE)
    return fail(p, AW_ERROR_UNSUPPORTED, error, "is an interlaced PNG, which is not read; save it without interlacing");
  p->form.bits = png_get_bit_depth(p->png, p->info);
  p->form.n_samples = colour & PNG_COLOR_MASK_COLOR ? 3 : 1;
  p->form.full_scale = (1 << p->form.bits) - 1;
  return TRUE;
}

static double pixel_um(png_uint_32 per_metre)
{
  double um = per_metre > 0 ? 1e6 / per_metre : 0;
  return um <= MAX_PIXEL_UM ? um : 0;
}

static void take_info(AwPngFile *p)
{
  AwImageInfo *about = &p->about;
  about->width_px = (int)png_get_image_width(p->png, p->info);
  about->height_px = (int)png_get_image_height(p->png, p->info);
  about->sample = aw_pixels_sample(&p->form);
  about->full_scale = p->form.full_scale;
  about->pixel_um = pixel_um(png_get_x_pixels_per_meter(p->png, p->info));
  about->pixel_y_um = pixel_um(png_get_y_pixels_per_meter(p->png, p->info));
  if (about->pixel_y_um <= 0)
    about->pixel_y_um = about->pixel_um;
  about->taken_at_unix_s = NAN;
}

/* Deflate (RFC 1951) gives at most 1032 bytes for one: refuses what no file of this size can hold. */
static gboolean check_claim(const AwPngFile *p, GError **error)
{
  gint64 bytes = (gint64)aw_pixels_row_bytes(&p->form, p->about.width_px) * p->about.height_px;
  if (bytes / 1032 <= source_bytes(p))
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT,
              "%s is cut off or damaged: it claims %d x %d px, %" G_GINT64_FORMAT
              " bytes of pixels, in a file of %" G_GINT64_FORMAT " bytes",
              p->name, p->about.width_px, p->about.height_px, bytes, source_bytes(p));
  return FALSE;
}

static AwPngFile *open_source(AwPngFile *source, int channel, GError **error)
{
  g_autoptr(AwPngFile) p = source;
  if (!begin(p, error) || !check_form(p, error))
    return NULL;
  take_info(p);
  if (!check_claim(p, error))
    return NULL;
  gboolean must_agree = channel < 0 && p->form.n_samples == 3;
  if (!must_agree && !aw_pixels_check_channel(p->name, channel, p->form.n_samples, NULL, error))
    return NULL;
  p->sample = must_agree ? -1 : MAX(channel, 0);
  if (!guarded_start(p)) {
    fail(p, AW_ERROR_FORMAT, error, "is a damaged PNG");
    return NULL;
  }
  p->row = aw_try_alloc(aw_pixels_row_bytes(&p->form, p->about.width_px), 1, "a row of a PNG file", error);
  return p->row ? g_steal_pointer(&p) : NULL;
}

AwPngFile *aw_png_file_open(const char *path, int channel, GError **error)
{
  AwPngFile *p = g_new0(AwPngFile, 1);
  p->name = g_strdup(path);
  p->file = fopen(path, "rbe");
  if (p->file)
    return open_source(p, channel, error);
  g_set_error(error, AW_ERROR, AW_ERROR_IO, "%s cannot be read: %s", path, g_strerror(errno));
  aw_png_file_free(p);
  return NULL;
}

AwPngFile *aw_png_file_open_bytes(GBytes *bytes, const char *name, int channel, GError **error)
{
  AwPngFile *p = g_new0(AwPngFile, 1);
  p->name = g_strdup(name);
  p->bytes = g_bytes_ref(bytes);
  return open_source(p, channel, error);
}

void aw_png_file_free(AwPngFile *p)
{
  if (!p)
    return;
  png_destroy_read_struct(&p->png, &p->info, NULL);
  if (p->file)
    fclose(p->file);
  if (p->bytes)
    g_bytes_unref(p->bytes);
  g_free(p->row);
  g_free(p->complaint);
  g_free(p->name);
  g_free(p);
}

const AwImageInfo *aw_png_file_info(const AwPngFile *p)
{
  return &p->about;
}

int aw_png_file_n_channels(const AwPngFile *p)
{
  return p->form.n_samples;
}

static gboolean place_row(const AwPngFile *p, AwRect rect, int y, AwImage *image, GError **error)
{
  gsize row_bytes = (gsize)image->width_px * aw_sample_bytes(image->sample);
  guint8 *out = (guint8 *)image->pixels + (gsize)(y - rect.y0) * row_bytes;
  aw_pixels_take(&p->form, MAX(p->sample, 0), p->row, rect.x0, image->width_px, out);
  for (int s = 1; p->sample < 0 && s < p->form.n_samples; s++) {
    int bad = aw_pixels_differ(&p->form, s, p->row, rect.x0, image->width_px, out);
    if (bad < 0)
      continue;
    aw_pixels_fault_error(AW_PIXELS_COLOURED, p->name, p->form.n_samples, rect.x0 + bad, y, error);
    return FALSE;
  }
  return TRUE;
}

gboolean aw_png_file_read(AwPngFile *p, AwRect rect, AwImage *image, GError **error)
{
  image->full_scale = p->form.full_scale;
  if (p->next_row > rect.y0) {
    if (!begin(p, error))
      return FALSE;
    if (!guarded_start(p))
      return fail(p, AW_ERROR_FORMAT, error, "is a damaged PNG");
    p->next_row = 0;
  }
  while (p->next_row < rect.y1) {
    int y = p->next_row;
    if (!guarded_row(p)) {
      p->next_row = G_MAXINT; /* a handle that failed is begun anew */
      return fail(p, AW_ERROR_FORMAT, error, "is a damaged PNG");
    }
    if (y >= rect.y0 && !place_row(p, rect, y, image, error))
      return FALSE;
  }
  return TRUE;
}

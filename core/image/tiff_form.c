/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/tiff_form.h"

#include <math.h>

#include "base/limits.h"

/* Above this a resolution tag is a printer's or screen's (300 dpi is 85 µm, 72 dpi 353 µm), not a microscope's. */
#define MAX_PIXEL_UM 50
#define MIN_PIXEL_UM 1e-4
#define MAX_SAMPLES 64

static guint16 tag16(const AwTiffFile *file, guint32 tag, guint16 fallback)
{
  guint16 value = fallback;
  return TIFFGetFieldDefaulted(file->tif, tag, &value) ? value : fallback;
}

static guint32 tag32(const AwTiffFile *file, guint32 tag)
{
  guint32 value = 0;
  return TIFFGetFieldDefaulted(file->tif, tag, &value) ? value : 0;
}

static gboolean check_size(const AwTiffFile *file, AwTiffForm *form, GError **error)
{
  if (!aw_tiff_file_check_size(file, error))
    return FALSE;
  if (tag32(file, TIFFTAG_IMAGEDEPTH) > 1)
    return aw_tiff_fail(file, AW_ERROR_UNSUPPORTED, error, "is a volume of depth %u; only flat planes are read",
                        tag32(file, TIFFTAG_IMAGEDEPTH));
  form->width_px = (int)tag32(file, TIFFTAG_IMAGEWIDTH);
  form->height_px = (int)tag32(file, TIFFTAG_IMAGELENGTH);
  return TRUE;
}

/* Bytes that one stored byte can at most decode to: PackBits run, Deflate's RFC 1951 limit, LZW's longest string in
 * 12 bits, Zstandard's 128 KiB block in 4 bytes (RFC 8878). 0 for what is not read. */
static gint64 most_expansion(guint16 compression)
{
  switch (compression) {
  case COMPRESSION_NONE:
    return 1;
  case COMPRESSION_PACKBITS:
    return 64;
  case COMPRESSION_DEFLATE:
  case COMPRESSION_ADOBE_DEFLATE:
    return 1032;
  case COMPRESSION_LZW:
    return 2731;
  case COMPRESSION_ZSTD:
    return 32768;
  default:
    return 0;
  }
}

static gboolean check_compression(const AwTiffFile *file, GError **error)
{
  guint16 compression = tag16(file, TIFFTAG_COMPRESSION, COMPRESSION_NONE);
  const TIFFCodec *codec = TIFFFindCODEC(compression);
  const char *name = codec ? codec->name : "unknown";
  if (most_expansion(compression) == 0)
    return aw_tiff_fail(file, AW_ERROR_UNSUPPORTED, error,
                        "has compression %u (%s), which is not read; none, LZW, Deflate, PackBits and Zstandard are",
                        compression, name);
  if (!TIFFIsCODECConfigured(compression))
    return aw_tiff_fail(file, AW_ERROR_UNSUPPORTED, error,
                        "has compression %u (%s), which this machine's libtiff was built without", compression, name);
  return TRUE;
}

static const char *photometric_name(guint16 photometric)
{
  switch (photometric) {
  case PHOTOMETRIC_PALETTE:
    return "palette";
  case PHOTOMETRIC_MASK:
    return "transparency mask";
  case PHOTOMETRIC_SEPARATED:
    return "CMYK";
  case PHOTOMETRIC_YCBCR:
    return "YCbCr";
  case PHOTOMETRIC_CFA:
    return "colour filter array";
  default:
    return "unknown";
  }
}

static gboolean check_samples(const AwTiffFile *file, AwTiffForm *form, GError **error)
{
  guint16 photometric = tag16(file, TIFFTAG_PHOTOMETRIC, PHOTOMETRIC_MINISBLACK);
  if (photometric > PHOTOMETRIC_RGB)
    return aw_tiff_fail(file, AW_ERROR_UNSUPPORTED, error,
                        "has colour form %u (%s), which is not read; grey and RGB are", photometric,
                        photometric_name(photometric));
  form->n_samples = tag16(file, TIFFTAG_SAMPLESPERPIXEL, 1);
  if (form->n_samples < 1 || form->n_samples > MAX_SAMPLES)
    return aw_tiff_fail(file, AW_ERROR_UNSUPPORTED, error, "has %d samples a pixel; the limit is %d", form->n_samples,
                        MAX_SAMPLES);
  form->is_rgb = photometric == PHOTOMETRIC_RGB && form->n_samples == 3;
  form->is_separate = form->n_samples > 1 && tag16(file, TIFFTAG_PLANARCONFIG, 1) == PLANARCONFIG_SEPARATE;
  form->pixel.inverted = photometric == PHOTOMETRIC_MINISWHITE;
  form->pixel.n_samples = form->is_separate ? 1 : form->n_samples;
  return TRUE;
}

/* Tag 281 is "for statistics", but cameras with fewer bits than the file put their largest value there. Only a value
 * of the form 2^k - 1 is taken for that. */
static double declared_full_scale(const AwTiffFile *file, const AwTiffForm *form)
{
  unsigned top = (1u << form->pixel.bits) - 1, said = 0;
  guint16 max = 0;
  double smax = 0;
  if (TIFFGetField(file->tif, TIFFTAG_MAXSAMPLEVALUE, &max))
    said = max;
  else if (TIFFGetField(file->tif, TIFFTAG_SMAXSAMPLEVALUE, &smax) && smax > 0 && smax <= top)
    said = (unsigned)smax;
  gboolean is_camera_range = form->pixel.bits == 16 && said > 255 && ((said + 1) & said) == 0;
  return is_camera_range && !form->pixel.inverted ? said : top;
}

static gboolean check_bits(const AwTiffFile *file, AwTiffForm *form, GError **error)
{
  static const char *const formats[] = { "", "unsigned integer", "signed integer", "float" };
  guint16 bits = tag16(file, TIFFTAG_BITSPERSAMPLE, 1), format = tag16(file, TIFFTAG_SAMPLEFORMAT, 1);
  if (format == SAMPLEFORMAT_VOID)
    format = SAMPLEFORMAT_UINT;
  form->pixel.bits = bits;
  gboolean is_float = format == SAMPLEFORMAT_IEEEFP && bits == 32 && !form->pixel.inverted;
  gboolean is_integer = format == SAMPLEFORMAT_UINT && bits >= 8 && bits <= 16 && bits % 2 == 0;
  if (!is_float && !is_integer)
    return aw_tiff_fail(file, AW_ERROR_UNSUPPORTED, error,
                        "has pixels of %u-bit %s%s, which are not read; 8, 10, 12, 14 and 16-bit unsigned integers "
                        "and 32-bit floats are",
                        bits, format < G_N_ELEMENTS(formats) ? formats[format] : "complex number",
                        form->pixel.inverted ? ", white is zero" : "");
  form->pixel.full_scale = is_float ? 0 : declared_full_scale(file, form);
  return TRUE;
}

static gboolean check_orientation(const AwTiffFile *file, GError **error)
{
  guint16 orientation = tag16(file, TIFFTAG_ORIENTATION, ORIENTATION_TOPLEFT);
  if (orientation == ORIENTATION_TOPLEFT)
    return TRUE;
  return aw_tiff_fail(file, AW_ERROR_UNSUPPORTED, error,
                      "is stored turned or mirrored (orientation %u); save it with the first row on top (1)",
                      orientation);
}

static gboolean check_strile_size(const AwTiffFile *file, AwTiffForm *form, GError **error)
{
  form->is_tiled = TIFFIsTiled(file->tif) != 0;
  guint32 width = form->is_tiled ? tag32(file, TIFFTAG_TILEWIDTH) : (guint32)form->width_px;
  guint32 height = tag32(file, form->is_tiled ? TIFFTAG_TILELENGTH : TIFFTAG_ROWSPERSTRIP);
  if (!form->is_tiled)
    height = MIN(height, (guint32)form->height_px);
  if (width < 1 || height < 1 || width > AW_MAX_SIDE_PX || height > AW_MAX_SIDE_PX)
    return aw_tiff_fail(file, AW_ERROR_FORMAT, error, "claims %s of %u x %u px; the limits are 1 to %d px a side",
                        form->is_tiled ? "tiles" : "strips", width, height, AW_MAX_SIDE_PX);
  form->strile_width_px = (int)width;
  form->strile_height_px = (int)height;
  form->row_bytes = aw_pixels_row_bytes(&form->pixel, (int)width);
  gint64 bytes = (gint64)form->row_bytes * (gint64)height;
  if (form->is_tiled && bytes > AW_TIFF_MAX_STRILE_BYTES)
    return aw_tiff_fail(file, AW_ERROR_UNSUPPORTED, error,
                        "has tiles of %" G_GINT64_FORMAT " bytes; the limit is %" G_GINT64_FORMAT, bytes,
                        AW_TIFF_MAX_STRILE_BYTES);
  return TRUE;
}

/* Refuses what no file of this size can hold, before anything is allocated for it. */
static gboolean check_claim(const AwTiffFile *file, const AwTiffForm *form, GError **error)
{
  gint64 planes = form->is_separate ? form->n_samples : 1;
  gint64 bytes = (gint64)aw_pixels_row_bytes(&form->pixel, form->width_px) * form->height_px * planes;
  if (bytes <= most_expansion(tag16(file, TIFFTAG_COMPRESSION, COMPRESSION_NONE)) * file->n_bytes)
    return TRUE;
  return aw_tiff_fail(file, AW_ERROR_FORMAT, error,
                      "is cut off or damaged: it claims %d x %d px, %" G_GINT64_FORMAT
                      " bytes of pixels, in a file of %" G_GINT64_FORMAT " bytes",
                      form->width_px, form->height_px, bytes, file->n_bytes);
}

static gboolean count_striles(const AwTiffFile *file, AwTiffForm *form, GError **error)
{
  gint64 width = form->strile_width_px, height = form->strile_height_px;
  gint64 across = ((gint64)form->width_px + width - 1) / width, down = ((gint64)form->height_px + height - 1) / height;
  if (across * down * form->n_samples > file->n_bytes)
    return aw_tiff_fail(file, AW_ERROR_FORMAT, error,
                        "claims %" G_GINT64_FORMAT " %s in a file of %" G_GINT64_FORMAT " bytes", across * down,
                        form->is_tiled ? "tiles" : "strips", file->n_bytes);
  form->n_across = (int)across;
  form->n_striles = (guint32)(across * down);
  return TRUE;
}

int aw_tiff_form_strip_rows(const AwTiffForm *form, int y0)
{
  return MIN(form->strile_height_px, form->height_px - y0);
}

/* Bytes that strile i decodes to; a tile is always whole, the last strip may be short. */
static gint64 decoded_bytes(const AwTiffForm *form, guint32 i)
{
  int rows = form->is_tiled ? form->strile_height_px : aw_tiff_form_strip_rows(form, (int)i * form->strile_height_px);
  return (gint64)form->row_bytes * rows;
}

/* Every strile must lie in the file and be long enough for what it claims to decode to. */
static gboolean check_data(const AwTiffFile *file, const AwTiffForm *form, GError **error)
{
  gint64 expansion = most_expansion(tag16(file, TIFFTAG_COMPRESSION, COMPRESSION_NONE));
  const char *kind = form->is_tiled ? "tile" : "strip";
  guint32 n = form->n_striles * (guint32)(form->is_separate ? form->n_samples : 1);
  for (guint32 i = 0; i < n; i++) {
    int failed = 0;
    guint64 at = TIFFGetStrileOffsetWithErr(file->tif, i, &failed);
    guint64 stored = failed ? 0 : TIFFGetStrileByteCountWithErr(file->tif, i, &failed);
    gint64 decoded = decoded_bytes(form, i % form->n_striles);
    if (failed || at == 0 || stored == 0)
      return aw_tiff_fail(file, AW_ERROR_FORMAT, error, "is damaged: %s %u of %u is missing", kind, i, n);
    if (at > (guint64)file->n_bytes || stored > (guint64)file->n_bytes - at)
      return aw_tiff_fail(file, AW_ERROR_FORMAT, error,
                          "is cut off: %s %u of %u takes %" G_GUINT64_FORMAT " bytes from byte %" G_GUINT64_FORMAT
                          ", the file has %" G_GINT64_FORMAT,
                          kind, i, n, stored, at, file->n_bytes);
    if (decoded > expansion * (gint64)stored)
      return aw_tiff_fail(file, AW_ERROR_FORMAT, error,
                          "is damaged: %s %u of %u claims %" G_GINT64_FORMAT " bytes of pixels in %" G_GUINT64_FORMAT
                          " bytes of the file",
                          kind, i, n, decoded, stored);
  }
  return TRUE;
}

/* Most files without compression are one piece: it can be read anywhere without a strip in between. */
static void find_stored(const AwTiffFile *file, AwTiffForm *form)
{
  form->is_stored = !form->is_tiled && tag16(file, TIFFTAG_COMPRESSION, COMPRESSION_NONE) == COMPRESSION_NONE &&
                    tag16(file, TIFFTAG_FILLORDER, FILLORDER_MSB2LSB) == FILLORDER_MSB2LSB;
  for (guint32 plane = 0; form->is_stored && plane < (guint32)(form->is_separate ? form->n_samples : 1); plane++) {
    guint64 next = TIFFGetStrileOffset(file->tif, plane * form->n_striles);
    for (guint32 i = 0; i < form->n_striles && form->is_stored; i++) {
      form->is_stored = TIFFGetStrileOffset(file->tif, plane * form->n_striles + i) == next;
      next += (guint64)decoded_bytes(form, i);
    }
  }
}

gboolean aw_tiff_form_read(const AwTiffFile *file, AwTiffForm *form, GError **error)
{
  *form = (AwTiffForm){ 0 };
  gboolean ok = check_size(file, form, error) && check_compression(file, error) && check_samples(file, form, error) &&
                check_bits(file, form, error) && check_orientation(file, error) &&
                check_strile_size(file, form, error) && check_claim(file, form, error) &&
                count_striles(file, form, error) && check_data(file, form, error);
  if (ok)
    find_stored(file, form);
  return ok;
}

double aw_tiff_form_pixel_um(const AwTiffFile *file, guint32 tag)
{
  guint16 unit = tag16(file, TIFFTAG_RESOLUTIONUNIT, RESUNIT_INCH);
  double unit_um = unit == RESUNIT_INCH ? 25400 : unit == RESUNIT_CENTIMETER ? 10000 : 0;
  float per_unit = 0;
  if (unit_um <= 0 || !TIFFGetField(file->tif, tag, &per_unit) || !isfinite(per_unit) || per_unit <= 0)
    return 0;
  double um = unit_um / (double)per_unit;
  return um >= MIN_PIXEL_UM && um <= MAX_PIXEL_UM ? um : 0;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/pixels.h"

#include <math.h>
#include <string.h>

#include "base/error.h"

#define CHUNK_PX 1024

AwSample aw_pixels_sample(const AwPixelForm *form)
{
  return form->bits <= 8 ? AW_SAMPLE_U8 : form->bits <= 16 ? AW_SAMPLE_U16 : AW_SAMPLE_F32;
}

gsize aw_pixels_row_bytes(const AwPixelForm *form, int width_px)
{
  return ((gsize)width_px * (gsize)form->n_samples * (gsize)form->bits + 7) / 8;
}

static void take_u8(const guint8 *raw, gsize step, int n_px, guint8 *out)
{
  for (int i = 0; i < n_px; i++)
    out[i] = raw[(gsize)i * step];
}

/* Rows of a tile or strip may begin at odd addresses, hence memcpy for every sample. */
static void take_wide(const guint8 *raw, gsize step, gsize bytes, int n_px, guint8 *out)
{
  for (int i = 0; i < n_px; i++)
    memcpy(out + (gsize)i * bytes, raw + (gsize)i * step * bytes, bytes);
}

static unsigned packed_value(const guint8 *raw, gsize first_bit, int bits)
{
  unsigned value = 0;
  for (int done = 0; done < bits;) {
    gsize at = first_bit + (gsize)done;
    int left_in_byte = 8 - (int)(at % 8), take = MIN(left_in_byte, bits - done);
    unsigned part = ((unsigned)raw[at / 8] >> (left_in_byte - take)) & ((1u << take) - 1);
    value = value << take | part;
    done += take;
  }
  return value;
}

static void take_packed(const AwPixelForm *form, const guint8 *raw, gsize first, int n_px, void *out)
{
  gsize step = (gsize)form->n_samples, bits = (gsize)form->bits;
  for (int i = 0; i < n_px; i++) {
    unsigned value = packed_value(raw, (first + (gsize)i * step) * bits, form->bits);
    if (form->bits <= 8)
      ((guint8 *)out)[i] = (guint8)value;
    else
      ((guint16 *)out)[i] = (guint16)value;
  }
}

static void invert(const AwPixelForm *form, int n_px, void *out)
{
  unsigned top = (1u << form->bits) - 1;
  if (form->bits <= 8)
    for (int i = 0; i < n_px; i++)
      ((guint8 *)out)[i] = (guint8)(top - ((guint8 *)out)[i]);
  else
    for (int i = 0; i < n_px; i++)
      ((guint16 *)out)[i] = (guint16)(top - ((guint16 *)out)[i]);
}

void aw_pixels_take(const AwPixelForm *form, int sample, const guint8 *raw, int first_px, int n_px, void *out)
{
  gsize step = (gsize)form->n_samples, first = (gsize)first_px * step + (gsize)sample;
  gsize bytes = aw_sample_bytes(aw_pixels_sample(form));
  if (form->bits % 8 != 0 || form->bits == 24)
    take_packed(form, raw, first, n_px, out);
  else if (step == 1)
    memcpy(out, raw + first * bytes, (gsize)n_px * bytes);
  else if (bytes == 1)
    take_u8(raw + first, step, n_px, out);
  else
    take_wide(raw + first * bytes, step, bytes, n_px, out);
  if (form->inverted)
    invert(form, n_px, out);
}

int aw_pixels_differ(const AwPixelForm *form, int sample, const guint8 *raw, int first_px, int n_px, const void *out)
{
  guint32 chunk[CHUNK_PX];
  gsize bytes = aw_sample_bytes(aw_pixels_sample(form));
  const guint8 *want = out;
  for (int done = 0; done < n_px; done += CHUNK_PX) {
    int n = MIN(CHUNK_PX, n_px - done);
    aw_pixels_take(form, sample, raw, first_px + done, n, chunk);
    const guint8 *got = (const guint8 *)chunk, *is = want + (gsize)done * bytes;
    if (memcmp(got, is, (gsize)n * bytes) == 0)
      continue;
    int i = 0;
    while (memcmp(got + (gsize)i * bytes, is + (gsize)i * bytes, bytes) == 0)
      i++;
    return done + i;
  }
  return -1;
}

int aw_pixels_not_finite(AwSample sample, const void *values, int n_px)
{
  if (sample != AW_SAMPLE_F32)
    return -1;
  const float *v = values;
  for (int i = 0; i < n_px; i++)
    if (!isfinite(v[i]))
      return i;
  return -1;
}

void aw_pixels_settle_full_scale(AwImage *image)
{
  if (image->sample != AW_SAMPLE_U16 || image->full_scale >= 65535)
    return;
  gsize n = (gsize)image->width_px * (gsize)image->height_px;
  const guint16 *v = image->pixels;
  guint16 top = 0;
  for (gsize i = 0; i < n; i++)
    top = MAX(top, v[i]);
  if (top > image->full_scale)
    image->full_scale = 65535;
}

void aw_pixels_fault_error(AwPixelFault fault, const char *place, int n_samples, int x, int y, GError **error)
{
  if (fault == AW_PIXELS_COLOURED)
    g_set_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED,
                "%s is a colour image whose channels differ (first at x %d, y %d); choose one with --channel 0 to %d",
                place, x, y, n_samples - 1);
  else
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s has a pixel at x %d, y %d that is infinite or no number", place,
                x, y);
}

gboolean aw_pixels_check_channel(const char *place, int channel, int n, const char *names, GError **error)
{
  if (channel >= n)
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s has no channel %d; it has %d, counted from 0%s%s", place,
                channel, n, names ? ": " : "", names ? names : "");
  else if (channel < 0 && n > 1)
    g_set_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED, "%s has %d channels; choose one with --channel 0 to %d%s%s",
                place, n, n - 1, names ? ": " : "", names ? names : "");
  else
    return TRUE;
  return FALSE;
}

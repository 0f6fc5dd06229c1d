/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/tiff_plane.h"

#include <math.h>

#include "image/ome.h"
#include "image/tiff_form.h"
#include "image/tiff_pixels.h"

struct AwTiffPlane {
  AwTiffFile *file;
  AwTiffPixels *pixels;
  AwTiffForm form;
  AwImageInfo info;
  int n_pages, n_channels;
};

void aw_tiff_plane_free(AwTiffPlane *plane)
{
  if (!plane)
    return;
  aw_tiff_pixels_free(plane->pixels);
  aw_tiff_file_free(plane->file);
  g_free(plane);
}

const AwImageInfo *aw_tiff_plane_info(const AwTiffPlane *plane)
{
  return &plane->info;
}

int aw_tiff_plane_n_pages(const AwTiffPlane *plane)
{
  return plane->n_pages;
}

int aw_tiff_plane_n_channels(const AwTiffPlane *plane)
{
  return plane->n_channels;
}

static gboolean check_page(const AwTiffPlane *plane, int page, GError **error)
{
  if (page < plane->n_pages)
    return TRUE;
  return aw_tiff_fail(plane->file, AW_ERROR_NOT_FOUND, error, "has no page %d; it has %d, counted from 0", page,
                      plane->n_pages);
}

/* The directory and sample meant by page and channel where no OME metadata say otherwise. */
static gboolean choose_plain(AwTiffPlane *plane, int page, int channel, GError **error)
{
  AwTiffFile *file = plane->file;
  plane->n_pages = file->n_directories;
  if (!check_page(plane, page, error) || !aw_tiff_file_choose(file, page, page, error) ||
      !aw_tiff_form_read(file, &plane->form, error))
    return FALSE;
  plane->n_channels = plane->form.n_samples;
  if (channel < 0 && plane->form.is_rgb)
    return TRUE;
  return aw_pixels_check_channel(file->place, channel, plane->n_channels, NULL, error);
}

static void take_ome_info(AwTiffPlane *plane, const AwOmePlane *ome)
{
  AwImageInfo *info = &plane->info;
  double declared = ome->significant_bits > 8 && ome->significant_bits < 16 ? (1 << ome->significant_bits) - 1 : 65535;
  info->pixel_um = ome->pixel_um;
  info->pixel_y_um = ome->pixel_y_um;
  info->has_position = ome->has_position;
  info->position_is_reference_frame = ome->is_reference_frame;
  info->stage = ome->stage;
  info->taken_at_unix_s = ome->taken_at_unix_s;
  if (plane->form.pixel.bits == 16 && !plane->form.pixel.inverted)
    plane->form.pixel.full_scale = MIN(plane->form.pixel.full_scale, declared);
}

static gboolean check_ome_form(const AwTiffPlane *plane, const AwOmePlane *ome, GError **error)
{
  const AwTiffForm *form = &plane->form;
  if (form->width_px != ome->width_px || form->height_px != ome->height_px)
    return aw_tiff_fail(plane->file, AW_ERROR_FORMAT, error, "is %d x %d px, but its OME metadata say %d x %d",
                        form->width_px, form->height_px, ome->width_px, ome->height_px);
  if (form->n_samples != ome->n_samples && !(form->is_rgb && ome->n_samples == 1))
    return aw_tiff_fail(plane->file, AW_ERROR_FORMAT, error, "has %d samples a pixel, but its OME metadata say %d",
                        form->n_samples, ome->n_samples);
  if (ome->n_samples > 1 && ome->sample < 0 && !form->is_rgb)
    return aw_pixels_check_channel(plane->file->place, -1, ome->n_channels, NULL, error);
  return TRUE;
}

static gboolean choose_ome(AwTiffPlane *plane, const AwOme *ome, int page, int *channel, GError **error)
{
  AwOmePlane found;
  AwTiffFile *file = plane->file;
  plane->n_pages = aw_ome_n_pages(ome);
  if (!check_page(plane, page, error) || !aw_ome_plane(ome, page, *channel, &found, error))
    return FALSE;
  if (found.ifd >= file->n_directories)
    return aw_tiff_fail(file, AW_ERROR_FORMAT, error,
                        "is cut off: its OME metadata place page %d in TIFF directory %d, but it has only %d", page,
                        found.ifd, file->n_directories);
  if (!aw_tiff_file_choose(file, found.ifd, page, error) || !aw_tiff_form_read(file, &plane->form, error) ||
      !check_ome_form(plane, &found, error))
    return FALSE;
  plane->n_channels = found.n_channels;
  *channel = found.sample;
  take_ome_info(plane, &found);
  return TRUE;
}

static gboolean choose(AwTiffPlane *plane, int page, int *channel, GError **error)
{
  char *description = NULL;
  if (!TIFFGetField(plane->file->tif, TIFFTAG_IMAGEDESCRIPTION, &description) || !aw_ome_is(description))
    return choose_plain(plane, page, *channel, error);
  g_autoptr(AwOme) ome = aw_ome_parse(description, plane->file->path, plane->file->n_directories, error);
  return ome && choose_ome(plane, ome, page, channel, error);
}

static void complete_info(AwTiffPlane *plane)
{
  AwImageInfo *info = &plane->info;
  info->width_px = plane->form.width_px;
  info->height_px = plane->form.height_px;
  info->sample = aw_pixels_sample(&plane->form.pixel);
  info->full_scale = plane->form.pixel.full_scale;
  if (info->pixel_um <= 0) {
    info->pixel_um = aw_tiff_form_pixel_um(plane->file, TIFFTAG_XRESOLUTION);
    info->pixel_y_um = aw_tiff_form_pixel_um(plane->file, TIFFTAG_YRESOLUTION);
  }
  if (info->pixel_y_um <= 0)
    info->pixel_y_um = info->pixel_um;
}

AwTiffPlane *aw_tiff_plane_open(const char *path, int page, int channel, GError **error)
{
  g_autoptr(AwTiffPlane) plane = g_new0(AwTiffPlane, 1);
  plane->info.taken_at_unix_s = NAN;
  plane->file = aw_tiff_file_open(path, error);
  if (!plane->file || !choose(plane, page, &channel, error))
    return NULL;
  complete_info(plane);
  plane->pixels = aw_tiff_pixels_new(plane->file, &plane->form, channel);
  return g_steal_pointer(&plane);
}

gboolean aw_tiff_plane_read(AwTiffPlane *plane, AwRect rect, AwImage *image, GError **error)
{
  return aw_tiff_pixels_read(plane->pixels, rect, image, error);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/ome.h"

#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/text.h"
#include "image/ome_model.h"
#include "image/pixels.h"

gboolean aw_ome_is(const char *description)
{
  while (g_ascii_isspace(*description) || strncmp(description, "\xef\xbb\xbf", 3) == 0)
    description += *description == '\xef' ? 3 : 1;
  return *description == '<' && (strstr(description, "<OME") || strstr(description, ":OME ")) &&
         strstr(description, "openmicroscopy.org");
}

static void image_free(gpointer data)
{
  AwOmeModelImage *image = data;
  g_ptr_array_unref(image->names);
  g_string_free(image->acquired, TRUE);
  g_free(image->planes);
  g_free(image);
}

void aw_ome_free(AwOme *ome)
{
  if (!ome)
    return;
  g_free(ome->path);
  g_free(ome->file_name);
  g_free(ome->uuid);
  g_string_chunk_free(ome->texts);
  g_ptr_array_unref(ome->images);
  g_array_unref(ome->pages);
  g_free(ome);
}

static gboolean is_here(const AwOmeModelPage *page)
{
  for (int c = 0; c < page->image->size[AW_OME_C]; c++)
    if (aw_ome_model_plane(page->image, c, page->z, page->t)->ifd >= 0)
      return TRUE;
  return FALSE;
}

/* Metadata of one Image without any TiffData mean the file's directories in order. */
static void assume_directories(AwOme *ome)
{
  if (ome->images->len == 0 || ome->first_elsewhere)
    return;
  const AwOmeModelImage *image = g_ptr_array_index(ome->images, 0);
  for (guint i = 0; i < ome->images->len; i++) {
    const AwOmeModelImage *other = g_ptr_array_index(ome->images, i);
    for (int k = 0; other->planes && k < aw_ome_model_n_planes(other); k++)
      if (other->planes[k].ifd >= 0)
        return;
  }
  for (int k = 0; image->planes && k < aw_ome_model_n_planes(image); k++)
    image->planes[k].ifd = k;
}

static gboolean list_pages(AwOme *ome, GError **error)
{
  assume_directories(ome);
  for (guint i = 0; i < ome->images->len; i++) {
    AwOmeModelImage *image = g_ptr_array_index(ome->images, i);
    for (int k = 0; image->planes && k < image->size[AW_OME_Z] * image->size[AW_OME_T]; k++) {
      AwOmeModelPage page = { image, k % image->size[AW_OME_Z], k / image->size[AW_OME_Z] };
      if (is_here(&page))
        g_array_append_val(ome->pages, page);
    }
  }
  if (ome->pages->len > 0)
    return TRUE;
  if (ome->first_elsewhere)
    g_set_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED,
                "%s: its OME metadata place every plane in other files (the first is %s)", ome->path,
                ome->first_elsewhere);
  else
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: its OME metadata describe no plane", ome->path);
  return FALSE;
}

AwOme *aw_ome_parse(const char *xml, const char *path, int n_directories, GError **error)
{
  g_autoptr(AwOme) ome = g_new0(AwOme, 1);
  ome->path = g_strdup(path);
  ome->file_name = g_path_get_basename(path);
  ome->n_directories = n_directories;
  ome->texts = g_string_chunk_new(256);
  ome->images = g_ptr_array_new_with_free_func(image_free);
  ome->pages = g_array_new(FALSE, FALSE, sizeof(AwOmeModelPage));
  if (!aw_ome_model_read(ome, xml, error) || !list_pages(ome, error))
    return NULL;
  return g_steal_pointer(&ome);
}

int aw_ome_n_pages(const AwOme *ome)
{
  return (int)ome->pages->len;
}

/* "0 DAPI, 1 GFP", or NULL when no channel is named. */
static char *channel_names(const AwOmeModelImage *image)
{
  if (image->names->len < 2 || image->n_samples != 1)
    return NULL;
  g_autoptr(GString) list = g_string_new(NULL);
  for (guint c = 0; c < image->names->len; c++) {
    const char *name = g_ptr_array_index(image->names, c);
    if (name && list->len < 400)
      g_string_append_printf(list, "%s%u %s", list->len ? ", " : "", c, name);
  }
  return list->len ? g_string_free(g_steal_pointer(&list), FALSE) : NULL;
}

static double taken_at(const AwOmeModelImage *image, const AwOmeModelPlane *plane)
{
  double start_s;
  if (!aw_text_to_time(g_strstrip(image->acquired->str), "AcquisitionDate", &start_s, NULL))
    return NAN;
  return isfinite(plane->delta_t_s) ? start_s + plane->delta_t_s : start_s;
}

static void describe(const AwOmeModelImage *image, const AwOmeModelPlane *found, AwOmePlane *plane)
{
  *plane = (AwOmePlane){ .ifd = found->ifd,
                         .n_samples = image->n_samples,
                         .sample = -1,
                         .n_channels = image->size[AW_OME_C] * image->n_samples,
                         .width_px = image->width_px,
                         .height_px = image->height_px,
                         .significant_bits = image->significant_bits,
                         .pixel_um = image->pixel_um,
                         .pixel_y_um = image->pixel_y_um,
                         .has_position = found->has_position,
                         .is_reference_frame = found->is_reference_frame,
                         .stage = found->stage,
                         .taken_at_unix_s = taken_at(image, found) };
}

gboolean aw_ome_plane(const AwOme *ome, int page, int channel, AwOmePlane *plane, GError **error)
{
  g_return_val_if_fail(page >= 0 && page < aw_ome_n_pages(ome), FALSE);
  const AwOmeModelPage *at = &g_array_index(ome->pages, AwOmeModelPage, page);
  const AwOmeModelImage *image = at->image;
  g_autofree char *names = channel_names(image), *place = g_strdup_printf("%s, page %d", ome->path, page);
  int n = image->size[AW_OME_C] * image->n_samples;
  gboolean one_colour_plane = channel < 0 && image->size[AW_OME_C] == 1;
  if (!one_colour_plane && !aw_pixels_check_channel(place, channel, n, names, error))
    return FALSE;
  int c = MAX(channel, 0) / image->n_samples;
  const AwOmeModelPlane *found = aw_ome_model_plane(image, c, at->z, at->t);
  if (found->ifd < 0 && found->elsewhere) {
    g_set_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED, "%s: channel %d is kept in another file, %s; name that file",
                place, c, found->elsewhere);
    return FALSE;
  }
  if (found->ifd < 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "%s: the file has no plane for channel %d", place, c);
    return FALSE;
  }
  describe(image, found, plane);
  if (channel >= 0 && image->n_samples > 1)
    plane->sample = channel % image->n_samples;
  return TRUE;
}

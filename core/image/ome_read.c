/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/limits.h"
#include "base/text.h"
#include "image/ome_model.h"

/* The TiffData element being read: its planes are known only when its UUID child has been seen. */
typedef struct {
  int first[3];
  gint64 ifd, count; /* -1: not said */
  GString *uuid, *file_name;
} TiffData;

typedef struct {
  AwOme *ome;
  GString *path; /* element names from the root on, such as OME/Image/Pixels */
  AwOmeModelImage *image;
  TiffData data;
  gint64 n_planes, n_assigned;
} Reading;

typedef struct {
  const Reading *reading;
  const char *element, **names, **values;
} Element;

static const char *attribute(const Element *e, const char *name)
{
  for (int i = 0; e->names[i]; i++)
    if (strcmp(e->names[i], name) == 0)
      return e->values[i];
  return NULL;
}

static char *place(const Element *e, const char *name)
{
  return g_strdup_printf("%s, OME %s of image %u, attribute %s", e->reading->ome->path, e->element,
                         e->reading->ome->images->len, name);
}

/* Leaves *value alone where the attribute is absent. */
static gboolean integer(const Element *e, const char *name, gint64 min, gint64 max, gint64 *value, GError **error)
{
  const char *text = attribute(e, name);
  if (!text)
    return TRUE;
  g_autofree char *where = place(e, name);
  return aw_text_to_int(text, where, min, max, value, error);
}

static gboolean size(const Element *e, const char *name, int max, int *value, GError **error)
{
  gint64 n = 0;
  if (!integer(e, name, 1, max, &n, error))
    return FALSE;
  if (n == 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: the OME Pixels of image %u have no %s", e->reading->ome->path,
                e->reading->ome->images->len, name);
    return FALSE;
  }
  *value = (int)n;
  return TRUE;
}

static gboolean real(const Element *e, const char *name, double *value, gboolean *found, GError **error)
{
  const char *text = attribute(e, name);
  *found = text != NULL;
  if (!text)
    return TRUE;
  g_autofree char *where = place(e, name);
  return aw_text_to_double(text, where, value, error);
}

/* A pixel size of zero or below, or in no unit of length, is one that the file does not say. */
static gboolean pixel_size(const Element *e, const char *name, const char *unit_name, double *um, GError **error)
{
  double value = 0;
  gboolean found;
  if (!real(e, name, &value, &found, error))
    return FALSE;
  const char *unit = attribute(e, unit_name);
  *um = 0;
  if (found && value > 0 && !aw_ome_length_um(value, unit ? unit : "um", um))
    *um = 0;
  return TRUE;
}

static gboolean dimension_order(const Element *e, AwOmeModelImage *image, GError **error)
{
  const char *order = attribute(e, "DimensionOrder");
  if (!order)
    order = "XYZCT";
  const char *rest = g_str_has_prefix(order, "XY") ? order + 2 : "";
  if (strlen(rest) == 3 && strchr(rest, 'C') && strchr(rest, 'Z') && strchr(rest, 'T')) {
    memcpy(image->order, rest, 4);
    return TRUE;
  }
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: the OME DimensionOrder \"%s\" is not XY and then C, Z and T",
              e->reading->ome->path, order);
  return FALSE;
}

static gboolean start_pixels(Reading *r, const Element *e, GError **error)
{
  AwOmeModelImage *image = r->image;
  gint64 bits = 0;
  if (!size(e, "SizeX", AW_MAX_SIDE_PX, &image->width_px, error) ||
      !size(e, "SizeY", AW_MAX_SIDE_PX, &image->height_px, error) ||
      !size(e, "SizeC", AW_MAX_FRAMES, &image->size[AW_OME_C], error) ||
      !size(e, "SizeZ", AW_MAX_FRAMES, &image->size[AW_OME_Z], error) ||
      !size(e, "SizeT", AW_MAX_FRAMES, &image->size[AW_OME_T], error) ||
      !integer(e, "SignificantBits", 1, 64, &bits, error) ||
      !pixel_size(e, "PhysicalSizeX", "PhysicalSizeXUnit", &image->pixel_um, error) ||
      !pixel_size(e, "PhysicalSizeY", "PhysicalSizeYUnit", &image->pixel_y_um, error) ||
      !dimension_order(e, image, error))
    return FALSE;
  image->significant_bits = (int)bits;
  if (image->pixel_y_um <= 0)
    image->pixel_y_um = image->pixel_um;
  r->n_planes += (gint64)image->size[0] * image->size[1] * image->size[2];
  if (r->n_planes <= AW_MAX_FRAMES)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s: its OME metadata claim more than %d planes", r->ome->path,
              AW_MAX_FRAMES);
  return FALSE;
}

/* Called when the last Channel has been seen: SizeC counts samples, planes count channels. */
static gboolean lay_out_planes(Reading *r, GError **error)
{
  AwOmeModelImage *image = r->image;
  if (image->planes || image->order[0] == '\0')
    return TRUE;
  int n_named = (int)image->names->len, size_c = image->size[AW_OME_C];
  if (n_named > 0 && size_c % n_named != 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: its OME metadata name %d channels for a SizeC of %d",
                r->ome->path, n_named, size_c);
    return FALSE;
  }
  if (n_named > 0)
    image->size[AW_OME_C] = n_named;
  image->n_samples = size_c / image->size[AW_OME_C];
  int stride = 1;
  for (int i = 0; i < 3; i++) {
    int dimension = image->order[i] == 'C' ? AW_OME_C : image->order[i] == 'Z' ? AW_OME_Z : AW_OME_T;
    image->stride[dimension] = stride;
    stride *= image->size[dimension];
  }
  image->planes = aw_try_alloc((gsize)stride, sizeof *image->planes, "the planes of OME metadata", error);
  for (int i = 0; image->planes && i < stride; i++)
    image->planes[i] = (AwOmeModelPlane){ .ifd = -1, .delta_t_s = NAN };
  return image->planes != NULL;
}

static gboolean start_data(Reading *r, const Element *e, GError **error)
{
  static const char *const first[] = { "FirstC", "FirstZ", "FirstT" };
  gint64 ifd = -1, count = -1;
  if (!lay_out_planes(r, error) || !integer(e, "IFD", 0, G_MAXINT32, &ifd, error) ||
      !integer(e, "PlaneCount", 0, AW_MAX_FRAMES, &count, error))
    return FALSE;
  for (int i = 0; i < 3; i++) {
    gint64 at = 0;
    if (!integer(e, first[i], 0, r->image->size[i] - 1, &at, error))
      return FALSE;
    r->data.first[i] = (int)at;
  }
  r->data.ifd = ifd;
  r->data.count = count;
  g_string_truncate(r->data.uuid, 0);
  g_string_truncate(r->data.file_name, 0);
  return TRUE;
}

/* The name of the other file that this TiffData is about, or NULL when it is about the file being read. */
static char *other_file(Reading *r)
{
  const char *uuid = g_strstrip(r->data.uuid->str), *file_name = r->data.file_name->str;
  AwOme *ome = r->ome;
  gboolean same_uuid = *uuid && ome->uuid && strcmp(uuid, ome->uuid) == 0;
  gboolean same_name = *file_name && strcmp(file_name, ome->file_name) == 0;
  gboolean knows = (*uuid && ome->uuid) || *file_name;
  if (!knows || same_uuid || same_name)
    return NULL;
  return g_string_chunk_insert_const(ome->texts, *file_name ? file_name : uuid);
}

static gboolean end_data(Reading *r, GError **error)
{
  const TiffData *d = &r->data;
  const AwOmeModelImage *image = r->image;
  char *elsewhere = other_file(r);
  AwOmeModelPlane *plane = aw_ome_model_plane(image, d->first[0], d->first[1], d->first[2]);
  gint64 ifd = MAX(d->ifd, 0), most = aw_ome_model_n_planes(image) - (plane - image->planes);
  gint64 rest = elsewhere ? most : r->ome->n_directories - ifd;
  gint64 count = d->count >= 0 ? d->count : d->ifd >= 0 ? 1 : rest;
  r->n_assigned += count = CLAMP(count, 0, most);
  if (r->n_assigned > (gint64)4 * AW_MAX_FRAMES) {
    g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s: its OME TiffData name more than %d planes", r->ome->path,
                4 * AW_MAX_FRAMES);
    return FALSE;
  }
  if (elsewhere && !r->ome->first_elsewhere)
    r->ome->first_elsewhere = elsewhere;
  for (gint64 i = 0; i < count; i++)
    if (!elsewhere)
      plane[i].ifd = (int)MIN(ifd + i, G_MAXINT32);
    else if (plane[i].ifd < 0)
      plane[i].elsewhere = elsewhere;
  return TRUE;
}

static gboolean plane_position(const Element *e, AwOmeModelPlane *plane, GError **error)
{
  double x, y;
  gboolean has_x, has_y;
  if (!real(e, "PositionX", &x, &has_x, error) || !real(e, "PositionY", &y, &has_y, error))
    return FALSE;
  if (!has_x || !has_y)
    return TRUE;
  const char *unit_x = attribute(e, "PositionXUnit"), *unit_y = attribute(e, "PositionYUnit");
  plane->has_position = unit_x && unit_y && aw_ome_length_um(x, unit_x, &plane->stage.x_um) &&
                        aw_ome_length_um(y, unit_y, &plane->stage.y_um);
  plane->is_reference_frame = !plane->has_position;
  return TRUE;
}

static gboolean start_plane(Reading *r, const Element *e, GError **error)
{
  static const char *const names[] = { "TheC", "TheZ", "TheT" };
  gint64 at[3] = { 0, 0, 0 };
  if (!lay_out_planes(r, error))
    return FALSE;
  for (int i = 0; i < 3; i++) {
    int n = r->image->size[i] * (i == AW_OME_C ? r->image->n_samples : 1);
    if (!integer(e, names[i], 0, n - 1, &at[i], error))
      return FALSE;
  }
  if (at[AW_OME_C] >= r->image->size[AW_OME_C]) /* a further sample of a channel */
    return TRUE;
  AwOmeModelPlane *plane = aw_ome_model_plane(r->image, (int)at[0], (int)at[1], (int)at[2]);
  double delta_t;
  gboolean found;
  if (!real(e, "DeltaT", &delta_t, &found, error))
    return FALSE;
  const char *unit = attribute(e, "DeltaTUnit");
  if (found && !aw_ome_time_s(delta_t, unit ? unit : "s", &plane->delta_t_s))
    plane->delta_t_s = NAN;
  return plane_position(e, plane, error);
}

static void start_image(Reading *r)
{
  r->image = g_new0(AwOmeModelImage, 1);
  r->image->names = g_ptr_array_new_with_free_func(g_free);
  r->image->acquired = g_string_new(NULL);
  g_ptr_array_add(r->ome->images, r->image);
}

static gboolean refuse_binary_only(const Reading *r, const Element *e, GError **error)
{
  const char *file = attribute(e, "MetadataFile");
  g_set_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED,
              "%s keeps its OME metadata in another file (%s), which is not read; name the frames in a scan table",
              r->ome->path, file ? file : "not named");
  return FALSE;
}

static gboolean start(Reading *r, const Element *e, GError **error)
{
  const char *at = r->path->str;
  if (strcmp(at, "OME") == 0 && !r->ome->uuid)
    r->ome->uuid = g_strdup(attribute(e, "UUID"));
  else if (strcmp(at, "OME/BinaryOnly") == 0)
    return refuse_binary_only(r, e, error);
  else if (strcmp(at, "OME/Image") == 0)
    start_image(r);
  else if (!r->image || !g_str_has_prefix(at, "OME/Image/Pixels"))
    return TRUE;
  else if (strcmp(at, "OME/Image/Pixels") == 0)
    return start_pixels(r, e, error);
  else if (strcmp(at, "OME/Image/Pixels/Channel") == 0)
    g_ptr_array_add(r->image->names, g_strdup(attribute(e, "Name")));
  else if (strcmp(at, "OME/Image/Pixels/TiffData") == 0)
    return start_data(r, e, error);
  else if (strcmp(at, "OME/Image/Pixels/TiffData/UUID") == 0)
    g_string_assign(r->data.file_name, attribute(e, "FileName") ? attribute(e, "FileName") : "");
  else if (strcmp(at, "OME/Image/Pixels/Plane") == 0)
    return start_plane(r, e, error);
  return TRUE;
}

static void on_start(GMarkupParseContext *context, const char *element, const char **names, const char **values,
                     gpointer data, GError **error)
{
  (void)context;
  Reading *r = data;
  const char *colon = strchr(element, ':');
  const Element e = { r, colon ? colon + 1 : element, names, values };
  if (r->path->len > 0)
    g_string_append_c(r->path, '/');
  g_string_append(r->path, e.element);
  start(r, &e, error);
}

static void on_end(GMarkupParseContext *context, const char *element, gpointer data, GError **error)
{
  (void)context;
  (void)element;
  Reading *r = data;
  const char *at = r->path->str;
  if (strcmp(at, "OME/Image/Pixels/TiffData") == 0 && !end_data(r, error))
    return;
  if (strcmp(at, "OME/Image/Pixels") == 0 && !lay_out_planes(r, error))
    return;
  const char *slash = strrchr(at, '/');
  g_string_truncate(r->path, slash ? (gsize)(slash - at) : 0);
}

static void on_text(GMarkupParseContext *context, const char *text, gsize n, gpointer data, GError **error)
{
  (void)context;
  (void)error;
  Reading *r = data;
  if (strcmp(r->path->str, "OME/Image/Pixels/TiffData/UUID") == 0)
    g_string_append_len(r->data.uuid, text, (gssize)n);
  else if (strcmp(r->path->str, "OME/Image/AcquisitionDate") == 0)
    g_string_append_len(r->image->acquired, text, (gssize)n);
}

gboolean aw_ome_model_read(AwOme *ome, const char *xml, GError **error)
{
  static const GMarkupParser parser = { on_start, on_end, on_text, NULL, NULL };
  Reading reading = { .ome = ome, .path = g_string_new(NULL) };
  reading.data.uuid = g_string_new(NULL);
  reading.data.file_name = g_string_new(NULL);
  g_autoptr(GMarkupParseContext) context = g_markup_parse_context_new(&parser, (GMarkupParseFlags)0, &reading, NULL);
  g_autoptr(GError) cause = NULL;
  gboolean ok =
      g_markup_parse_context_parse(context, xml, -1, &cause) && g_markup_parse_context_end_parse(context, &cause);
  g_string_free(reading.path, TRUE);
  g_string_free(reading.data.uuid, TRUE);
  g_string_free(reading.data.file_name, TRUE);
  if (!ok && cause->domain == AW_ERROR)
    g_propagate_error(error, g_steal_pointer(&cause));
  else if (!ok)
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "%s: its OME metadata cannot be read: %s", ome->path, cause->message);
  return ok;
}

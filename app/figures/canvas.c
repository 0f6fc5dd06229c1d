/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/canvas.h"

#include <cairo-pdf.h>
#include <cairo-svg.h>
#include <string.h>

#include "base/error.h"
#include "base/output.h"

typedef enum { KIND_PNG, KIND_SVG, KIND_PDF, N_KINDS } Kind;

struct AwCanvas {
  char *path;
  Kind kind;
  GByteArray *bytes;
  cairo_surface_t *surface;
  cairo_t *cr;
};

static cairo_status_t collect(void *closure, const unsigned char *data, unsigned int length)
{
  g_byte_array_append(closure, data, length);
  return CAIRO_STATUS_SUCCESS;
}

/* A pipe or device has no ending to go by and gets a PNG. */
static gboolean kind_of(const char *path, Kind *kind, GError **error)
{
  static const char *const endings[N_KINDS] = { ".png", ".svg", ".pdf" };
  gsize len = strlen(path);
  for (*kind = 0; *kind < N_KINDS; (*kind)++)
    if (len > 4 && g_ascii_strcasecmp(path + len - 4, endings[*kind]) == 0)
      return TRUE;
  *kind = KIND_PNG;
  if (g_file_test(path, G_FILE_TEST_EXISTS) && !g_file_test(path, G_FILE_TEST_IS_REGULAR | G_FILE_TEST_IS_DIR))
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_UNSUPPORTED,
              "%s: the ending does not say what picture to write; use .png, .svg or .pdf", path);
  return FALSE;
}

static gboolean side_fits(const char *path, const char *side, double value, GError **error)
{
  if (value >= AW_MIN_CANVAS_SIDE && value <= AW_MAX_CANVAS_SIDE)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%s: a picture %d pixels %s cannot be drawn; the limits are %d to %d",
              path, (int)CLAMP(value, -1e9, 1e9), side, AW_MIN_CANVAS_SIDE, AW_MAX_CANVAS_SIDE);
  return FALSE;
}

static cairo_surface_t *make_surface(Kind kind, GByteArray *bytes, double width, double height)
{
  cairo_surface_t *surface = NULL;
  switch (kind) {
  case KIND_SVG:
    surface = cairo_svg_surface_create_for_stream(collect, bytes, width, height);
    cairo_svg_surface_set_document_unit(surface, CAIRO_SVG_UNIT_PX);
    return surface;
  case KIND_PDF:
    surface = cairo_pdf_surface_create_for_stream(collect, bytes, width, height);
    cairo_pdf_surface_set_metadata(surface, CAIRO_PDF_METADATA_CREATE_DATE, "");
    cairo_pdf_surface_set_metadata(surface, CAIRO_PDF_METADATA_CREATOR, "Aimwell " AW_VERSION);
    return surface;
  default:
    return cairo_image_surface_create(CAIRO_FORMAT_RGB24, (int)width, (int)height);
  }
}

static gboolean drawn_well(const AwCanvas *canvas, cairo_status_t status, GError **error)
{
  if (status == CAIRO_STATUS_SUCCESS)
    return TRUE;
  g_set_error(error, AW_ERROR, status == CAIRO_STATUS_NO_MEMORY ? AW_ERROR_MEMORY : AW_ERROR_IO,
              "%s: the picture could not be drawn: %s", canvas->path, cairo_status_to_string(status));
  return FALSE;
}

AwCanvas *aw_canvas_open(const char *path, double width, double height, GError **error)
{
  g_return_val_if_fail(path, NULL);
  Kind kind;
  if (!kind_of(path, &kind, error) || !side_fits(path, "wide", width, error) || !side_fits(path, "high", height, error))
    return NULL;
  AwCanvas *canvas = g_new0(AwCanvas, 1);
  canvas->path = g_strdup(path);
  canvas->kind = kind;
  canvas->bytes = g_byte_array_new();
  canvas->surface = make_surface(kind, canvas->bytes, width, height);
  canvas->cr = cairo_create(canvas->surface);
  cairo_set_source_rgb(canvas->cr, 1, 1, 1);
  cairo_paint(canvas->cr);
  if (drawn_well(canvas, cairo_status(canvas->cr), error))
    return canvas;
  aw_canvas_free(canvas);
  return NULL;
}

cairo_t *aw_canvas_cairo(AwCanvas *canvas)
{
  g_return_val_if_fail(canvas && canvas->cr, NULL);
  return canvas->cr;
}

void aw_canvas_set_title(AwCanvas *canvas, const char *title)
{
  g_return_if_fail(canvas && canvas->cr && title);
  g_autofree char *valid = g_utf8_make_valid(title, -1);
  if (canvas->kind == KIND_PDF)
    cairo_pdf_surface_set_metadata(canvas->surface, CAIRO_PDF_METADATA_TITLE, valid);
}

static gboolean renumber_one(const GMatchInfo *match, GString *out, gpointer data)
{
  GHashTable *seen = data;
  g_autofree char *before = g_match_info_fetch(match, 1), *name = g_match_info_fetch(match, 2);
  guint number = GPOINTER_TO_UINT(g_hash_table_lookup(seen, name));
  if (!number) {
    number = g_hash_table_size(seen) + 1;
    g_hash_table_insert(seen, g_strdup(name), GUINT_TO_POINTER(number));
  }
  g_string_append_printf(out, "%se%u", before, number);
  return FALSE;
}

/* cairo numbers SVG elements through the life of the process; here they are numbered by first appearance. */
static void renumber_svg(GByteArray *bytes)
{
  g_autoptr(GRegex) id = g_regex_new("(\\bid=\"|\"#|url\\(#)([A-Za-z]+[-0-9]+)", G_REGEX_RAW, 0, NULL);
  g_autoptr(GHashTable) seen = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, NULL);
  g_autofree char *text =
      g_regex_replace_eval(id, (const char *)bytes->data, (gssize)bytes->len, 0, 0, renumber_one, seen, NULL);
  if (!text)
    return;
  g_byte_array_set_size(bytes, 0);
  g_byte_array_append(bytes, (const guint8 *)text, (guint)strlen(text));
}

gboolean aw_canvas_commit(AwCanvas *canvas, GError **error)
{
  g_return_val_if_fail(canvas && canvas->cr, FALSE);
  cairo_status_t status = cairo_status(canvas->cr);
  g_clear_pointer(&canvas->cr, cairo_destroy);
  if (status == CAIRO_STATUS_SUCCESS && canvas->kind == KIND_PNG)
    status = cairo_surface_write_to_png_stream(canvas->surface, collect, canvas->bytes);
  cairo_surface_finish(canvas->surface);
  if (status == CAIRO_STATUS_SUCCESS)
    status = cairo_surface_status(canvas->surface);
  if (!drawn_well(canvas, status, error))
    return FALSE;
  if (canvas->kind == KIND_SVG)
    renumber_svg(canvas->bytes);
  return aw_output_write(canvas->path, (const char *)canvas->bytes->data, canvas->bytes->len, error);
}

void aw_canvas_free(AwCanvas *canvas)
{
  if (!canvas)
    return;
  g_clear_pointer(&canvas->cr, cairo_destroy);
  if (canvas->surface)
    cairo_surface_finish(canvas->surface); /* its last words go into bytes, so those are freed after it */
  g_clear_pointer(&canvas->surface, cairo_surface_destroy);
  g_byte_array_unref(canvas->bytes);
  g_free(canvas->path);
  g_free(canvas);
}

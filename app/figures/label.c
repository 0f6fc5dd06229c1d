/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/label.h"

#include <pango/pangocairo.h>

#include "base/text.h"

#define MAX_BYTES 4000 /* more than any page can show; keeps pango quick on absurd text */

/* Hinting and the locale's language would make the pixels depend on the machine. */
static void fix_context(PangoContext *context)
{
  cairo_font_options_t *options = cairo_font_options_create();
  cairo_font_options_set_hint_style(options, CAIRO_HINT_STYLE_NONE);
  cairo_font_options_set_hint_metrics(options, CAIRO_HINT_METRICS_OFF);
  cairo_font_options_set_antialias(options, CAIRO_ANTIALIAS_GRAY);
  pango_cairo_context_set_font_options(context, options);
  pango_cairo_context_set_resolution(context, 96);
  pango_context_set_language(context, pango_language_from_string("en"));
  pango_context_set_base_dir(context, PANGO_DIRECTION_LTR);
  cairo_font_options_destroy(options);
}

static PangoLayout *make_layout(cairo_t *cr, const AwLabel *label, const char *text)
{
  PangoLayout *layout = pango_cairo_create_layout(cr);
  fix_context(pango_layout_get_context(layout));
  PangoFontDescription *font = pango_font_description_from_string("DejaVu Sans");
  pango_font_description_set_absolute_size(font, label->size * PANGO_SCALE);
  pango_font_description_set_weight(font, label->bold ? PANGO_WEIGHT_BOLD : PANGO_WEIGHT_NORMAL);
  pango_layout_set_font_description(layout, font);
  pango_font_description_free(font);
  g_autofree char *valid = g_utf8_make_valid(text, (gssize)strnlen(text, MAX_BYTES));
  pango_layout_set_single_paragraph_mode(layout, TRUE);
  pango_layout_set_text(layout, valid, -1);
  if (label->max_width > 0) {
    pango_layout_set_width(layout, (int)(label->max_width * PANGO_SCALE));
    pango_layout_set_wrap(layout, PANGO_WRAP_WORD_CHAR);
    pango_layout_set_height(layout, -MAX(label->max_lines, 1));
    pango_layout_set_ellipsize(layout, PANGO_ELLIPSIZE_END);
  }
  static const PangoAlignment align[] = { PANGO_ALIGN_LEFT, PANGO_ALIGN_CENTER, PANGO_ALIGN_RIGHT };
  pango_layout_set_alignment(layout, align[label->align]);
  pango_cairo_update_layout(cr, layout);
  return layout;
}

double aw_label_draw_on(cairo_t *cr, const AwLabel *label, const AwPatchInk *patch, const char *text, double x,
                        double y)
{
  g_return_val_if_fail(text, 0);
  PangoLayout *layout = make_layout(cr, label, text);
  PangoRectangle ext;
  pango_layout_get_extents(layout, NULL, &ext);
  double width = (double)ext.width / PANGO_SCALE, height = (double)ext.height / PANGO_SCALE;
  x -= width * (label->align == AW_ALIGN_CENTRE ? 0.5 : label->align == AW_ALIGN_RIGHT);
  if (patch) {
    aw_style_set_ink(cr, patch->ink);
    aw_style_round_rect(cr, x - patch->pad, y, width + 2 * patch->pad, height, patch->corner);
    cairo_fill(cr);
  }
  cairo_move_to(cr, x - (double)ext.x / PANGO_SCALE, y);
  aw_style_set_ink(cr, label->ink);
  pango_cairo_show_layout(cr, layout);
  cairo_new_path(cr);
  g_object_unref(layout);
  return height;
}

double aw_label_draw(cairo_t *cr, const AwLabel *label, const char *text, double x, double y)
{
  return aw_label_draw_on(cr, label, NULL, text, x, y);
}

void aw_label_measure(cairo_t *cr, const AwLabel *label, const char *text, double *width, double *height)
{
  g_return_if_fail(text);
  PangoLayout *layout = make_layout(cr, label, text);
  PangoRectangle ext;
  pango_layout_get_extents(layout, NULL, &ext);
  g_object_unref(layout);
  if (width)
    *width = (double)ext.width / PANGO_SCALE;
  if (height)
    *height = (double)ext.height / PANGO_SCALE;
}

char *aw_label_count(gsize n)
{
  char digits[32];
  g_snprintf(digits, sizeof digits, "%" G_GSIZE_FORMAT, n);
  gsize len = strlen(digits);
  GString *out = g_string_new(NULL);
  for (gsize i = 0; i < len; i++) {
    if (i > 0 && (len - i) % 3 == 0)
      g_string_append(out, "\u202f");
    g_string_append_c(out, digits[i]);
  }
  return g_string_free(out, FALSE);
}

char *aw_label_length(double length_um)
{
  double size = fabs(length_um);
  const char *unit = size >= 1000 ? "mm" : size >= 1 || size == 0 ? "µm" : "nm";
  double value = size >= 1000 ? length_um / 1000 : size >= 1 || size == 0 ? length_um : length_um * 1000;
  double shown = fabs(value);
  int decimals = shown >= 100 ? 0 : shown >= 10 ? 1 : 2;
  if (!isfinite(length_um))
    return g_strdup("unknown length");
  g_autofree char *number = aw_text_from_double(value, decimals);
  return g_strdup_printf("%s %s", number, unit);
}

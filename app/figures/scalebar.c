/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/scalebar.h"

#include "figures/label.h"

double aw_scalebar_length(double max_um)
{
  if (!(max_um > 0) || !isfinite(max_um))
    return 0;
  double decade = pow(10, floor(log10(max_um)));
  double digits = max_um / decade * (1 + 1e-9);
  return decade * (digits >= 5 ? 5 : digits >= 2 ? 2 : 1);
}

/* "200 µm" rather than "200.0 µm": the value is round by construction. */
static char *round_length(double um)
{
  if (um >= 1000)
    return g_strdup_printf("%d mm", (int)MIN(um / 1000 + 0.5, 1e9));
  if (um >= 1)
    return g_strdup_printf("%d µm", (int)(um + 0.5));
  return aw_label_length(um);
}

double aw_scalebar_draw(cairo_t *cr, double x, double y, double max_width, double px_per_um, double u)
{
  double um = aw_scalebar_length(max_width / px_per_um);
  if (!(um > 0))
    return 0;
  g_autofree char *text = round_length(um);
  AwLabel label = { .size = 15 * u, .bold = TRUE, .ink = aw_ink_text };
  double width = um * px_per_um, height = aw_label_draw(cr, &label, text, x, y) + 2 * u;
  aw_style_set_ink(cr, aw_ink_text);
  cairo_rectangle(cr, x, y + height, width, 4 * u);
  cairo_rectangle(cr, x, y + height - 3 * u, 1.5 * u, 10 * u);
  cairo_rectangle(cr, x + width - 1.5 * u, y + height - 3 * u, 1.5 * u, 10 * u);
  cairo_fill(cr);
  return height + 7 * u;
}

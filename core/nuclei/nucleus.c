/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/nucleus.h"

#include <string.h>

#include "base/error.h"

#define FEATURE(stem, unit_um, unit_px, help, field)                                                                   \
  {                                                                                                                    \
    stem, unit_um, unit_px, help, G_STRUCT_OFFSET(AwNucleus, field)                                                    \
  }

static const AwFeature features[] = {
  FEATURE("area", "um2", "px2", "area of the mask", area),
  FEATURE("diameter", "um", "px", "diameter of the circle of equal area", diameter),
  FEATURE("convexity", "", "", "area over the area of the convex hull, 0 to 1", convexity),
  FEATURE("major", "um", "px", "long axis of the ellipse of equal second moments", major),
  FEATURE("minor", "um", "px", "short axis of the ellipse of equal second moments", minor),
  FEATURE("angle", "rad", "rad", "direction of the long axis against +x of the scan", angle_rad),
  FEATURE("mean", "", "", "mean pixel value", mean),
  FEATURE("background", "", "", "local background: median of a ring outside every mask", background),
  FEATURE("integrated", "", "", "sum of pixel value less background over the mask", integrated),
  FEATURE("sharpness", "per_um", "per_px", "steepest slope across the outline over the contrast", sharpness),
  FEATURE("isolation", "um", "px", "shortest distance to another outline", isolation),
  FEATURE("confidence", "", "", "one whole nucleus, rightly outlined: 0 to 1", confidence),
  FEATURE("area_ratio", "", "", "area over the dish's median area", area_ratio),
  FEATURE("saturated", "frac", "frac", "part of the pixels at the largest recorded value", saturated_frac),
  FEATURE("spread", "um", "px", "disagreement of the centroid between frames, rms radial", spread_um),
};

AwNucleus *aw_nucleus_copy(const AwNucleus *nucleus)
{
  g_return_val_if_fail(nucleus, NULL);
  AwNucleus *copy = g_memdup2(nucleus, sizeof *nucleus);
  copy->runs = g_memdup2(nucleus->runs, nucleus->n_runs * sizeof *nucleus->runs);
  copy->outline = g_memdup2(nucleus->outline, nucleus->n_outline * sizeof *nucleus->outline);
  return copy;
}

void aw_nucleus_free(AwNucleus *nucleus)
{
  if (!nucleus)
    return;
  g_free(nucleus->runs);
  g_free(nucleus->outline);
  g_free(nucleus);
}

static void free_element(gpointer nucleus)
{
  aw_nucleus_free(nucleus);
}

GPtrArray *aw_nuclei_new(void)
{
  return g_ptr_array_new_with_free_func(free_element);
}

const AwFeature *aw_features(gsize *n)
{
  *n = G_N_ELEMENTS(features);
  return features;
}

static char *join_name(const char *stem, const char *unit)
{
  return *unit ? g_strconcat(stem, "_", unit, NULL) : g_strdup(stem);
}

char *aw_feature_name(const AwFeature *feature, gboolean in_um)
{
  g_return_val_if_fail(feature, NULL);
  return join_name(feature->stem, in_um ? feature->unit_um : feature->unit_px);
}

static gboolean is_named(const AwFeature *feature, const char *name)
{
  g_autofree char *in_um = aw_feature_name(feature, TRUE);
  g_autofree char *in_px = aw_feature_name(feature, FALSE);
  return !strcmp(name, feature->stem) || !strcmp(name, in_um) || !strcmp(name, in_px);
}

const AwFeature *aw_feature_find(const char *name, GError **error)
{
  g_return_val_if_fail(name, NULL);
  g_autoptr(GString) all = g_string_new(NULL);
  for (gsize i = 0; i < G_N_ELEMENTS(features); i++) {
    if (is_named(&features[i], name))
      return &features[i];
    g_autofree char *known = aw_feature_name(&features[i], TRUE);
    g_string_append_printf(all, "%s%s", i ? ", " : "", known);
  }
  g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "there is no feature \"%s\"; the features are %s", name, all->str);
  return NULL;
}

char *aw_flags_text(guint flags)
{
  static const char *const words[] = { "border", "saturated", "defocused", "touching" };
  g_autoptr(GString) text = g_string_new(NULL);
  for (guint i = 0; i < G_N_ELEMENTS(words); i++)
    if (flags & (1u << i))
      g_string_append_printf(text, "%s%s", text->len ? "+" : "", words[i]);
  return g_string_free(g_steal_pointer(&text), FALSE);
}

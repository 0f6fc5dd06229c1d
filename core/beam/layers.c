/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "beam/layers.h"

#include <math.h>
#include <string.h>

#include "base/error.h"
#include "base/keyfile.h"

#define MAX_LAYERS 50
#define MAX_THICKNESS_UM 1e6

static void layer_free(gpointer p)
{
  AwLayer *layer = p;
  g_free(layer->name);
  g_free(layer);
}

void aw_beam_file_free(AwBeamFile *file)
{
  if (!file)
    return;
  g_clear_pointer(&file->layers, g_ptr_array_unref);
  g_free(file);
}

static gboolean need_number(AwKeyFile *kf, const char *group, const char *key, double min, double max, double *value,
                            GError **error)
{
  g_autofree char *text = aw_keyfile_need_text(kf, group, key, error);
  return text && aw_keyfile_double(kf, group, key, min, max, value, error);
}

static gboolean read_shape(AwKeyFile *kf, AwBeamFile *file, GError **error)
{
  g_autofree char *shape = aw_keyfile_text(kf, "beam", "shape", "gaussian");
  if (strcmp(shape, "disc") == 0) {
    file->shape = AW_CORE_DISC;
    return need_number(kf, "beam", "diameter-um", 0.01, 1000, &file->diameter_um, error);
  }
  if (strcmp(shape, "gaussian") != 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "group [beam], key shape: \"%s\" is neither gaussian nor disc",
                shape);
    return FALSE;
  }
  return aw_keyfile_double(kf, "beam", "sigma-x-um", 0.001, 1000, &file->sigma_x_um, error) &&
         aw_keyfile_double(kf, "beam", "sigma-y-um", 0.001, 1000, &file->sigma_y_um, error);
}

static gboolean read_halo(AwKeyFile *kf, AwBeamFile *file, GError **error)
{
  file->halo_entered = aw_keyfile_has(kf, "beam", "halo-frac");
  if (!aw_keyfile_double(kf, "beam", "halo-frac", 0, 1, &file->halo_frac, error))
    return FALSE;
  return file->halo_frac > 0
             ? need_number(kf, "beam", "halo-diameter-um", 0.01, 100000, &file->halo_diameter_um, error)
             : aw_keyfile_double(kf, "beam", "halo-diameter-um", 0.01, 100000, &file->halo_diameter_um, error);
}

static gboolean read_beam(AwKeyFile *kf, AwBeamFile *file, GError **error)
{
  g_autofree char *particle = aw_keyfile_need_text(kf, "beam", "particle", error);
  return particle && aw_particle_parse(particle, &file->particle, error) &&
         need_number(kf, "beam", "energy-mev", 0.01, 1000, &file->energy_mev, error) && read_shape(kf, file, error) &&
         read_halo(kf, file, error);
}

static AwLayer *read_layer(AwKeyFile *kf, const char *group, GError **error)
{
  AwLayer *layer = g_new0(AwLayer, 1);
  double density = 0;
  layer->name = aw_keyfile_text(kf, group, "name", group);
  g_autofree char *composition = aw_keyfile_need_text(kf, group, "composition", error);
  if (composition && need_number(kf, group, "thickness-um", 0, MAX_THICKNESS_UM, &layer->thickness_um, error) &&
      need_number(kf, group, "density-g-cm3", 0, 1000, &density, error)) {
    if (aw_material_from_composition(composition, density, &layer->material, error))
      return layer;
    g_prefix_error(error, "group [%s]: ", group);
  }
  layer_free(layer);
  return NULL;
}

static gboolean read_layers(AwKeyFile *kf, AwBeamFile *file, GError **error)
{
  file->layers = g_ptr_array_new_with_free_func(layer_free);
  for (int i = 1; i <= MAX_LAYERS; i++) {
    g_autofree char *group = g_strdup_printf("layer.%d", i);
    if (!aw_keyfile_has(kf, group, "composition") && !aw_keyfile_has(kf, group, "thickness-um"))
      break;
    AwLayer *layer = read_layer(kf, group, error);
    if (!layer)
      return FALSE;
    g_ptr_array_add(file->layers, layer);
  }
  return aw_keyfile_finish(kf, error);
}

static AwBeamFile *take(AwKeyFile *kf, const char *name, GError **error)
{
  g_autoptr(AwKeyFile) owned = kf;
  g_autoptr(AwBeamFile) file = g_new0(AwBeamFile, 1);
  if (!kf || !read_beam(kf, file, error) || !read_layers(kf, file, error)) {
    if (error && *error && !strstr((*error)->message, name))
      g_prefix_error(error, "%s: ", name);
    return NULL;
  }
  return g_steal_pointer(&file);
}

AwBeamFile *aw_beam_file_read(const char *path, GError **error)
{
  return take(aw_keyfile_read(path, error), path, error);
}

AwBeamFile *aw_beam_file_parse(const char *bytes, gsize n_bytes, const char *name, GError **error)
{
  return take(aw_keyfile_parse(bytes, n_bytes, name, error), name, error);
}

static const AwLayer *layer_of(const AwBeamFile *file, guint i)
{
  return file->layers->pdata[i];
}

static double radiation_lengths(const AwLayer *layer)
{
  return layer->thickness_um * 1e-4 * layer->material.density_g_cm3 / layer->material.radiation_length_g_cm2;
}

/* Each layer as water of equal stopping; `middle` gets the energy half-way through each. */
static gboolean slow_down(const AwBeamFile *file, double *middle, double *energy_mev, GError **error)
{
  *energy_mev = file->energy_mev;
  for (guint i = 0; i < file->layers->len; i++) {
    const AwLayer *layer = layer_of(file, i);
    double left, water_um = layer->thickness_um * layer->material.density_g_cm3 * layer->material.water_ratio;
    if (!aw_slow_down_water(file->particle, *energy_mev, water_um, &left, error)) {
      g_prefix_error(error, "in layer \"%s\": ", layer->name);
      return FALSE;
    }
    middle[i] = (*energy_mev + left) / 2;
    *energy_mev = left;
  }
  return TRUE;
}

/*
 * A layer's share of the squared angle is that of its thickness in the stack, taken at its own energy; over the
 * distance L behind it and its own thickness t it displaces by theta^2 (L^2 + L t + t^2 / 3) per axis.
 */
static void scatter(const AwBeamFile *file, const double *middle, AwBeamAtNucleus *at)
{
  double total = 0, behind_um = 0, angle2 = 0, shift2 = 0;
  for (guint i = 0; i < file->layers->len; i++)
    total += radiation_lengths(layer_of(file, i));
  for (guint i = file->layers->len; i-- > 0;) {
    const AwLayer *layer = layer_of(file, i);
    double whole =
        aw_highland_rad(aw_particle_p_beta_mev(file->particle, middle[i]), aw_particle_beta(file->particle, middle[i]),
                        aw_particle_charge(file->particle), total);
    double share2 = total > 0 ? whole * whole * radiation_lengths(layer) / total : 0;
    double t = layer->thickness_um;
    angle2 += share2;
    shift2 += share2 * (behind_um * behind_um + behind_um * t + t * t / 3);
    behind_um += t;
  }
  at->scatter_rad = sqrt(angle2);
  at->scatter_um = sqrt(shift2);
}

gboolean aw_beam_at_nucleus(const AwBeamFile *file, AwBeamAtNucleus *at, GError **error)
{
  g_autofree double *middle = g_new0(double, file->layers->len + 1);
  if (!slow_down(file, middle, &at->energy_mev, error) ||
      !aw_let_water(file->particle, at->energy_mev, &at->let_kev_per_um, error) ||
      !aw_range_water(file->particle, at->energy_mev, &at->range_left_um, error))
    return FALSE;
  scatter(file, middle, at);
  return TRUE;
}

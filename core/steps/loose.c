/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/loose.h"

#include <errno.h>
#include <glib/gstdio.h>
#include <string.h>

#include "base/csv.h"
#include "base/error.h"
#include "base/output.h"
#include "base/pool.h"
#include "image/reader.h"
#include "image/writer.h"
#include "nuclei/loose.h"
#include "plan/gates.h"
#include "steps/nucleustable.h"

/* One image's results, slot by slot, so that the table does not depend on the number of threads. */
typedef struct {
  char *rows; /* CSV text */
  gsize n_nuclei;
} Slot;

typedef struct {
  const AwLooseSettings *settings;
  Slot *slots;
  gboolean in_um;
} Job;

/* "dir/name.ome.tif" gives "name.ome": the last ending goes. */
static char *image_name(const char *path)
{
  char *name = g_path_get_basename(path);
  char *dot = strrchr(name, '.');
  if (dot && dot != name)
    *dot = '\0';
  return name;
}

/* Two images of one name would write one label file. */
static gboolean check_names(const AwLooseSettings *s, GError **error)
{
  g_autoptr(GHashTable) seen = g_hash_table_new_full(g_str_hash, g_str_equal, g_free, NULL);
  for (gsize i = 0; s->labels_folder && s->images[i]; i++) {
    char *name = image_name(s->images[i]);
    const char *before = g_hash_table_lookup(seen, name);
    if (before) {
      g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s and %s would both write %s/%s.tif; segment them separately",
                  before, s->images[i], s->labels_folder, name);
      g_free(name);
      return FALSE;
    }
    g_hash_table_insert(seen, name, (gpointer)(guintptr)s->images[i]);
  }
  return TRUE;
}

static gboolean make_folder(const char *folder, GError **error)
{
  if (g_file_test(folder, G_FILE_TEST_IS_DIR) || g_mkdir(folder, 0777) == 0)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_IO, "folder %s cannot be made: %s", folder, g_strerror(errno));
  return FALSE;
}

static void write_rows(Slot *slot, const char *path, GPtrArray *nuclei, gboolean in_um)
{
  GString *csv = g_string_new(NULL);
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *nucleus = nuclei->pdata[i];
    g_autoptr(GString) first = g_string_new(NULL);
    aw_csv_append(first, path, ',');
    g_string_append_printf(first, ",%" G_GINT64_FORMAT, nucleus->id);
    aw_nucleus_table_row(csv, first->str, nucleus, in_um);
  }
  slot->n_nuclei = nuclei->len;
  slot->rows = g_string_free(csv, FALSE);
}

/* Keeps the nuclei inside the default gates and gives them numbers without gaps. */
static void apply_gates(GPtrArray *nuclei)
{
  gsize n_gates;
  g_autofree AwGate *gates = aw_gates_default(&n_gates);
  for (guint i = nuclei->len; i-- > 0;)
    if (!aw_gates_pass(gates, n_gates, AW_GATES_DEFAULT_REFUSED, nuclei->pdata[i]))
      g_ptr_array_remove_index(nuclei, i);
  for (guint i = 0; i < nuclei->len; i++)
    ((AwNucleus *)nuclei->pdata[i])->id = i + 1;
}

static gboolean write_labels(const AwLooseSettings *s, const char *path, GPtrArray *nuclei, const AwImageInfo *info,
                             GError **error)
{
  g_autoptr(AwLabels) labels = aw_nuclei_paint(nuclei, info->width_px, info->height_px, error);
  g_autofree char *name = image_name(path);
  g_autofree char *file = g_strconcat(name, ".tif", NULL);
  g_autofree char *out = g_build_filename(s->labels_folder, file, NULL);
  return labels && aw_labels_write_tiff(labels, out, error);
}

static gboolean work_image(gsize item, guint worker, gpointer data, GError **error)
{
  (void)worker;
  const Job *job = data;
  const AwLooseSettings *s = job->settings;
  AwImageInfo info;
  AwLooseImage image = { s->images[item], s->page, s->channel, s->pixel_um };
  g_autoptr(GPtrArray) nuclei = aw_segment_file(&image, &s->segment, &info, error);
  if (!nuclei)
    return FALSE;
  if (s->gated)
    apply_gates(nuclei);
  write_rows(&job->slots[item], s->images[item], nuclei, job->in_um);
  return !s->labels_folder || write_labels(s, s->images[item], nuclei, &info, error);
}

static gboolean write_table(const char *path, const Job *job, gsize n, GError **error)
{
  g_autoptr(GString) csv = g_string_new(NULL);
  aw_nucleus_table_header(csv, "image,nucleus", job->in_um);
  for (gsize i = 0; i < n; i++)
    g_string_append(csv, job->slots[i].rows);
  return aw_output_write(path, csv->str, csv->len, error);
}

gboolean aw_step_segment_loose(const AwLooseSettings *settings, const AwStepContext *context, gsize *n_nuclei,
                               GError **error)
{
  gsize n = g_strv_length((char **)(guintptr)settings->images);
  if (!aw_segment_settings_check(&settings->segment, error) || !check_names(settings, error) ||
      (settings->labels_folder && !make_folder(settings->labels_folder, error)))
    return FALSE;
  g_autofree Slot *slots = g_new0(Slot, n);
  Job job = { settings, slots, settings->pixel_um > 0 };
  gboolean ok = aw_pool_run(context->n_threads, n, work_image, &job, "segmenting", context->progress, error) &&
                (!settings->table || write_table(settings->table, &job, n, error));
  *n_nuclei = 0;
  for (gsize i = 0; i < n; i++) {
    *n_nuclei += slots[i].n_nuclei;
    g_free(slots[i].rows);
  }
  return ok;
}

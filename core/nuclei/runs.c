/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/runs.h"

#include <string.h>

#include "base/error.h"

typedef struct {
  AwRun run;
  guint32 label;
} LabelRun;

/* First non-zero column from x on; four pixels are skipped together, since most of an image is background. */
static int skip_background(const guint32 *row, int x, int width)
{
  while (x + 4 <= width) {
    guint64 pair[2];
    memcpy(pair, row + x, sizeof pair);
    if (pair[0] | pair[1])
      break;
    x += 4;
  }
  while (x < width && row[x] == 0)
    x++;
  return x;
}

static void collect_row(const guint32 *row, int y, int width, GArray *runs)
{
  for (int x = skip_background(row, 0, width); x < width; x = skip_background(row, x, width)) {
    LabelRun run = { { y, x, x }, row[x] };
    while (x < width && row[x] == run.label)
      x++;
    run.run.x1 = x;
    g_array_append_val(runs, run);
  }
}

/* Marks labels that lie side by side in one row, and those that share columns with the row above. */
static void mark_touching(const LabelRun *above, gsize n_above, const LabelRun *row, gsize n_row, guint8 *touching)
{
  for (gsize i = 1; i < n_row; i++)
    if (row[i].run.x0 == row[i - 1].run.x1)
      touching[row[i].label] = touching[row[i - 1].label] = 1;
  for (gsize i = 0, j = 0; i < n_above && j < n_row;) {
    if (above[i].label != row[j].label && above[i].run.x0 < row[j].run.x1 && row[j].run.x0 < above[i].run.x1)
      touching[above[i].label] = touching[row[j].label] = 1;
    if (above[i].run.x1 < row[j].run.x1)
      i++;
    else
      j++;
  }
}

static gboolean check_label(guint32 label, guint32 n_labels, GError **error)
{
  if (label <= n_labels)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "label %u is larger than the number of labels, %u", label, n_labels);
  return FALSE;
}

static gboolean count_runs(GArray *all, AwRunTable *table, GError **error)
{
  const LabelRun *run = (const LabelRun *)(const void *)all->data;
  for (gsize i = 0; i < all->len; i++) {
    if (!check_label(run[i].label, table->n_labels, error))
      return FALSE;
    table->first[run[i].label + 1]++;
  }
  for (guint32 k = 1; k <= table->n_labels; k++) {
    if (table->first[k + 1] == 0) {
      g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "label %u of %u has no pixel", k, table->n_labels);
      return FALSE;
    }
    table->first[k + 1] += table->first[k];
  }
  return TRUE;
}

static gboolean sort_runs(GArray *all, AwRunTable *table, GError **error)
{
  if (!count_runs(all, table, error))
    return FALSE;
  const LabelRun *run = (const LabelRun *)(const void *)all->data;
  g_autofree gsize *next = g_memdup2(table->first, (table->n_labels + 2) * sizeof *next);
  table->runs = g_new(AwRun, all->len + 1);
  for (gsize i = 0; i < all->len; i++)
    table->runs[next[run[i].label]++] = run[i].run;
  gsize begin = 0, middle = 0;
  for (gsize end = 0; end <= all->len; end++)
    if (end == all->len || (end > middle && run[end].run.y != run[middle].run.y)) {
      gboolean adjoins = middle > begin && run[middle].run.y == run[begin].run.y + 1;
      mark_touching(run + begin, adjoins ? middle - begin : 0, run + middle, end - middle, table->touching);
      begin = middle;
      middle = end;
    }
  return TRUE;
}

AwRunTable *aw_run_table_new(const AwLabels *labels, GError **error)
{
  g_return_val_if_fail(labels, NULL);
  g_autoptr(GArray) all = g_array_new(FALSE, FALSE, sizeof(LabelRun));
  for (int y = 0; y < labels->height_px; y++)
    collect_row(labels->label + (gsize)y * (gsize)labels->width_px, y, labels->width_px, all);
  g_autoptr(AwRunTable) table = g_new0(AwRunTable, 1);
  table->n_labels = labels->n_labels;
  table->first = g_new0(gsize, (gsize)labels->n_labels + 2);
  table->touching = g_malloc0((gsize)labels->n_labels + 1);
  return sort_runs(all, table, error) ? g_steal_pointer(&table) : NULL;
}

void aw_run_table_free(AwRunTable *table)
{
  if (!table)
    return;
  g_free(table->runs);
  g_free(table->first);
  g_free(table->touching);
  g_free(table);
}

gboolean aw_runs_are_plain(const AwRun *runs, gsize n_runs)
{
  for (gsize i = 1; i < n_runs; i++)
    if (runs[i].y != runs[i - 1].y + 1 || runs[i].x0 >= runs[i - 1].x1 || runs[i - 1].x0 >= runs[i].x1)
      return FALSE;
  return TRUE;
}

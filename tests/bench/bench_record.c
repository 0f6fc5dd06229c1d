/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* How long a dish record takes for N nuclei (default 100000), and how large it gets. Prints one line per action. */
#include <stdio.h>
#include <stdlib.h>
#include <sys/stat.h>
#include <time.h>

#include "support/check.h"
#include "support/dish.h"

static gint64 started_us;
static clock_t started_cpu;

static void start(void)
{
  started_us = g_get_monotonic_time();
  started_cpu = clock();
}

static void show(AwRecord *record, const char *what, gboolean ok, GError *error)
{
  struct stat st;
  int cpu_ms = (int)((clock() - started_cpu) * 1000 / CLOCKS_PER_SEC);
  gint64 ms = (g_get_monotonic_time() - started_us) / 1000;
  if (!ok || stat(aw_record_path(record), &st) != 0) {
    fprintf(stderr, "%s: %s\n", what, error ? error->message : "no record");
    exit(1);
  }
  printf("%-34s %6d ms   CPU %6d ms   record %6d KiB\n", what, (int)ms, cpu_ms, (int)(st.st_size / 1024));
}

static gboolean store(AwRecord *record, GPtrArray *nuclei, const char *action, GError **error)
{
  return aw_record_begin(record, "bench", error) && aw_record_set_nuclei(record, nuclei, error) &&
         aw_record_commit(record, action, error);
}

/* Every nucleus moves and grows a little, as in a second segmentation with another sensitivity. */
static void shake(GPtrArray *nuclei)
{
  for (guint i = 0; i < nuclei->len; i++) {
    AwNucleus *nucleus = g_ptr_array_index(nuclei, i);
    nucleus->area += 1.5;
    nucleus->mean *= 1.01;
    for (gsize p = 0; p < nucleus->n_outline; p++)
      nucleus->outline[p].x_um += 0.125;
  }
}

static gboolean propose_all(AwRecord *record, gint64 n, GError **error)
{
  if (!aw_record_begin(record, "bench", error))
    return FALSE;
  for (gint64 id = 1; id <= n; id++) {
    const AwDecision decision = { id, AW_STATE_PROPOSED, FALSE };
    if (!aw_record_set_decision(record, &decision, error))
      return FALSE;
  }
  return aw_record_commit(record, "propose", error);
}

static gboolean set_tour(AwRecord *record, gint64 n, GError **error)
{
  g_autofree gint64 *ids = g_new(gint64, (gsize)n);
  for (gint64 i = 0; i < n; i++)
    ids[i] = n - i;
  return aw_record_begin(record, "bench", error) && aw_record_set_tour(record, ids, (gsize)n, error) &&
         aw_record_commit(record, "route", error);
}

static void measure_reading(AwRecord *record)
{
  GError *error = NULL;
  start();
  g_autoptr(GPtrArray) bare = aw_record_nuclei(record, FALSE, &error);
  show(record, "read without shapes", bare != NULL, error);
  start();
  g_autoptr(GPtrArray) whole = aw_record_nuclei(record, TRUE, &error);
  show(record, "read with shapes", whole != NULL, error);
  start();
  show(record, "check", aw_record_check(record, &error), error);
}

static void measure_deciding(AwRecord *record, gint64 n)
{
  GError *error = NULL;
  start();
  show(record, "propose all", propose_all(record, n, &error), error);
  start();
  show(record, "tour of all", set_tour(record, n, &error), error);
  start();
  aw_test_dish_accept(record, n / 2);
  show(record, "accept one", TRUE, NULL);
  for (int i = 0; i < 3; i++) {
    start();
    g_autofree char *what = NULL;
    gboolean ok = aw_record_undo(record, "bench", &what, &error);
    g_autofree char *line = g_strdup_printf("undo %s", ok ? what : "");
    show(record, line, ok, error);
  }
}

int main(int argc, char **argv)
{
  guint n = argc > 1 ? (guint)atoi(argv[1]) : 100000;
  GError *error = NULL;
  char *folder = aw_scratch_new();
  AwRecord *record = aw_test_dish_new(folder);
  GPtrArray *nuclei = aw_test_nuclei(n, 1, 3);
  printf("%u nuclei\n", n);
  start();
  show(record, "segment", store(record, nuclei, "segment", &error), error);
  measure_reading(record);
  shake(nuclei);
  start();
  show(record, "segment again, same ids", store(record, nuclei, "segment", &error), error);
  measure_deciding(record, n);
  start();
  show(record, "undo segment again", aw_record_undo(record, "bench", NULL, &error), error);
  start();
  show(record, "undo segment", aw_record_undo(record, "bench", NULL, &error), error);
  start();
  show(record, "redo segment", aw_record_redo(record, "bench", NULL, &error), error);
  g_ptr_array_unref(nuclei);
  aw_record_free(record);
  aw_scratch_remove(folder);
  return 0;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/csv.h"
#include "base/random.h"
#include "base/text.h"
#include "plan/tour.h"

/* Tours against proven optima: TSPLIB instances (Reinelt, ORSA J. Computing 3:376, 1991; EUC_2D, every distance
 * rounded to the nearest integer), the Held-Karp estimate for random points (Johnson, McGeoch & Rothberg, SODA 1996),
 * and lattices, whose optimum is known. Steps, not seconds, so that the figures repeat; with AIMWELL_TOUR_SECONDS set,
 * that budget takes the place of the steps. Lines "# tour," are the figures for results.csv. */

#define N_SEEDS 3
#define LOCAL_ONLY 0

typedef struct {
  const char *name;
  gint64 n_steps; /* about a second's worth */
  double limit;   /* percent over the optimum, median of the seeds */
} Instance;

static const Instance instances[] = { { "berlin52", 30000, 0 },  { "kroA100", 30000, 0 },  { "lin318", 30000, 0.8 },
                                      { "pcb442", 30000, 0.8 },  { "rat783", 30000, 0.8 }, { "pr1002", 30000, 0.8 },
                                      { "pcb3038", 30000, 0.8 }, { "d15112", 20000, 0.8 } };

static int n_tests;

static void check(gboolean ok, const char *what, double value, double limit)
{
  g_autofree char *a = aw_text_from_double(value, 3);
  g_autofree char *b = aw_text_from_double(limit, 3);
  g_print("%s %d - %s: %s (limit %s)\n", ok ? "ok" : "not ok", ++n_tests, what, a, b);
}

static AwStop *read_instance(const char *folder, const char *name, gsize *n)
{
  g_autofree char *path = g_strdup_printf("%s/tsplib/%s.tsp", folder, name);
  g_autofree char *text = NULL;
  if (!g_file_get_contents(path, &text, NULL, NULL))
    return NULL;
  char *p = strstr(text, "NODE_COORD_SECTION");
  GArray *stops = g_array_new(FALSE, FALSE, sizeof(AwStop));
  for (p = p ? strchr(p, '\n') : NULL; p;) {
    char *end;
    if (g_ascii_strtoll(p, &end, 10) <= 0 || end == p)
      break;
    AwStop s = { g_ascii_strtod(end, &p), 0 };
    s.y = g_ascii_strtod(p, &p);
    g_array_append_val(stops, s);
  }
  *n = stops->len;
  return (AwStop *)(gpointer)g_array_free(stops, FALSE);
}

static double optimum_of(const char *folder, const char *name)
{
  g_autofree char *path = g_strdup_printf("%s/tsplib/optima.csv", folder);
  g_autoptr(AwCsv) csv = aw_csv_read(path, ',', NULL);
  double optimum = 0;
  for (gsize i = 0; csv && i < aw_csv_n_rows(csv); i++)
    if (strcmp(aw_csv_text(csv, i, 0), name) == 0)
      aw_csv_double(csv, i, (gsize)aw_csv_find(csv, "optimum"), &optimum, NULL);
  return optimum;
}

static int compare(const void *a, const void *b)
{
  double u = *(const double *)a, v = *(const double *)b;
  return (u > v) - (u < v);
}

/* Percent over the optimum, median of the seeds. */
static double median_over(const AwStop *stops, gsize n, double optimum, double unit, gint64 n_steps)
{
  double over[N_SEEDS];
  const char *seconds = g_getenv("AIMWELL_TOUR_SECONDS");
  for (int i = 0; i < N_SEEDS; i++) {
    AwTourSettings set = { .closed = TRUE, .first = -1, .last = -1, .n_steps = n_steps, .unit = unit };
    set.seed = (guint64)i + 1;
    set.budget_s = seconds && n_steps != LOCAL_ONLY ? g_ascii_strtod(seconds, NULL) : 0;
    g_autoptr(AwTour) tour = aw_tour_find(stops, n, &set, NULL, NULL);
    over[i] = 100 * (tour->final / optimum - 1);
  }
  qsort(over, N_SEEDS, sizeof *over, compare);
  return over[N_SEEDS / 2];
}

static void note(const char *what, const char *name, double value)
{
  g_autofree char *text = aw_text_from_double(value, 3);
  g_print("# tour,%s,%s,%s\n", what, name, text);
}

static void check_instances(const char *folder)
{
  double local_sum = 0, local_worst = 0, middle_sum = 0;
  gsize n_middle = 0;
  for (gsize i = 0; i < G_N_ELEMENTS(instances); i++) {
    const Instance *in = &instances[i];
    gsize n = 0;
    g_autofree AwStop *stops = read_instance(folder, in->name, &n);
    double optimum = optimum_of(folder, in->name);
    if (!stops || optimum <= 0) {
      g_print("not ok %d - %s cannot be read\n", ++n_tests, in->name);
      continue;
    }
    double local = median_over(stops, n, optimum, 1, LOCAL_ONLY);
    double over = median_over(stops, n, optimum, 1, in->n_steps);
    note("local_over_optimum_percent", in->name, local);
    note("over_optimum_percent", in->name, over);
    local_sum += local;
    local_worst = MAX(local_worst, local);
    if (n > 300 && n < 10000) {
      middle_sum += over;
      n_middle++;
    }
    check(over <= in->limit, in->name, over, in->limit);
  }
  double n_all = G_N_ELEMENTS(instances);
  check(local_sum / n_all <= 6, "mean of the local search", local_sum / n_all, 6);
  check(local_worst <= 9, "worst of the local search", local_worst, 9);
  check(n_middle && middle_sum / (double)n_middle <= 0.3, "mean of lin318 to pcb3038",
        middle_sum / (double)MAX(n_middle, 1), 0.3);
}

/* A lattice of w x w stops, w even: the shortest closed tour has w x w steps of one pitch. */
static void check_lattice(gsize w)
{
  g_autofree AwStop *stops = g_new(AwStop, w * w);
  for (gsize i = 0; i < w * w; i++)
    stops[i] = (AwStop){ 250.0 * (double)(i % w), 250.0 * (double)(i / w) };
  double over = median_over(stops, w * w, 250.0 * (double)(w * w), 0, 20000);
  g_autofree char *name = g_strdup_printf("lattice%" G_GSIZE_FORMAT, w * w);
  note("over_optimum_percent", name, over);
  check(over <= 0.8, name, over, 0.8);
}

static void check_random(gsize n, double limit)
{
  g_autofree AwStop *stops = g_new(AwStop, n);
  AwRandom r = aw_random_stream(1, n);
  for (gsize i = 0; i < n; i++) {
    stops[i].x = 1e6 * aw_random_unit(&r);
    stops[i].y = 1e6 * aw_random_unit(&r);
  }
  double m = (double)n, root = sqrt(m);
  double bound = 1e6 * root * (0.70805 + 0.52229 / root + 1.31572 / m - 3.07474 / (m * root));
  AwTourSettings set = { .closed = TRUE, .first = -1, .last = -1, .n_steps = -1, .seed = 1 };
  g_autoptr(AwTour) tour = aw_tour_find(stops, n, &set, NULL, NULL);
  double over = 100 * (tour->final / bound - 1);
  g_autofree char *name = g_strdup_printf("random%" G_GSIZE_FORMAT, n);
  note("over_held_karp_percent", name, over);
  check(over <= limit && over > -1, name, over, limit);
}

int main(void)
{
  const char *folder = g_getenv("AIMWELL_OPENDATA");
  g_autofree char *optima = g_strdup_printf("%s/tsplib/optima.csv", folder ? folder : "../shared/opendata");
  g_autofree char *found = g_path_get_dirname(optima);
  g_autofree char *open_data = g_path_get_dirname(found);
  if (g_file_test(optima, G_FILE_TEST_EXISTS))
    check_instances(open_data);
  else
    g_print("ok %d - tsplib # SKIP no open data at %s\n", ++n_tests, optima);
  check_lattice(20);
  check_lattice(50);
  check_random(10000, 3);
  check_random(100000, 3);
  g_print("1..%d\n", n_tests);
  return 0;
}

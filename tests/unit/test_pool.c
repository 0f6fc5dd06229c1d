/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/pool.h"

#include "../support/check.h"
#include "base/limits.h"
#include "base/random.h"

#define N_ITEMS 500

typedef struct {
  guint64 slot[N_ITEMS];
  gint n_calls;
  guint n_threads;
  gsize first_bad, second_bad; /* items that fail */
  AwProgress *stop_after_20;
} Work;

static gboolean work_item(gsize item, guint worker, gpointer data, GError **error)
{
  Work *work = data;
  g_assert_cmpuint(worker, <, work->n_threads);
  AwRandom r = aw_random_stream(5, item);
  for (guint32 i = aw_random_below(&r, 2000); i > 0; i--) /* uneven items */
    work->slot[item] += aw_random_bits(&r);
  if (g_atomic_int_add(&work->n_calls, 1) == 20 && work->stop_after_20)
    aw_progress_cancel(work->stop_after_20);
  if (item != work->first_bad && item != work->second_bad)
    return TRUE;
  g_set_error(error, AW_ERROR, AW_ERROR_FORMAT, "item %d", (int)item);
  return FALSE;
}

static Work *new_work(guint n_threads)
{
  Work *work = g_new0(Work, 1);
  work->n_threads = n_threads;
  work->first_bad = work->second_bad = N_ITEMS;
  return work;
}

static void same_for_any_threads(void)
{
  GError *error = NULL;
  g_autofree Work *one = new_work(1);
  g_assert_true(aw_pool_run(1, N_ITEMS, work_item, one, "items", NULL, &error));
  for (guint n = 2; n <= 8; n++) {
    g_autofree Work *many = new_work(n);
    g_assert_true(aw_pool_run(n, N_ITEMS, work_item, many, "items", NULL, &error));
    g_assert_no_error(error);
    g_assert_cmpmem(one->slot, sizeof one->slot, many->slot, sizeof many->slot);
    g_assert_cmpint(many->n_calls, ==, N_ITEMS);
  }
}

static void lowest_error_wins(void)
{
  for (guint n = 1; n <= 8; n++) {
    GError *error = NULL;
    g_autofree Work *work = new_work(n);
    work->first_bad = 117;
    work->second_bad = 118;
    g_assert_false(aw_pool_run(n, N_ITEMS, work_item, work, "items", NULL, &error));
    aw_check_error(&error, AW_ERROR_FORMAT, "item 117");
    g_assert_cmpint(work->n_calls, >=, 118);
    g_assert_cmpint(work->n_calls, <, N_ITEMS);
  }
}

static void cancelled(void)
{
  for (guint n = 1; n <= 8; n++) {
    GError *error = NULL;
    AwProgress progress = { 0 };
    g_autofree Work *work = new_work(n);
    work->stop_after_20 = &progress;
    g_assert_false(aw_pool_run(n, N_ITEMS, work_item, work, "items", &progress, &error));
    aw_check_error(&error, AW_ERROR_CANCELLED, "stopped on request");
    g_assert_cmpint(work->n_calls, >, 20);
    g_assert_cmpint(work->n_calls, <=, 21 + (int)n);
  }
}

static void edges(void)
{
  GError *error = NULL;
  g_autofree Work *work = new_work(AW_MAX_THREADS);
  g_assert_true(aw_pool_run(4, 0, work_item, work, "nothing", NULL, &error));
  g_assert_cmpint(work->n_calls, ==, 0);
  g_assert_true(aw_pool_run(0, 3, work_item, work, "three", NULL, &error));
  g_assert_cmpint(work->n_calls, ==, 3);
  g_assert_cmpuint(aw_pool_n_threads(0), ==, MIN(g_get_num_processors(), AW_MAX_THREADS));
  g_assert_cmpuint(aw_pool_n_threads(3), ==, 3);
  g_assert_cmpuint(aw_pool_n_threads(100000), ==, AW_MAX_THREADS);
}

typedef struct {
  double last;
  int n;
} Seen;

static void note(const char *what, double done_frac, gpointer data)
{
  Seen *seen = data;
  g_assert_cmpstr(what, ==, "items");
  g_assert_cmpfloat(done_frac, >, seen->last);
  seen->last = done_frac;
  seen->n++;
}

static void progress_rises(void)
{
  Seen seen = { 0 };
  AwProgress progress = { note, &seen, 0 };
  g_autofree Work *work = new_work(4);
  g_assert_true(aw_pool_run(4, N_ITEMS, work_item, work, "items", &progress, NULL));
  g_assert_cmpfloat(seen.last, ==, 1);
  g_assert_cmpint(seen.n, ==, N_ITEMS);
}

static void note_clamped(const char *what, double done_frac, gpointer data)
{
  (void)what;
  *(double *)data = done_frac;
}

static void progress_alone(void)
{
  double seen = -1;
  GError *error = NULL;
  AwProgress progress = { note_clamped, &seen, 0 };
  aw_progress_report(&progress, "x", 1.5);
  g_assert_cmpfloat(seen, ==, 1);
  aw_progress_report(&progress, "x", -0.5);
  g_assert_cmpfloat(seen, ==, 0);
  aw_progress_report(NULL, "x", 0.5);
  g_assert_false(aw_progress_stopped(NULL, &error));
  g_assert_false(aw_progress_stopped(&progress, &error));
  g_assert_no_error(error);
  aw_progress_cancel(&progress);
  g_assert_true(aw_progress_stopped(&progress, &error));
  aw_check_error(&error, AW_ERROR_CANCELLED, "stopped on request");
}

static void allocation(void)
{
  GError *error = NULL;
  g_autofree guint8 *block = aw_try_alloc(1000, 3, "a test", &error);
  g_assert_no_error(error);
  for (int i = 0; i < 3000; i++)
    g_assert_cmpuint(block[i], ==, 0);
  g_autofree guint8 *none = aw_try_alloc(0, 8, "nothing", &error);
  g_assert_nonnull(none);
  g_assert_null(aw_try_alloc(G_MAXSIZE / 2, 3, "a test", &error));
  aw_check_error(&error, AW_ERROR_MEMORY, "not enough memory for a test (9223372036854775807 items of 3 bytes)");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/base/pool/same_for_any_threads", same_for_any_threads);
  g_test_add_func("/base/pool/lowest_error_wins", lowest_error_wins);
  g_test_add_func("/base/pool/cancelled", cancelled);
  g_test_add_func("/base/pool/edges", edges);
  g_test_add_func("/base/pool/progress_rises", progress_rises);
  g_test_add_func("/base/progress/alone", progress_alone);
  g_test_add_func("/base/limits/allocation", allocation);
  return g_test_run();
}

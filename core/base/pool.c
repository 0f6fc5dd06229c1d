/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/pool.h"

#include <pthread.h>

#include "base/error.h"
#include "base/limits.h"

typedef struct {
  gsize n_items, next, n_done, failed_item;
  AwPoolItem fn;
  gpointer data;
  const char *what;
  AwProgress *progress;
  GError *failure;
  pthread_mutex_t lock; /* guards next, n_done, failed_item and failure */
} Run;

typedef struct {
  Run *run;
  guint worker;
} Seat;

guint aw_pool_n_threads(guint n_threads)
{
  return CLAMP(n_threads ? n_threads : g_get_num_processors(), 1, AW_MAX_THREADS);
}

static void note_failure(Run *run, gsize item, GError *failure)
{
  if (run->failure && run->failed_item <= item) {
    g_error_free(failure);
    return;
  }
  g_clear_error(&run->failure);
  run->failure = failure;
  run->failed_item = item;
}

/* Takes the next item, or FALSE when the run is over; every item before a failed one has been begun. */
static gboolean take_item(Run *run, gsize *item)
{
  GError *stopped = NULL;
  pthread_mutex_lock(&run->lock);
  if (!run->failure && aw_progress_stopped(run->progress, &stopped))
    note_failure(run, run->next, stopped);
  gboolean any = !run->failure && run->next < run->n_items;
  if (any)
    *item = run->next++;
  pthread_mutex_unlock(&run->lock);
  return any;
}

static void finish_item(Run *run, gsize item, gboolean ok, GError *failure)
{
  pthread_mutex_lock(&run->lock);
  if (ok)
    aw_progress_report(run->progress, run->what, (double)++run->n_done / (double)run->n_items);
  else
    note_failure(run, item, failure);
  pthread_mutex_unlock(&run->lock);
}

static void *work(void *arg)
{
  Seat *seat = arg;
  gsize item = 0;
  while (take_item(seat->run, &item)) {
    GError *failure = NULL;
    gboolean ok = seat->run->fn(item, seat->worker, seat->run->data, &failure);
    finish_item(seat->run, item, ok, failure);
  }
  return NULL;
}

/* Starts what threads the system grants; the caller works the first seat itself, so the run always ends. */
static void run_seats(Run *run, guint n)
{
  g_autofree Seat *seats = g_new(Seat, n);
  g_autofree pthread_t *threads = g_new(pthread_t, n);
  guint n_started = 0;
  for (guint i = 0; i < n; i++)
    seats[i] = (Seat){ run, i };
  for (guint i = 1; i < n; i++)
    if (pthread_create(&threads[n_started], NULL, work, &seats[i]) == 0)
      n_started++;
  work(&seats[0]);
  for (guint i = 0; i < n_started; i++)
    pthread_join(threads[i], NULL);
}

gboolean aw_pool_run(guint n_threads, gsize n_items, AwPoolItem fn, gpointer data, const char *what,
                     AwProgress *progress, GError **error)
{
  Run run = { .n_items = n_items, .fn = fn, .data = data, .what = what, .progress = progress };
  pthread_mutex_init(&run.lock, NULL);
  run_seats(&run, (guint)CLAMP(n_items, 1, aw_pool_n_threads(n_threads)));
  pthread_mutex_destroy(&run.lock);
  if (!run.failure)
    return TRUE;
  g_propagate_error(error, run.failure);
  return FALSE;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Fuzzing of the dish record: bytes that claim to be one are opened, checked, read whole, and undone and redone. */
#include "fuzz.h"

#include <stdio.h>
#include <unistd.h>

#include "record/files.h"

static void read_all(AwRecord *record)
{
  AwPixelMap map;
  gint64 id;
  aw_record_check(record, NULL);
  aw_record_pixel_map(record, &map, NULL);
  aw_record_next_nucleus_id(record, &id, NULL);
  GPtrArray *const lists[] = { aw_record_journal(record, NULL), aw_record_frames(record, NULL),
                               aw_record_nuclei(record, FALSE, NULL), aw_record_nuclei(record, TRUE, NULL) };
  GArray *const arrays[] = { aw_record_decisions(record, NULL), aw_record_gates(record, NULL),
                             aw_record_tour(record, NULL) };
  for (gsize i = 0; i < G_N_ELEMENTS(lists); i++)
    if (lists[i])
      g_ptr_array_unref(lists[i]);
  for (gsize i = 0; i < G_N_ELEMENTS(arrays); i++)
    if (arrays[i])
      g_array_unref(arrays[i]);
}

static void change(AwRecord *record)
{
  if (aw_record_undo(record, "fuzz", NULL, NULL))
    aw_record_redo(record, "fuzz", NULL, NULL);
  if (aw_record_begin(record, "fuzz", NULL)) {
    g_autoptr(GPtrArray) none = aw_nuclei_new();
    aw_record_set_nuclei(record, none, NULL);
    aw_record_commit(record, "no nuclei", NULL);
  }
}

static gboolean write_file(const char *path, const uint8_t *bytes, size_t n)
{
  FILE *file = fopen(path, "wb");
  size_t n_written = file ? fwrite(bytes, 1, n, file) : 0;
  return file && fclose(file) == 0 && n_written == n;
}

void fuzz_record(const uint8_t *bytes, size_t n)
{
  /* One name for each process, in memory where the machine has such a place. */
  g_autofree char *path =
      g_strdup_printf("%s/aimwell-fuzz-%ld.dish", access("/dev/shm", W_OK) ? "/tmp" : "/dev/shm", (long)getpid());
  g_autofree char *journal = g_strconcat(path, "-journal", NULL);
  AwRecord *record = write_file(path, bytes, n) ? aw_record_open(path, AW_RECORD_WRITE, NULL) : NULL;
  if (record) {
    read_all(record);
    change(record);
  }
  aw_record_free(record);
  unlink(path);
  unlink(journal);
}

FUZZ_ENTRY(record)

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Runs every seed of tests/fuzz/corpus through its harness: what once broke a reader stays mended. */
#include <string.h>

#include "../fuzz/fuzz.h"

#define CORPUS "tests/fuzz/corpus" /* tests run from the top of the tree */

typedef struct {
  const char *name;
  void (*run)(const uint8_t *bytes, size_t n);
} Harness;

#define FUZZ_HARNESS(name) { #name, fuzz_##name },
static const Harness harnesses[] = { FUZZ_HARNESSES };
#undef FUZZ_HARNESS

static void replay(gconstpointer data)
{
  const Harness *harness = data;
  g_autoptr(GError) error = NULL;
  g_autofree char *folder = g_build_filename(CORPUS, harness->name, NULL);
  g_autoptr(GDir) dir = g_dir_open(folder, 0, &error);
  g_assert_no_error(error);
  guint n_seeds = 0;
  for (const char *name; (name = g_dir_read_name(dir)); n_seeds++) {
    g_autofree char *path = g_build_filename(folder, name, NULL), *bytes = NULL;
    gsize n;
    g_assert_true(g_file_get_contents(path, &bytes, &n, &error));
    g_test_message("%s", path);
    harness->run((const uint8_t *)bytes, n);
  }
  g_assert_cmpuint(n_seeds, >, 0);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  for (gsize i = 0; i < G_N_ELEMENTS(harnesses); i++) {
    g_autofree char *path = g_strconcat("/fuzz/replay/", harnesses[i].name, NULL);
    g_test_add_data_func(path, &harnesses[i], replay);
  }
  return g_test_run();
}

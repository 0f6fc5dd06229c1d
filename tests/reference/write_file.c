/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Writes N bytes 'x' through AwOutput, for test_output_faults.py: write_file FILE N. An error goes to stderr; exit 1.
 */
#include <stdio.h>
#include <stdlib.h>

#include "base/output.h"

int main(int argc, char **argv)
{
  if (argc != 3)
    return 2;
  g_autoptr(GError) error = NULL;
  gsize n = (gsize)g_ascii_strtoull(argv[2], NULL, 10);
  g_autofree char *bytes = g_strnfill(n, 'x');
  aw_output_prepare_process();
  if (aw_output_write(argv[1], bytes, n, &error))
    return 0;
  fprintf(stderr, "%s\n", error->message);
  return 1;
}

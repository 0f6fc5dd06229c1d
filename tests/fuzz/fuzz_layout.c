/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a layout: no crash, and whatever layout is accepted writes a list that reads back right. */
#include <string.h>

#include "base/error.h"
#include "fuzz.h"
#include "plan/layout.h"

void fuzz_layout(const uint8_t *bytes, size_t n)
{
  static const AwTargetRow rows[] = { { 1, 17, { 1234.56789, -20.0004 }, { 1200.5, 31.25 }, 5, "irradiate" },
                                      { 2, 4, { -98765.432, 0.001 }, { 1e7, -1e7 }, 1, "irradiate" },
                                      { 3, 5, { 50, 50 }, { 0, 0 }, 0, "sham" } };
  const AwTargetHead head = { "dish", "abc", "one\ntwo", "2031-05-04T12:00:00Z" };
  g_autoptr(GError) error = NULL;
  g_autoptr(AwLayout) layout = aw_layout_parse((const char *)bytes, n, "fuzz", &error);
  g_assert_true((layout == NULL) == (error != NULL));
  if (!layout)
    return;
  gboolean written = aw_target_list_write(layout, &head, rows, G_N_ELEMENTS(rows), "/dev/null", NULL, &error);
  if (!written && g_error_matches(error, AW_ERROR, AW_ERROR_VERIFY))
    g_assert_cmpstr(error->message, ==, NULL); /* shows the message */
}

FUZZ_ENTRY(layout)

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "../support/check.h"
#include "plan/layout.h"

static const AwTargetRow rows[] = { { 1, 17, { 1234.56789, -20.00004 }, { 0, 0 }, 5, "irradiate" },
                                    { 2, 4, { -0.00001, 98765.4321 }, { 0, 0 }, 0, "sham" } };

static void canonical_text(void)
{
  g_autofree char *text = aw_plan_canonical_text(rows, 2);
  g_assert_cmpstr(text, ==,
                  "aimwell plan 1 targets 2\n"
                  "1 17 1234.568 -20.000 5 irradiate\n"
                  "2 4 0.000 98765.432 0 sham\n");
}

/* By sha256sum (GNU coreutils) of that text, and of its first line with 0 targets. */
static void sha256(void)
{
  g_autofree char *hash = aw_plan_hash(rows, 2);
  g_assert_cmpstr(hash, ==, "caeed7a4f57c7be0244be5b4a8d76c3043107dec184010cbcc39066e7da13eb0");
  g_autofree char *none = aw_plan_hash(NULL, 0);
  g_assert_cmpstr(none, ==, "448b69ac738d881721fd5766baf90df2e625b1919f9b5792fb4d5670b44b1320");
}

static void every_field_counts(void)
{
  g_autofree char *hash = aw_plan_hash(rows, 2);
  for (int field = 0; field < 8; field++) {
    AwTargetRow changed[2] = { rows[0], rows[1] };
    gsize n = 2;
    switch (field) {
    case 0:
      changed[1].target = 3;
      break;
    case 1:
      changed[1].nucleus_id = 5;
      break;
    case 2:
      changed[0].at.bx_um += 0.001;
      break;
    case 3:
      changed[0].at.by_um += 0.001;
      break;
    case 4:
      changed[0].n_particles = 4;
      break;
    case 5:
      changed[1].arm = "irradiate";
      break;
    case 6:
      n = 1;
      break;
    default:
      changed[0] = rows[1];
      changed[1] = rows[0];
    }
    g_autofree char *other = aw_plan_hash(changed, n);
    g_assert_cmpstr(other, !=, hash);
  }
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/plan/planhash/canonical_text", canonical_text);
  aw_check_add("/plan/planhash/sha256", sha256);
  aw_check_add("/plan/planhash/every_field_counts", every_field_counts);
  return g_test_run();
}

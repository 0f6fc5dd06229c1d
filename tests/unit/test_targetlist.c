/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <fcntl.h>
#include <glib/gstdio.h>
#include <math.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

#include "../support/check.h"
#include "base/output.h"
#include "plan/cautions.h"
#include "plan/layoutcolumns.h"

static const AwTargetRow rows[] = {
  { 1, 17, { 1234.56789, -20.0004 }, { 1200.5, 31.25 }, 5, "irradiate" },
  { 2, 4, { 1240.126, 0 }, { 1206.0625, 51.5 }, 0, "sham" },
  { 3, 123456, { -0.0002, 30987.6543 }, { -33.75, 31000 }, 1, "irradiate" },
};
static const AwTargetHead head = { "dish 7", NULL, "relocation: three marks\noffset: knife edge",
                                   "2031-05-04T12:00:00Z" };

static char *folder;

static AwTargetHead full_head(char **hash)
{
  AwTargetHead full = head;
  full.plan_hash = *hash = aw_plan_hash(rows, G_N_ELEMENTS(rows));
  return full;
}

static AwLayout *layout_of(const char *text)
{
  g_autoptr(GError) error = NULL;
  AwLayout *layout =
      text[0] == '[' ? aw_layout_parse(text, strlen(text), "l.layout", &error) : aw_layout_load(text, &error);
  g_assert_no_error(error);
  return layout;
}

/* Writes the three rows and gives the text; the file is called "list". */
static char *written(const char *layout_text)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(AwLayout) layout = layout_of(layout_text);
  g_autofree char *path = g_build_filename(folder, "list", NULL), *hash = NULL;
  AwTargetHead full = full_head(&hash);
  gboolean in_memory = TRUE;
  g_assert_true(aw_target_list_write(layout, &full, rows, G_N_ELEMENTS(rows), path, &in_memory, &error));
  g_assert_no_error(error);
  g_assert_false(in_memory);
  char *text = NULL;
  g_assert_true(g_file_get_contents(path, &text, NULL, NULL));
  return text;
}

static char *expected(const char *name)
{
  g_autofree char *path = g_build_filename("tests", "unit", "expected", name, NULL);
  g_autoptr(GError) error = NULL;
  char *text = NULL;
  g_file_get_contents(path, &text, NULL, &error);
  g_assert_no_error(error);
  return text;
}

static void assert_file(const char *name, const char *expected_name)
{
  g_autofree char *path = g_build_filename(folder, name, NULL), *want = expected(expected_name), *got = NULL;
  g_assert_true(g_file_get_contents(path, &got, NULL, NULL));
  g_assert_cmpstr(got, ==, want);
}

static void setup(void)
{
  folder = aw_scratch_new();
}

static void finish(void)
{
  aw_scratch_remove(g_steal_pointer(&folder));
}

static void expected_files(void)
{
  static const struct {
    const char *layout, *list, *beside;
  } cases[] = { { "csv", "targets.csv", NULL },
                { "tsv", "targets.tsv", NULL },
                { "sampleimages/layouts/heron.layout", "targets-heron.csv", "targets-heron.csv.txt" } };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    setup();
    g_free(written(cases[i].layout));
    assert_file("list", cases[i].list);
    if (cases[i].beside)
      assert_file("list.txt", cases[i].beside);
    g_assert_cmpint(aw_scratch_count(folder), ==, cases[i].beside ? 2 : 1);
    finish();
  }
}

/* Blank-parted whole steps without a header; every number by hand: 1234.56789 um / 0.05 um = 24691.36 steps. */
static void steps_without_header(void)
{
  setup();
  const AwTargetRow inside[] = { { 1, 17, { 1234.56789, 20.0004 }, { 0, 0 }, 5, "irradiate" },
                                 { 2, 4, { 99999.99, 0 }, { 0, 0 }, 0, "sham" } };
  g_autofree char *hash = NULL, *path = g_build_filename(folder, "list", NULL), *text = NULL;
  AwTargetHead full = full_head(&hash);
  g_autoptr(AwLayout) layout = layout_of("sampleimages/layouts/willow.layout");
  g_assert_true(aw_target_list_write(layout, &full, inside, 2, path, NULL, NULL));
  g_assert_true(g_file_get_contents(path, &text, NULL, NULL));
  g_assert_true(g_str_has_suffix(text, "Z\n400 1975309 irradiate 5 0 17\n0 0 sham 0 1 4\n"));
  g_autoptr(AwTargetList) back = aw_target_list_read(layout, path, NULL);
  g_assert_cmpfloat_with_epsilon(back->rows[0].at.bx_um, 1234.56789, 0.025);
  g_assert_cmpint(back->rows[1].target, ==, 2);
  finish();
}

static void cautions_stand_in_every_list(void)
{
  setup();
  g_autofree char *text = written("csv");
  int n = 0;
  for (; aw_cautions[n]; n++)
    g_assert_nonnull(strstr(text, aw_cautions[n]));
  g_assert_cmpint(n, ==, 4);
  finish();
}

static void read_back(void)
{
  setup();
  g_autoptr(GError) error = NULL;
  g_autofree char *hash = NULL, *path = g_build_filename(folder, "list", NULL);
  AwTargetHead full = full_head(&hash);
  static const char *const layouts[] = { "csv", "tsv", "sampleimages/layouts/heron.layout",
                                         "[layout]\nname=bare\nheader=no\n[column.a]\nvalue=y\n[column.b]\nvalue=x\n" };
  for (gsize i = 0; i < G_N_ELEMENTS(layouts); i++) {
    AwTargetRow some[] = { rows[0], rows[2] };
    some[1].target = 2;
    g_autoptr(AwLayout) layout = layout_of(layouts[i]);
    g_assert_true(aw_target_list_write(layout, &full, some, 2, path, NULL, &error));
    g_autoptr(AwTargetList) list = aw_target_list_read(layout, path, &error);
    g_assert_no_error(error);
    g_assert_cmpuint(list->n, ==, 2);
    g_assert_cmpstr(list->dish, ==, head.dish);
    g_assert_cmpstr(list->plan_hash, ==, hash);
    g_assert_cmpstr(list->origin, ==, head.origin);
    g_assert_cmpstr(list->written_at, ==, head.written_at);
    g_assert_cmpfloat_with_epsilon(list->rows[0].at.bx_um, 1234.56789, 0.005001);
    g_assert_cmpfloat_with_epsilon(list->rows[1].at.by_um, 30987.6543, 0.005001);
    g_assert_cmpint(list->rows[1].target, ==, 2);
    gboolean whole = i < 2;
    g_assert_cmpint(list->rows[1].nucleus_id, ==, whole ? 123456 : 0);
    g_assert_cmpstr(list->rows[1].arm, ==, whole ? "irradiate" : NULL);
    g_assert_cmpint(list->rows[0].n_particles, ==, i < 3 ? 5 : -1);
    g_assert_true(isnan(list->rows[0].scan.x_um));
  }
  finish();
}

/* Every unit, sign and offset comes back; twelve decimals are more than a double has, and that is no fault. */
static void units_come_back(void)
{
  static const char *const units[] = { "um", "mm", "nm", "m", "step\nstep-um=0.025" };
  setup();
  for (gsize i = 0; i < G_N_ELEMENTS(units); i++)
    for (int decimals = 0; decimals <= 12; decimals += 4)
      for (int sign = -1; sign <= 1; sign += 2) {
        g_autofree char *text = g_strdup_printf(
            "[layout]\nname=n\n[column.x]\nvalue=x\nunit=%s\nsign=%d\noffset=-71.0625\ndecimals=%d\n[column.y]\n"
            "value=y\n[column.n]\nvalue=particles\n[column.sx]\nvalue=scan_x\nunit=%s\ndecimals=12\n"
            "[column.sy]\nvalue=scan_y\nsign=-1\n",
            units[i], sign, decimals, units[i]);
        g_free(written(text));
        g_autoptr(AwLayout) layout = layout_of(text);
        g_autofree char *path = g_build_filename(folder, "list", NULL);
        g_autoptr(AwTargetList) list = aw_target_list_read(layout, path, NULL);
        double half = 0.5 * pow(10, -decimals) * aw_layout_column(layout, 0)->um_per_unit + 1e-6;
        for (gsize k = 0; k < 3; k++) {
          g_assert_cmpfloat_with_epsilon(list->rows[k].at.bx_um, rows[k].at.bx_um, half);
          g_assert_cmpfloat_with_epsilon(list->rows[k].scan.x_um, rows[k].scan.x_um, 1e-6);
          g_assert_cmpfloat_with_epsilon(list->rows[k].scan.y_um, rows[k].scan.y_um, 0.0005001);
        }
      }
  finish();
}

static void refuse_rows(const char *layout_text, const AwTargetRow *some, gsize n, AwErrorCode code, const char *parts)
{
  setup();
  GError *error = NULL;
  g_autoptr(AwLayout) layout = layout_of(layout_text);
  g_autofree char *path = g_build_filename(folder, "list", NULL), *hash = NULL;
  AwTargetHead full = full_head(&hash);
  g_assert_false(aw_target_list_write(layout, &full, some, n, path, NULL, &error));
  aw_check_error(&error, code, parts);
  g_assert_cmpint(aw_scratch_count(folder), ==, 0);
  finish();
}

#define XY "[column.x]\nvalue=x\n[column.y]\nvalue=y\n"

static void refused_rows(void)
{
  AwTargetRow bad[3];
  memcpy(bad, rows, sizeof bad);
  refuse_rows("csv", rows, 0, AW_ERROR_EMPTY, "there is no target to write to|list");
  bad[2].at = (AwBeamPoint){ 1240.12603, -0.0004 };
  refuse_rows("csv", bad, 3, AW_ERROR_RANGE,
              "targets 2 and 3 (nuclei 4 and 123456) would be written at one spot, x_um 1240.126, y_um 0.000");
  bad[2].at = (AwBeamPoint){ NAN, 0 };
  refuse_rows("csv", bad, 3, AW_ERROR_RANGE, "target 3 (nucleus 123456): x = nan um is outside the stage limits");
  bad[2].at = (AwBeamPoint){ 0, 1e7 + 1 };
  refuse_rows("csv", bad, 3, AW_ERROR_RANGE, "y = 10000001.000 um is outside");
  refuse_rows("[layout]\nname=low\n[limits]\ny-max-um=30000\n" XY "[column.n]\nvalue=particles\n", rows, 3,
              AW_ERROR_RANGE,
              "target 3 (nucleus 123456): y = 30987.654 um is outside the stage limits of layout low, "
              "-10000000.000 to 30000.000 um");
  refuse_rows("[layout]\nname=low\n[limits]\nx-min-um=0\n" XY "[column.n]\nvalue=particles\n", rows, 3, AW_ERROR_RANGE,
              "target 3 (nucleus 123456): x = 0.000 um is outside");
  memcpy(bad, rows, sizeof bad);
  bad[1].n_particles = 3;
  refuse_rows("csv", bad, 3, AW_ERROR_RANGE, "target 2 of arm sham has 3 particles; it must have 0");
  memcpy(bad, rows, sizeof bad);
  bad[0].n_particles = 0;
  refuse_rows("csv", bad, 3, AW_ERROR_RANGE, "target 1 of arm irradiate has 0 particles; it must have at least 1");
  refuse_rows("[layout]\nname=plain\n" XY, rows, 3, AW_ERROR_STATE,
              "layout plain has no column for particles or arm, so sham target 2");
}

/* What the comparison would miss must not exist: each single change of a written list is found. */
static void verify_finds(const char *was, const char *is, AwErrorCode code, const char *parts)
{
  setup();
  g_autofree char *text = written("csv"), *path = g_build_filename(folder, "changed", NULL);
  g_auto(GStrv) halves = g_strsplit(text, was, 2);
  g_assert_nonnull(halves[1]);
  g_autofree char *changed = g_strconcat(halves[0], is, halves[1], NULL);
  g_assert_true(g_file_set_contents(path, changed, -1, NULL));
  g_autoptr(AwLayout) layout = layout_of("csv");
  GError *error = NULL;
  g_assert_null(aw_target_list_read(layout, path, &error));
  aw_check_error(&error, code, parts);
  finish();
}

static void damaged_lists(void)
{
  verify_finds("1234.568", "1234,568", AW_ERROR_FORMAT, "changed, line 13: 7 fields");
  verify_finds("1234.568", "\"1234,568\"", AW_ERROR_FORMAT, "changed, line 13, column x_um: '1234,568' has a decimal");
  verify_finds("x_um,y_um", "y_um,x_um", AW_ERROR_FORMAT, "column 3 is called 'y_um' where layout csv has 'x_um'");
  verify_finds(",sham", ",shamm", AW_ERROR_FORMAT, "line 14, column arm: 'shamm' is not irradiate or sham");
  verify_finds("\n2,4,", "\n0,4,", AW_ERROR_RANGE, "line 14, column target: '0' is outside 1 to");
  verify_finds("\n2,4,", "\n2,-4,", AW_ERROR_RANGE, "column nucleus: '-4'");
  verify_finds(",0,sham", ",1.5,sham", AW_ERROR_FORMAT, "column particles: '1.5' is not a whole number");
}

static void lists_of_another_kind(void)
{
  setup();
  GError *error = NULL;
  g_autoptr(AwLayout) layout = layout_of("csv");
  g_autofree char *path = aw_scratch_write(folder, "list", "target,nucleus,x_um,y_um,particles,arm\n");
  g_assert_null(aw_target_list_read(layout, path, &error));
  aw_check_error(&error, AW_ERROR_EMPTY, "list has no target");
  g_autofree char *few = aw_scratch_write(folder, "few", "target,nucleus,x_um,y_um,particles\n1,2,3,4,5\n");
  g_assert_null(aw_target_list_read(layout, few, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "few has 5 columns where layout csv has 6");
  g_autofree char *none = g_build_filename(folder, "none", NULL);
  g_assert_null(aw_target_list_read(layout, none, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "none");
  g_autoptr(AwLayout) beside = layout_of("sampleimages/layouts/heron.layout");
  g_assert_null(aw_target_list_read(beside, few, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "few.txt");
  finish();
}

static void constant_text_is_compared(void)
{
  setup();
  GError *error = NULL;
  g_autoptr(AwLayout) layout = layout_of("[layout]\nname=n\n" XY "[column.m]\nvalue=text\ntext=a,\"b\n");
  g_autofree char *good = aw_scratch_write(folder, "good", "x,y,m\n1,2,\"a,\"\"b\"\n");
  g_autofree char *bad = aw_scratch_write(folder, "bad", "x,y,m\n1,2,other\n");
  g_autoptr(AwTargetList) list = aw_target_list_read(layout, good, &error);
  g_assert_no_error(error);
  g_assert_null(list->plan_hash);
  g_assert_null(aw_target_list_read(layout, bad, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "line 2, column m: 'other' is not a,\"b");
  finish();
}

static void head_cannot_break_out(void)
{
  setup();
  g_autoptr(GError) error = NULL;
  g_autoptr(AwLayout) layout = layout_of("csv");
  g_autofree char *path = g_build_filename(folder, "list", NULL), *hash = NULL;
  AwTargetHead full = full_head(&hash);
  full.dish = "a\n9,9,9,9,9,irradiate\rb";
  g_assert_true(aw_target_list_write(layout, &full, rows, 3, path, NULL, &error));
  g_autoptr(AwTargetList) list = aw_target_list_read(layout, path, &error);
  g_assert_cmpuint(list->n, ==, 3);
  g_assert_cmpstr(list->dish, ==, "a 9,9,9,9,9,irradiate b");
  finish();
}

#define EVERYTHING                                                                                                     \
  "[layout]\nname=all\n[column.t]\nvalue=target\n[column.n]\nvalue=nucleus\n[column.x]\nvalue=x\ndecimals=2\n"         \
  "[column.y]\nvalue=y\nunit=mm\nsign=-1\ndecimals=3\n[column.sx]\nvalue=scan_x\n[column.sy]\nvalue=scan_y\nunit="     \
  "step\n"                                                                                                             \
  "step-um=0.5\n[column.p]\nvalue=particles\n[column.arm]\nvalue=arm\n"

/* Reads a list that is the plan but for `changed` in its second row. */
static void compare(AwTargetRow changed, const char *fault)
{
  GError *error = NULL;
  AwTargetRow back_rows[] = { rows[0], changed, rows[2] };
  const AwTargetList back = { .rows = back_rows, .n = 3, .plan_hash = (char[]){ "abc" } };
  g_autoptr(AwLayout) layout = layout_of(EVERYTHING);
  gboolean same = aw_target_list_compare(layout, &back, "abc", rows, 3, &error);
  g_assert_true(same == (fault == NULL));
  if (fault)
    aw_check_error(&error, AW_ERROR_VERIFY, fault);
}

static AwTargetRow moved(double x_um, double y_um, double scan_x_um, double scan_y_um)
{
  AwTargetRow row = rows[1];
  row.at.bx_um += x_um;
  row.at.by_um += y_um;
  row.scan.x_um += scan_x_um;
  row.scan.y_um += scan_y_um;
  return row;
}

/* Half a unit of the last place: 0.005 um, 0.0005 mm, 0.0005 um, half a step of 0.5 um. */
static void comparison_is_sharp(void)
{
  compare(moved(0.00499, -0.499, 0.000499, 0.2499), NULL);
  compare(moved(-0.00499, 0.499, -0.000499, -0.2499), NULL);
  compare(moved(0.00501, 0, 0, 0), "target 2 was read back with another x than planned; the list was not kept");
  compare(moved(0, -0.501, 0, 0), "target 2 was read back with another y than planned");
  compare(moved(0, 0, 0.000501, 0), "another sx than planned");
  compare(moved(0, 0, 0, -0.2501), "another sy than planned");
  compare(moved(NAN, 0, 0, 0), "another x than planned");
  AwTargetRow row = rows[1];
  row.target = 3;
  compare(row, "target 2 was read back with another target number");
  row = rows[1];
  row.nucleus_id = 5;
  compare(row, "another nucleus");
  row = rows[1];
  row.n_particles = 1;
  compare(row, "another particle number");
  row = rows[1];
  row.arm = "irradiate";
  compare(row, "another arm");
}

/* A disk that fills up: the old list stays, and nothing is left beside it. */
static void disk_fills_up(void)
{
  setup();
  g_autofree char *path = aw_scratch_write(folder, "list", "old"), *hash = NULL, *text = NULL;
  AwTargetHead full = full_head(&hash);
  static const char *const layouts[] = { "csv", "sampleimages/layouts/heron.layout" };
  for (gsize i = 0; i < G_N_ELEMENTS(layouts); i++) {
    g_autoptr(AwLayout) layout = layout_of(layouts[i]);
    pid_t pid = fork();
    if (pid == 0) {
      GError *error = NULL;
      const struct rlimit limit = { 100, 100 };
      aw_output_prepare_process();
      if (setrlimit(RLIMIT_FSIZE, &limit) != 0)
        _exit(3);
      gboolean ok = aw_target_list_write(layout, &full, rows, 3, path, NULL, &error);
      _exit(!ok && error->code == AW_ERROR_IO && strstr(error->message, "write all of") ? 0 : 1);
    }
    int status = 0;
    waitpid(pid, &status, 0);
    g_assert_true(WIFEXITED(status) && WEXITSTATUS(status) == 0);
  }
  g_assert_true(g_file_get_contents(path, &text, NULL, NULL));
  g_assert_cmpstr(text, ==, "old");
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  finish();
}

static void full_disk_and_missing_folder(void)
{
  setup();
  GError *error = NULL;
  g_autoptr(AwLayout) layout = layout_of("csv");
  g_autofree char *hash = NULL, *path = g_build_filename(folder, "none", "list", NULL);
  AwTargetHead full = full_head(&hash);
  g_assert_false(aw_target_list_write(layout, &full, rows, 3, "/dev/full", NULL, &error));
  aw_check_error(&error, AW_ERROR_IO, "cannot write all of /dev/full");
  g_assert_false(aw_target_list_write(layout, &full, rows, 3, path, NULL, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "there is no folder");
  finish();
}

static void pipe_is_checked_in_memory(void)
{
  setup();
  int ends[2];
  char got[4096] = "";
  gboolean in_memory = FALSE;
  GError *error = NULL;
  g_assert_cmpint(pipe(ends), ==, 0);
  g_autofree char *hash = NULL, *path = g_strdup_printf("/dev/fd/%d", ends[1]), *text = expected("targets.csv");
  AwTargetHead full = full_head(&hash);
  g_autoptr(AwLayout) layout = layout_of("csv");
  g_autoptr(AwLayout) beside = layout_of("sampleimages/layouts/heron.layout");
  g_assert_true(aw_target_list_write(layout, &full, rows, 3, path, &in_memory, &error));
  g_assert_true(in_memory);
  g_assert_cmpint(read(ends[0], got, sizeof got - 1), ==, (gssize)strlen(text));
  g_assert_cmpstr(got, ==, text);
  g_assert_false(aw_target_list_write(beside, &full, rows, 3, path, &in_memory, &error));
  aw_check_error(&error, AW_ERROR_STATE, "layout heron keeps the cautions in a file beside the list");
  close(ends[0]);
  close(ends[1]);
  finish();
}

static void old_list_survives_a_refusal(void)
{
  setup();
  GError *error = NULL;
  g_autoptr(AwLayout) layout = layout_of("csv");
  g_autofree char *path = aw_scratch_write(folder, "list", "old"), *hash = NULL, *text = NULL;
  AwTargetHead full = full_head(&hash);
  full.plan_hash = "a\tb"; /* reads back with a blank: the comparison must see it */
  g_assert_false(aw_target_list_write(layout, &full, rows, 3, path, NULL, &error));
  aw_check_error(&error, AW_ERROR_VERIFY, "read back with another number of targets or plan hash than planned");
  AwTargetRow odd[] = { rows[0], rows[1] };
  odd[1].target = 0;
  full.plan_hash = hash;
  g_assert_false(aw_target_list_write(layout, &full, odd, 2, path, NULL, &error));
  aw_check_error(&error, AW_ERROR_VERIFY, "cannot be read back and was not kept|column target: '0' is outside");
  odd[1].target = 2;
  odd[1].arm = "control";
  odd[1].n_particles = 1;
  g_assert_false(aw_target_list_write(layout, &full, odd, 2, path, NULL, &error));
  aw_check_error(&error, AW_ERROR_VERIFY, "'control' is not irradiate or sham");
  g_assert_true(g_file_get_contents(path, &text, NULL, NULL));
  g_assert_cmpstr(text, ==, "old");
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  finish();
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/plan/targetlist/expected_files", expected_files);
  aw_check_add("/plan/targetlist/steps_without_header", steps_without_header);
  aw_check_add("/plan/targetlist/cautions_stand_in_every_list", cautions_stand_in_every_list);
  aw_check_add("/plan/targetlist/read_back", read_back);
  aw_check_add("/plan/targetlist/units_come_back", units_come_back);
  aw_check_add("/plan/targetlist/refused_rows", refused_rows);
  aw_check_add("/plan/targetlist/damaged_lists", damaged_lists);
  aw_check_add("/plan/targetlist/lists_of_another_kind", lists_of_another_kind);
  aw_check_add("/plan/targetlist/constant_text_is_compared", constant_text_is_compared);
  aw_check_add("/plan/targetlist/head_cannot_break_out", head_cannot_break_out);
  aw_check_add("/plan/targetlist/comparison_is_sharp", comparison_is_sharp);
  aw_check_add("/plan/targetlist/disk_fills_up", disk_fills_up);
  aw_check_add("/plan/targetlist/full_disk_and_missing_folder", full_disk_and_missing_folder);
  aw_check_add("/plan/targetlist/pipe_is_checked_in_memory", pipe_is_checked_in_memory);
  aw_check_add("/plan/targetlist/old_list_survives_a_refusal", old_list_survives_a_refusal);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/scantable.h"

#include <math.h>

#include "../support/check.h"

static char *folder;

static char **unknown;

static GPtrArray *read_text(const char *text, GError **error)
{
  folder = aw_scratch_new();
  g_autofree char *path = aw_scratch_write(folder, "scan.csv", text);
  GPtrArray *rows = aw_scan_table_read(path, &unknown, error);
  aw_scratch_remove(g_strdup(folder));
  return rows;
}

static void finish(void)
{
  g_clear_pointer(&folder, g_free);
  g_clear_pointer(&unknown, g_strfreev);
}

static const AwScanRow *row_of(const GPtrArray *rows, guint i)
{
  return g_ptr_array_index(rows, i);
}

static void refuse(const char *text, AwErrorCode code, const char *parts)
{
  GError *error = NULL;
  g_assert_null(read_text(text, &error));
  aw_check_error(&error, code, parts);
  finish();
}

static void all_columns(void)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(GPtrArray) rows =
      read_text("# a scan\nstage_y_um,stage_x_um,file,page,channel,pixel_um,taken_at,focus,note\n"
                "-20.25,1000.5,f1.tif,2,1,0.65,2031-05-04T12:00:00Z,3,x\n 7e2 , 8 , f1.tif ,,,,,,\n",
                &error);
  g_assert_no_error(error);
  g_assert_cmpuint(rows->len, ==, 2);
  const AwScanRow *a = row_of(rows, 0), *b = row_of(rows, 1);
  g_autofree char *path = g_build_filename(folder, "f1.tif", NULL);
  g_assert_cmpstr(a->path, ==, path);
  g_assert_cmpint(a->page, ==, 2);
  g_assert_cmpint(a->channel, ==, 1);
  g_assert_cmpfloat(a->stage.x_um, ==, 1000.5);
  g_assert_cmpfloat(a->stage.y_um, ==, -20.25);
  g_assert_cmpfloat(a->pixel_um, ==, 0.65);
  g_assert_cmpfloat(a->taken_at_unix_s, ==, 1935662400);
  g_assert_cmpuint(a->line, ==, 3);
  g_assert_cmpstr(b->path, ==, path);
  g_assert_cmpint(b->page, ==, 0);
  g_assert_cmpint(b->channel, ==, -1);
  g_assert_cmpfloat(b->stage.y_um, ==, 700);
  g_assert_cmpfloat(b->pixel_um, ==, 0);
  g_assert_true(isnan(b->taken_at_unix_s));
  g_assert_cmpuint(g_strv_length(unknown), ==, 2);
  g_assert_cmpstr(unknown[0], ==, "focus");
  g_assert_cmpstr(unknown[1], ==, "note");
  finish();
}

static void windows_table(void)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(GPtrArray) rows = read_text("\xef\xbb\xbf"
                                        "file,stage_x_um,stage_y_um\r\nraw\\day 1\\f1.tif,1,2\r\n/data/f2.tif,3,4\r\n",
                                        &error);
  g_assert_no_error(error);
  g_autofree char *path = g_build_filename(folder, "raw", "day 1", "f1.tif", NULL);
  g_assert_cmpstr(row_of(rows, 0)->path, ==, path);
  g_assert_cmpstr(row_of(rows, 1)->path, ==, "/data/f2.tif");
  g_assert_cmpuint(g_strv_length(unknown), ==, 0);
  finish();
}

static void pages_and_channels_are_frames_of_their_own(void)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(GPtrArray) rows = read_text("file,stage_x_um,stage_y_um,page,channel\nf,1,2,0,0\nf,1,2,1,0\nf,1,2,0,1\n"
                                        "g,1,2,0,0\nf,1,2,0,\n",
                                        &error);
  g_assert_no_error(error);
  g_assert_cmpuint(rows->len, ==, 5);
  finish();
}

#define HEADER "file,stage_x_um,stage_y_um,page,channel,pixel_um,taken_at\n"

static void bad_columns(void)
{
  refuse("stage_x_um,stage_y_um\n1,2\n", AW_ERROR_NOT_FOUND,
         "scan.csv has no column 'file'; its columns are: stage_x_um");
  refuse("file,stage_x_um,y\nf,1,2\n", AW_ERROR_NOT_FOUND, "has no column 'stage_y_um'; its columns are: file");
  refuse("file,stage_x_mm,stage_y_mm\nf,1,2\n", AW_ERROR_NOT_FOUND,
         "scan.csv has no column 'stage_x_um' but 'stage_x_mm'; convert its values to um and rename it");
  refuse("file,stage_x_um,stage_y\nf,1,2\n", AW_ERROR_NOT_FOUND, "no column 'stage_y_um' but 'stage_y'");
  refuse("file;stage_x_um;stage_y_um\nf;1;2\n", AW_ERROR_NOT_FOUND, "parted by something else than ','");
  refuse(HEADER, AW_ERROR_EMPTY, "scan.csv names 0 frames; a scan has 1 to 100000");
  refuse("", AW_ERROR_EMPTY, "scan.csv is empty");
}

static void bad_readings(void)
{
  refuse(HEADER "f,left,2,,,,\n", AW_ERROR_FORMAT,
         "scan.csv, line 2, column stage_x_um: 'left' is not a finite number");
  refuse(HEADER "f,1,\"2,5\",,,,\n", AW_ERROR_FORMAT, "column stage_y_um: '2,5' has a decimal comma");
  refuse(HEADER "f,1,2,5,,,,\n", AW_ERROR_FORMAT, "scan.csv, line 2: 8 fields where the table has 7");
  refuse(HEADER "f,NaN,2,,,,\n", AW_ERROR_FORMAT, "'NaN' is not a finite number");
  refuse(HEADER "f,1,,,,,\n", AW_ERROR_FORMAT, "column stage_y_um: a number is missing");
  refuse(HEADER "f,1e8,2,,,,\n", AW_ERROR_RANGE, "1e8 is outside -10000000 to 10000000");
  refuse(HEADER "f,1,-10000000.5,,,,\n", AW_ERROR_RANGE, "column stage_y_um: -10000000.5 is outside");
}

static void bad_files(void)
{
  refuse(HEADER " ,1,2,,,,\n", AW_ERROR_FORMAT, "scan.csv, line 2, column file: ' ' names no file");
  refuse(HEADER "C:\\scan\\f.tif,1,2,,,,\n", AW_ERROR_FORMAT, "'C:\\scan\\f.tif' is a path of another machine");
  refuse(HEADER "f,1,2,,,,\ng,1,2,,,,\nf,3,4,,,,\n", AW_ERROR_FORMAT,
         "scan.csv, line 4: |f, page 0, stands in line 2 already; a frame may be named once");
  refuse(HEADER "a\\f,1,2,1,0,,\n./a/../a/f,1,2,1,0,,\n", AW_ERROR_FORMAT, "line 3: |stands in line 2 already");
  refuse("file,stage_x_um,stage_y_um,page\nf,1,2,\nf,1,2,0\n", AW_ERROR_FORMAT, "line 3: |stands in line 2 already");
}

static void bad_options(void)
{
  refuse(HEADER "f,1,2,-1,,,\n", AW_ERROR_RANGE, "column page: '-1' is outside 0 to");
  refuse(HEADER "f,1,2,1.5,,,\n", AW_ERROR_FORMAT, "column page: '1.5' is not a whole number");
  refuse(HEADER "f,1,2,,red,,\n", AW_ERROR_FORMAT, "column channel: 'red' is not a whole number");
  refuse(HEADER "f,1,2,,,0,\n", AW_ERROR_RANGE, "column pixel_um: 0 is outside 0.001 to 100");
  refuse(HEADER "f,1,2,,,-0.65,\n", AW_ERROR_RANGE, "column pixel_um: -0.65 is outside");
  refuse(HEADER "f,1,2,,,650,\n", AW_ERROR_RANGE, "column pixel_um: 650 is outside");
  refuse(HEADER "f,1,2,,,wide,\n", AW_ERROR_FORMAT, "column pixel_um: 'wide'");
  refuse(HEADER "f,1,2,,,,noon\n", AW_ERROR_FORMAT, "scan.csv, line 2, column taken_at: 'noon' is not a time");
  refuse(HEADER "f,1,2,,,,2031-05-04T12:00:00\n", AW_ERROR_FORMAT, "has no time zone");
}

static void missing_table(void)
{
  GError *error = NULL;
  g_assert_null(aw_scan_table_read("/nonexistent/scan.csv", NULL, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "/nonexistent/scan.csv");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/nuclei/scantable/all_columns", all_columns);
  aw_check_add("/nuclei/scantable/windows_table", windows_table);
  aw_check_add("/nuclei/scantable/pages_and_channels", pages_and_channels_are_frames_of_their_own);
  aw_check_add("/nuclei/scantable/bad_columns", bad_columns);
  aw_check_add("/nuclei/scantable/bad_readings", bad_readings);
  aw_check_add("/nuclei/scantable/bad_files", bad_files);
  aw_check_add("/nuclei/scantable/bad_options", bad_options);
  aw_check_add("/nuclei/scantable/missing_table", missing_table);
  return g_test_run();
}

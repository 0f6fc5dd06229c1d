/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/ome.h"

#include <math.h>
#include <string.h>

#include "../support/check.h"
#include "../support/tiff_bytes.h"
#include "image/reader.h"

#define HEAD                                                                                                           \
  "<?xml version=\"1.0\" encoding=\"UTF-8\"?><!-- kept --><OME "                                                       \
  "xmlns=\"http://www.openmicroscopy.org/Schemas/OME/2016-06\" UUID=\"urn:uuid:me\">"
#define ONE(attributes, inner)                                                                                         \
  HEAD "<Image ID=\"Image:0\"><Pixels DimensionOrder=\"XYZCT\" Type=\"uint16\" SizeX=\"4\" SizeY=\"3\" "               \
       "SizeZ=\"1\" SizeC=\"1\" SizeT=\"1\" " attributes "><TiffData IFD=\"0\"/>" inner "</Pixels></Image></OME>"

/* A file of n pages of 4 x 3 px; every pixel of page i is 100 + i. Gives its path. */
static char *save(const char *folder, const char *xml, int n)
{
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  for (int page = 0; page < n; page++) {
    guint8 pixels[24] = { 0 };
    for (int i = 0; i < 12; i++)
      pixels[2 * i] = (guint8)(100 + page);
    tiff_bytes_grey(t, 4, 3, 16, pixels, sizeof pixels);
    if (page == 0)
      tiff_bytes_set_text(t, 270, xml);
    tiff_bytes_end_page(t);
  }
  return tiff_bytes_save(t, folder, "scan.ome.tif", 0);
}

static AwImageInfo info_of(const char *xml)
{
  g_autoptr(GError) error = NULL;
  char *folder = aw_scratch_new();
  g_autofree char *path = save(folder, xml, 1);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, &error);
  g_assert_no_error(error);
  AwImageInfo info = *aw_image_reader_info(reader);
  aw_scratch_remove(folder);
  return info;
}

static void check_refused(const char *xml, int n, int page, int channel, AwErrorCode code, const char *parts)
{
  GError *error = NULL;
  char *folder = aw_scratch_new();
  g_autofree char *path = save(folder, xml, n);
  g_assert_null(aw_image_reader_open(path, page, channel, &error));
  g_assert_nonnull(strstr(error->message, path));
  aw_check_error(&error, code, parts);
  aw_scratch_remove(folder);
}

/* The TIFF directory that page and channel lead to, found by its pixels. */
static int directory(const char *path, int page, int channel)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(AwImage) image = aw_image_load(path, page, channel, NULL, &error);
  g_assert_no_error(error);
  return (int)aw_image_value(image, 2, 1) - 100;
}

static void recognised(void)
{
  g_assert_true(aw_ome_is(ONE("", "")));
  g_assert_true(aw_ome_is("\xef\xbb\xbf \n" HEAD));
  g_assert_true(aw_ome_is("<OME:OME xmlns:OME=\"http://www.openmicroscopy.org/Schemas/OME/2016-06\">"));
  g_assert_false(aw_ome_is(""));
  g_assert_false(aw_ome_is("exported from <OME http://www.openmicroscopy.org>"));
  g_assert_false(aw_ome_is("<note>OME</note>"));
}

static void pixel_sizes(void)
{
  static const struct {
    const char *attributes;
    double x_um, y_um;
  } cases[] = {
    { "PhysicalSizeX=\"0.65\" PhysicalSizeY=\"0.5\"", 0.65, 0.5 },
    { "PhysicalSizeX=\"0.65\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"650\" PhysicalSizeXUnit=\"nm\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"6.5e-4\" PhysicalSizeXUnit=\"mm\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"6.5e-7\" PhysicalSizeXUnit=\"m\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"6.5e-5\" PhysicalSizeXUnit=\"cm\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"6500\" PhysicalSizeXUnit=\"\xc3\x85\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"0.65\" PhysicalSizeXUnit=\"\xc2\xb5m\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"0.65\" PhysicalSizeXUnit=\"&#181;m\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"0.65\" PhysicalSizeXUnit=\"\xce\xbcm\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"2.5590551181102362e-05\" PhysicalSizeXUnit=\"in\"", 0.65, 0.65 },
    { "PhysicalSizeX=\"1\" PhysicalSizeXUnit=\"pixel\"", 0, 0 },
    { "PhysicalSizeX=\"1\" PhysicalSizeXUnit=\"reference frame\"", 0, 0 },
    { "PhysicalSizeX=\"0\"", 0, 0 },
    { "", 0, 0 },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autofree char *xml = g_strdup_printf(ONE("%s", ""), cases[i].attributes);
    AwImageInfo info = info_of(xml);
    g_assert_cmpfloat_with_epsilon(info.pixel_um, cases[i].x_um, 1e-12);
    g_assert_cmpfloat_with_epsilon(info.pixel_y_um, cases[i].y_um, 1e-12);
  }
}

static void positions(void)
{
  static const struct {
    const char *attributes;
    gboolean has, reference_frame;
  } cases[] = {
    { "PositionX=\"-1.25\" PositionXUnit=\"mm\" PositionY=\"2e6\" PositionYUnit=\"nm\"", TRUE, FALSE },
    { "PositionX=\"-1250\" PositionY=\"2000\"", FALSE, TRUE },
    { "PositionX=\"-1250\" PositionXUnit=\"reference frame\" PositionY=\"2\" PositionYUnit=\"mm\"", FALSE, TRUE },
    { "PositionX=\"-1250\" PositionXUnit=\"pixel\" PositionY=\"2\" PositionYUnit=\"pixel\"", FALSE, TRUE },
    { "PositionX=\"-1250\" PositionXUnit=\"mm\"", FALSE, FALSE },
    { "", FALSE, FALSE },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++) {
    g_autofree char *xml =
        g_strdup_printf(ONE("", "<Plane TheC=\"0\" TheZ=\"0\" TheT=\"0\" %s/>"), cases[i].attributes);
    AwImageInfo info = info_of(xml);
    g_assert_cmpint(info.has_position, ==, cases[i].has);
    g_assert_cmpint(info.position_is_reference_frame, ==, cases[i].reference_frame);
    if (info.has_position) {
      g_assert_cmpfloat_with_epsilon(info.stage.x_um, -1250, 1e-9);
      g_assert_cmpfloat_with_epsilon(info.stage.y_um, 2000, 1e-9);
    }
  }
}

static void times(void)
{
#define TIMED(date, plane)                                                                                             \
  HEAD "<Image><AcquisitionDate>" date "</AcquisitionDate><Pixels SizeX=\"4\" SizeY=\"3\" SizeZ=\"1\" "                \
       "SizeC=\"1\" SizeT=\"1\"><TiffData/><Plane TheC=\"0\" TheZ=\"0\" TheT=\"0\" " plane "/></Pixels></Image></OME>"
  g_assert_cmpfloat(info_of(TIMED("2031-05-04T12:00:00Z", "")).taken_at_unix_s, ==, 1935662400);
  g_assert_cmpfloat(info_of(TIMED(" 2031-05-04T14:00:00+02:00\n", "DeltaT=\"2.5\"")).taken_at_unix_s, ==, 1935662402.5);
  g_assert_cmpfloat(info_of(TIMED("2031-05-04T12:00:00Z", "DeltaT=\"3\" DeltaTUnit=\"min\"")).taken_at_unix_s, ==,
                    1935662580);
  g_assert_cmpfloat(info_of(TIMED("2031-05-04T12:00:00Z", "DeltaT=\"500\" DeltaTUnit=\"ms\"")).taken_at_unix_s, ==,
                    1935662400.5);
  g_assert_true(isnan(info_of(TIMED("2031-05-04T12:00:00", "DeltaT=\"3\"")).taken_at_unix_s));
  g_assert_true(isnan(info_of(ONE("", "")).taken_at_unix_s));
}

static void significant_bits(void)
{
  g_assert_cmpfloat(info_of(ONE("SignificantBits=\"12\"", "")).full_scale, ==, 4095);
  g_assert_cmpfloat(info_of(ONE("SignificantBits=\"16\"", "")).full_scale, ==, 65535);
}

/* Each order of the dimensions, 2 channels, 3 focus positions, 2 times: pages run over focus, then time. */
static void dimension_orders(void)
{
  static const struct {
    const char *order;
    int c, z, t; /* step of the directory number */
  } cases[] = { { "XYCZT", 1, 2, 6 }, { "XYCTZ", 1, 4, 2 }, { "XYZCT", 3, 1, 6 },
                { "XYZTC", 6, 1, 3 }, { "XYTCZ", 2, 4, 1 }, { "XYTZC", 6, 2, 1 } };
  static const char *const data[] = { "<TiffData IFD=\"0\" PlaneCount=\"12\"/>", "<TiffData/>", "" };
  char *folder = aw_scratch_new();
  for (gsize i = 0; i < G_N_ELEMENTS(cases) * G_N_ELEMENTS(data); i++) {
    gsize k = i / G_N_ELEMENTS(data);
    g_autofree char *xml =
        g_strdup_printf(HEAD "<Image><Pixels DimensionOrder=\"%s\" SizeX=\"4\" SizeY=\"3\" SizeZ=\"3\" SizeC=\"2\" "
                             "SizeT=\"2\">%s</Pixels></Image></OME>",
                        cases[k].order, data[i % G_N_ELEMENTS(data)]);
    g_autofree char *path = save(folder, xml, 12);
    for (int n = 0; n < 12; n++) {
      int c = n % 2, z = n / 2 % 3, t = n / 6;
      g_assert_cmpint(directory(path, t * 3 + z, c), ==, c * cases[k].c + z * cases[k].z + t * cases[k].t);
    }
  }
  aw_scratch_remove(folder);
}

#define TWO_IMAGES                                                                                                     \
  HEAD "<Image><Pixels SizeX=\"4\" SizeY=\"3\" SizeZ=\"1\" SizeC=\"2\" SizeT=\"1\" PhysicalSizeX=\"0.5\">"             \
       "<Channel Name=\"blue\"/><Channel Name=\"green\"/>"                                                             \
       "<TiffData IFD=\"3\" FirstC=\"0\"/><TiffData IFD=\"1\" FirstC=\"1\"/></Pixels></Image>"                         \
       "<Image><Pixels SizeX=\"4\" SizeY=\"3\" SizeZ=\"1\" SizeC=\"1\" SizeT=\"1\" PhysicalSizeX=\"0.25\">"            \
       "<Channel/><TiffData IFD=\"2\"/></Pixels></Image>"                                                              \
       "<StructuredAnnotations><XMLAnnotation><Value><OME><Image><Pixels SizeX=\"no\"/></Image></OME></Value>"         \
       "</XMLAnnotation></StructuredAnnotations></OME>"

static void several_images(void)
{
  char *folder = aw_scratch_new();
  g_autofree char *path = save(folder, TWO_IMAGES, 4);
  g_assert_cmpint(directory(path, 0, 0), ==, 3);
  g_assert_cmpint(directory(path, 0, 1), ==, 1);
  g_assert_cmpint(directory(path, 1, -1), ==, 2);
  g_assert_cmpint(directory(path, 1, 0), ==, 2);
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, 1, NULL);
  g_assert_cmpint(aw_image_reader_n_pages(reader), ==, 2);
  g_assert_cmpint(aw_image_reader_n_channels(reader), ==, 2);
  aw_scratch_remove(folder);
  check_refused(TWO_IMAGES, 4, 0, -1, AW_ERROR_UNSUPPORTED, "page 0|has 2 channels|--channel 0 to 1: 0 blue, 1 green");
  check_refused(TWO_IMAGES, 4, 0, 2, AW_ERROR_NOT_FOUND, "page 0|no channel 2; it has 2");
  check_refused(TWO_IMAGES, 4, 2, 0, AW_ERROR_NOT_FOUND, "no page 2; it has 2, counted from 0");
  check_refused(TWO_IMAGES, 3, 0, 0, AW_ERROR_FORMAT, "is cut off|page 0 in TIFF directory 3, but it has only 3");
}

/* A set of two files, one position each; this one is scan.ome.tif. */
static void several_files(void)
{
#define PIXELS "<Pixels SizeX=\"4\" SizeY=\"3\" SizeZ=\"1\" SizeC=\"1\" SizeT=\"1\">"
#define SET(first, second)                                                                                             \
  HEAD "<Image>" PIXELS "<TiffData IFD=\"0\">" first "</TiffData></Pixels></Image>"                                    \
       "<Image>" PIXELS "<TiffData IFD=\"0\">" second "</TiffData></Pixels></Image></OME>"
#define OTHER "<UUID FileName=\"other.ome.tif\">urn:uuid:other</UUID>"
  const char *mine = SET(OTHER, "<UUID FileName=\"renamed.tif\">urn:uuid:me</UUID>");
  char *folder = aw_scratch_new();
  g_autofree char *path = save(folder, mine, 1);
  g_assert_cmpint(directory(path, 0, -1), ==, 0);
  aw_scratch_remove(folder);
  check_refused(mine, 1, 1, -1, AW_ERROR_NOT_FOUND, "no page 1; it has 1");
  check_refused(SET(OTHER, OTHER), 1, 0, -1, AW_ERROR_UNSUPPORTED, "every plane in other files|other.ome.tif");
  check_refused(HEAD "<Image><Pixels SizeX=\"4\" SizeY=\"3\" SizeZ=\"1\" SizeC=\"2\" SizeT=\"1\">"
                     "<TiffData FirstC=\"0\"><UUID FileName=\"scan.ome.tif\">urn:uuid:me</UUID></TiffData>"
                     "<TiffData FirstC=\"1\">" OTHER "</TiffData></Pixels></Image></OME>",
                1, 0, 1, AW_ERROR_UNSUPPORTED, "page 0|channel 1 is kept in another file, other.ome.tif");
  check_refused(HEAD "<BinaryOnly MetadataFile=\"set.companion.ome\" UUID=\"urn:uuid:set\"/></OME>", 1, 0, -1,
                AW_ERROR_UNSUPPORTED, "metadata in another file (set.companion.ome)|scan table");
}

static void colour_channel(void)
{
  const char *xml = HEAD "<Image><Pixels SizeX=\"2\" SizeY=\"1\" SizeZ=\"1\" SizeC=\"3\" SizeT=\"1\">"
                         "<Channel SamplesPerPixel=\"3\"/><TiffData/></Pixels></Image></OME>";
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 2, 1, 8, "\1\2\3\4\5\6", 6);
  tiff_bytes_set_list(t, 258, TIFF_U16, (guint32[]){ 8, 8, 8 }, 3);
  tiff_bytes_set(t, 262, TIFF_U16, 2);
  tiff_bytes_set(t, 277, TIFF_U16, 3);
  tiff_bytes_set_text(t, 270, xml);
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "rgb.ome.tif", 0);
  GError *error = NULL;
  g_autoptr(AwImage) green = aw_image_load(path, 0, 1, NULL, &error);
  g_assert_no_error(error);
  g_assert_cmpfloat(aw_image_value(green, 1, 0), ==, 5);
  g_assert_null(aw_image_load(path, 0, -1, NULL, &error));
  aw_check_error(&error, AW_ERROR_UNSUPPORTED, "channels differ|--channel 0 to 2");
  g_assert_null(aw_image_load(path, 0, 3, NULL, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "no channel 3");
  aw_scratch_remove(folder);
}

/* Two samples a pixel are no colour and need a choice. */
static void two_samples(void)
{
  const char *xml = HEAD "<Image><Pixels SizeX=\"2\" SizeY=\"1\" SizeZ=\"1\" SizeC=\"2\" SizeT=\"1\">"
                         "<Channel SamplesPerPixel=\"2\"/><TiffData/></Pixels></Image></OME>";
  char *folder = aw_scratch_new();
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, 2, 1, 8, "\1\2\3\4", 4);
  tiff_bytes_set_list(t, 258, TIFF_U16, (guint32[]){ 8, 8 }, 2);
  tiff_bytes_set(t, 277, TIFF_U16, 2);
  tiff_bytes_set_text(t, 270, xml);
  tiff_bytes_end_page(t);
  g_autofree char *path = tiff_bytes_save(t, folder, "two.ome.tif", 0);
  GError *error = NULL;
  g_assert_null(aw_image_load(path, 0, -1, NULL, &error));
  aw_check_error(&error, AW_ERROR_UNSUPPORTED, "page 0 has 2 channels|--channel 0 to 1");
  g_autoptr(AwImage) second = aw_image_load(path, 0, 1, NULL, &error);
  g_assert_no_error(error);
  g_assert_cmpfloat(aw_image_value(second, 1, 0), ==, 4);
  aw_scratch_remove(folder);
}

static void bad_metadata(void)
{
#define SIZES(x, c, z) "<Image><Pixels SizeX=\"" x "\" SizeY=\"3\" SizeZ=\"" z "\" SizeC=\"" c "\" SizeT=\"1\">"
#define END "</Pixels></Image></OME>"
  static const struct {
    const char *xml;
    AwErrorCode code;
    const char *parts;
  } cases[] = {
    { HEAD "<Image>", AW_ERROR_FORMAT, "its OME metadata cannot be read: " },
    { HEAD "<Image></Wrong></OME>", AW_ERROR_FORMAT, "OME metadata cannot be read: " },
    { HEAD "<Image Name=\"\xb5\"/></OME>", AW_ERROR_FORMAT, "cannot be read: " },
    { HEAD "</OME>", AW_ERROR_FORMAT, "describe no plane" },
    { HEAD SIZES("four", "1", "1") END, AW_ERROR_FORMAT, "OME Pixels of image 1, attribute SizeX|four" },
    { HEAD SIZES("4", "0", "1") END, AW_ERROR_RANGE, "attribute SizeC|0|100000" },
    { HEAD SIZES("4", "1000", "1000") END, AW_ERROR_RANGE, "more than 100000 planes" },
    { HEAD "<Image><Pixels SizeX=\"4\"/></Image></OME>", AW_ERROR_FORMAT, "Pixels of image 1 have no SizeY" },
    { HEAD SIZES("5", "1", "1") "<TiffData/>" END, AW_ERROR_FORMAT,
      "page 0 is 4 x 3 px, but its OME metadata say 5 x 3" },
    { HEAD SIZES("4", "3", "1") "<Channel/><TiffData/>" END, AW_ERROR_FORMAT,
      "page 0 has 1 samples a pixel, but its OME metadata say 3" },
    { HEAD SIZES("4", "3", "1") "<Channel/><Channel/><TiffData/>" END, AW_ERROR_FORMAT,
      "name 2 channels for a SizeC of 3" },
    { HEAD SIZES("4", "1", "1") "<TiffData FirstZ=\"1\"/>" END, AW_ERROR_RANGE,
      "OME TiffData of image 1, attribute FirstZ|1" },
    { HEAD SIZES("4", "1", "1") "<Plane TheC=\"1\"/>" END, AW_ERROR_RANGE, "OME Plane of image 1, attribute TheC|1" },
    { ONE("PhysicalSizeX=\"0,65\"", ""), AW_ERROR_FORMAT, "attribute PhysicalSizeX|0,65" },
    { ONE("", "<Plane PositionX=\"NaN\" PositionY=\"1\"/>"), AW_ERROR_FORMAT, "attribute PositionX|NaN" },
    { ONE("", "<Plane DeltaT=\"soon\"/>"), AW_ERROR_FORMAT, "attribute DeltaT|soon" },
    { HEAD "<Image><Pixels DimensionOrder=\"XYZCC\" SizeX=\"4\" SizeY=\"3\" SizeZ=\"1\" SizeC=\"1\" "
           "SizeT=\"1\"/></Image></OME>",
      AW_ERROR_FORMAT, "DimensionOrder \"XYZCC\"" },
  };
  for (gsize i = 0; i < G_N_ELEMENTS(cases); i++)
    check_refused(cases[i].xml, 1, 0, -1, cases[i].code, cases[i].parts);
}

static void missing_plane(void)
{
  check_refused(HEAD SIZES("4", "2", "1") "<TiffData IFD=\"0\" FirstC=\"0\"/>" END, 1, 0, 1, AW_ERROR_NOT_FOUND,
                "page 0|no plane for channel 1");
}

/* Thousands of TiffData that each name all planes must not cost hours. */
static void endless_planes(void)
{
  g_autoptr(GString) xml = g_string_new(HEAD SIZES("4", "1", "100000"));
  for (int i = 0; i < 6; i++)
    g_string_append(xml, "<TiffData IFD=\"0\" PlaneCount=\"100000\"/>");
  g_string_append(xml, END);
  check_refused(xml->str, 1, 0, -1, AW_ERROR_RANGE, "TiffData name more than 400000 planes");
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/image/ome/recognised", recognised);
  aw_check_add("/image/ome/pixel-sizes", pixel_sizes);
  aw_check_add("/image/ome/positions", positions);
  g_test_add_func("/image/ome/times", times);
  g_test_add_func("/image/ome/significant-bits", significant_bits);
  g_test_add_func("/image/ome/dimension-orders", dimension_orders);
  g_test_add_func("/image/ome/several-images", several_images);
  g_test_add_func("/image/ome/several-files", several_files);
  g_test_add_func("/image/ome/colour-channel", colour_channel);
  g_test_add_func("/image/ome/two-samples", two_samples);
  aw_check_add("/image/ome/bad-metadata", bad_metadata);
  g_test_add_func("/image/ome/missing-plane", missing_plane);
  g_test_add_func("/image/ome/endless-planes", endless_planes);
  return g_test_run();
}

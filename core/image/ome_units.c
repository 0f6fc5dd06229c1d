/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "image/ome.h"

/* UnitsLength and UnitsTime of the OME schema 2016-06; inches and their kin by the international yard (1959),
 * astronomical ones by IAU 2012 B2 and 2015 B2. */

typedef struct {
  const char *name;
  double factor;
} Unit;

static const Unit length_units[] = {
  { "\xc2\xb5m", 1 }, /* micro sign */
  { "\xce\xbcm", 1 }, /* Greek mu */
  { "um", 1 },
  { "nm", 1e-3 },
  { "mm", 1e3 },
  { "cm", 1e4 },
  { "dm", 1e5 },
  { "m", 1e6 },
  { "dam", 1e7 },
  { "hm", 1e8 },
  { "km", 1e9 },
  { "Mm", 1e12 },
  { "Gm", 1e15 },
  { "Tm", 1e18 },
  { "Pm", 1e21 },
  { "Em", 1e24 },
  { "Zm", 1e27 },
  { "Ym", 1e30 },
  { "pm", 1e-6 },
  { "fm", 1e-9 },
  { "am", 1e-12 },
  { "zm", 1e-15 },
  { "ym", 1e-18 },
  { "\xc3\x85", 1e-4 },     /* A with ring */
  { "\xe2\x84\xab", 1e-4 }, /* angstrom sign */
  { "thou", 25.4 },
  { "li", 25400.0 / 12 },
  { "in", 25400 },
  { "ft", 304800 },
  { "yd", 914400 },
  { "mi", 1609344e3 },
  { "pt", 25400.0 / 72 },
  { "ua", 149597870700e6 },
  { "ly", 9460730472580800e6 },
  { "pc", 3.0856775814913673e22 },
};

static const Unit time_units[] = {
  { "s", 1 },     { "ms", 1e-3 },  { "\xc2\xb5s", 1e-6 }, { "\xce\xbcs", 1e-6 }, { "us", 1e-6 },
  { "ns", 1e-9 }, { "ps", 1e-12 }, { "cs", 1e-2 },        { "ds", 1e-1 },        { "min", 60 },
  { "h", 3600 },  { "d", 86400 },  { "das", 10 },         { "hs", 100 },         { "ks", 1e3 },
};

static gboolean convert(const Unit *units, gsize n, double value, const char *name, double *out)
{
  for (gsize i = 0; i < n; i++)
    if (strcmp(units[i].name, name) == 0) {
      *out = value * units[i].factor;
      return isfinite(*out);
    }
  return FALSE;
}

gboolean aw_ome_length_um(double value, const char *unit, double *um)
{
  return convert(length_units, G_N_ELEMENTS(length_units), value, unit, um);
}

gboolean aw_ome_time_s(double value, const char *unit, double *s)
{
  return convert(time_units, G_N_ELEMENTS(time_units), value, unit, s);
}

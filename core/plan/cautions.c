/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "plan/cautions.h"

#include <stddef.h>

const char *const aw_cautions[] = {
  /* One string in two lines. */
  ("Positions are predictions: before cells, prove axis signs, scale and offset on at least three asymmetric marks and "
   "on a bead or track detector."),
  "Aimwell controls no beam, shutter or interlock.",
  "Dose figures are planning estimates.",
  "Work with radiation and cells follows local rules, the radiation protection officer and qualified staff.",
  NULL,
};

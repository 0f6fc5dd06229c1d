#!/bin/sh
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# demo.sh AIMWELL SAMPLES OUT: the main job on the sample dish, told as it goes. Leaves OUT/demo.dish, targets.csv, map.png and a
# figure for each fit.
set -eu
aimwell=$1 samples=$2 out=$3
dish=$out/demo.dish cal=$samples/calibration
rm -rf "$out"
mkdir -p "$out"
say() { printf '\n%s\n' "$*"; }
show() { echo "  \$ aimwell $*"; "$aimwell" "$@" 2>&1 | sed '/^Next: /d; s/^/    /'; }

say "Aimwell on its sample dish: nine overlapping frames of stained nuclei (sampleimages/README.md)."
say "1. Make a dish record from the scan table; the images stay where they are."
show start "$dish" --scan "$samples/scan.csv" --who demo
say "2. The morning's calibration: the camera's pixels from one mark seen at nine readings, ..."
show calibrate "$dish" pixel "$cal/pixel.csv" --at 2026-05-04T08:05:00Z --who demo --figure "$out/pixel.png"
say "   ... the way from the scan stage to the beam stage from six marks read on both, ..."
show calibrate "$dish" marks "$cal/marks.csv" --fit rigid --at 2026-05-04T09:30:00Z --who demo \
  --figure "$out/marks.png" --map "$out/error.png"
say "   ... the beam's width by two knife edges, ..."
show calibrate "$dish" edge "$cal/edge-x.csv" --axis x --crosshair 50120 --at 2026-05-04T08:20:00Z --who demo \
  --figure "$out/edge-x.png"
show calibrate "$dish" edge "$cal/edge-y.csv" --axis y --crosshair 30110 --at 2026-05-04T08:22:00Z --who demo \
  --figure "$out/edge-y.png"
say "   ... where the beam is against the crosshair by a bead, twice, which tells its drift, and the layers it passes."
show calibrate "$dish" bead "$cal/bead-0830.csv" --crosshair 52012,31408 --at 2026-05-04T08:30:00Z --who demo
show calibrate "$dish" bead "$cal/bead.csv" --crosshair 52012,31408 --at 2026-05-04T09:40:00Z --who demo \
  --figure "$out/bead.png"
show calibrate "$dish" beam "$cal/proton.beam" --at 2026-05-04T08:00:00Z --who demo
say "3. Find the nuclei. The calibrated pixels are checked against the overlaps of the frames."
show segment "$dish" --who demo
say "4. Propose the nuclei that are whole, single and of usual size ..."
show choose "$dish" --who demo
say "   ... and accept them all. At work you look at each first."
show choose "$dish" --accept proposed --who demo
say "5. Order them so that the stage travels little."
show route "$dish" --who demo
say "6. Write the target list; it is read back and compared with the plan before it gets its name."
show export "$dish" -o "$out/targets.csv" --who demo
say "7. Draw the dish."
show map "$dish" -o "$out/map.png"
say "8. What the aim errs by an hour after the scan; what nobody measured is assumed and stands out."
show calibrate "$dish" --show --at 2026-05-04T10:12:00Z --figure "$out/budget.png"
say "The dish at a glance:"
show status "$dish"
say "Now look at $out/map.png and $out/targets.csv; the record is $dish."
echo "Positions are predictions: prove signs, scale and offset on marks and on a bead or track detector before cells."

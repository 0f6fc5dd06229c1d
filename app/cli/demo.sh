#!/bin/sh
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# demo.sh AIMWELL SAMPLES OUT: the main job on the sample dish, told as it goes. Leaves OUT/demo.dish, targets.csv, map.png.
set -eu
aimwell=$1 samples=$2 out=$3
dish=$out/demo.dish
rm -rf "$out"
mkdir -p "$out"
say() { printf '\n%s\n' "$*"; }
show() { echo "  \$ aimwell $*"; "$aimwell" "$@" 2>&1 | sed '/^Next: /d; s/^/    /'; }

say "Aimwell on its sample dish: nine overlapping frames of stained nuclei (sampleimages/README.md)."
say "1. Make a dish record from the scan table; the images stay where they are."
show start "$dish" --scan "$samples/scan.csv" --who demo
say "2. Find the nuclei. The camera's rotation against the stage is fitted from the overlaps."
show segment "$dish" --who demo
say "3. Propose the nuclei that are whole, single and of usual size ..."
show choose "$dish" --who demo
say "   ... and accept them all. At work you look at each first."
show choose "$dish" --accept proposed --who demo
say "4. Order them so that the stage travels little."
show route "$dish" --who demo
say "5. Write the target list; it is read back and compared with the plan before it gets its name."
show export "$dish" -o "$out/targets.csv" --who demo
say "6. Draw the dish."
show map "$dish" -o "$out/map.png"
say "The dish at a glance:"
show status "$dish"
say "Now look at $out/map.png and $out/targets.csv; the record is $dish."
echo "Positions are predictions: prove signs, scale and offset on marks and on a bead or track detector before cells."

# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# The main job on four frames of the sample dish, with decisions, undo and redo.
small_scan
run aimwell start small.dish --scan scan.csv --who ada
run aimwell segment small.dish --who ada
run aimwell choose small.dish --who ada
run aimwell choose small.dish --accept proposed --who ada
run aimwell choose small.dish --reject 1-3 --who ben
run aimwell route small.dish --who ben
run aimwell export small.dish -o targets.csv --who ben
run head -12 targets.csv
run aimwell export small.dish -o targets.tsv --layout tsv
grep -c . targets.tsv
run aimwell export small.dish -o /dev/stdout | tail -3
run aimwell status small.dish | grep -v "^Age"
run aimwell status small.dish --json --verify | sed "s/\"scan_age_s\": [0-9.]*/\"scan_age_s\": AGE/"
run aimwell undo small.dish --who ben
run aimwell undo small.dish --who ben
run aimwell undo small.dish --redo --who ben
run aimwell journal small.dish
run aimwell map small.dish -o map.png
run aimwell map small.dish -o map.svg
run aimwell map small.dish -o map.pdf
for f in map.png map.svg map.pdf; do head -c 4 $f | tr -d '\000' ; echo; done
list

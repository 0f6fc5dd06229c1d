# Every measurement of the sample morning on a small dish; the offset and the relocation reach the target list.
small_scan
cal=$SAMPLES/calibration
quietly aimwell start small.dish --scan scan.csv --who ada
run aimwell calibrate small.dish pixel "$cal/pixel.csv" --at 2026-05-04T08:05:00Z --who ada --figure pixel.png
run aimwell segment small.dish --who ada
run aimwell calibrate small.dish marks "$cal/marks.csv" --fit rigid --at 2026-05-04T09:30:00Z --who ada --figure marks.svg --map error.png
run aimwell calibrate small.dish edge "$cal/edge-x.csv" --axis x --crosshair 50120 --at 2026-05-04T08:20:00Z --who ada --figure edge.png
run aimwell calibrate small.dish edge "$cal/edge-y.csv" --axis y --plateaus --crosshair 30110 --at 2026-05-04T08:22:00Z --who ada
run aimwell calibrate small.dish bead "$cal/bead-0830.csv" --crosshair 52012,31408 --at 2026-05-04T08:30:00Z --who ada
run aimwell calibrate small.dish bead "$cal/bead.csv" --elliptical --crosshair 52012,31408 --at 2026-05-04T09:40:00Z --who ada --figure bead.pdf
run aimwell calibrate small.dish beam "$cal/proton.beam" --at 2026-05-04T08:00:00Z --who ada
run aimwell calibrate small.dish error --term stage --um 0.25 --at 2026-05-04T08:00:00Z --who ada
run aimwell calibrate small.dish --show --at 2026-05-04T10:12:00Z --figure budget.png
aimwell calibrate small.dish --show --at 2026-05-04T10:12:00Z --json | python3 -c '
import json, sys
d = json.load(sys.stdin)
print(len(d["calibrations"]), [t["term"] for t in d["budget"]], round(sum(t["share_frac"] for t in d["budget"]), 6))'
quietly aimwell choose small.dish --accept 1,2,3 --who ada
quietly aimwell route small.dish --who ada
quietly aimwell export small.dish -o targets.csv --who ada
grep '^# origin' targets.csv
echo "--- undone, the older check counts again"
run aimwell undo small.dish --who ada
run aimwell undo small.dish --who ada
run aimwell undo small.dish --who ada
run aimwell undo small.dish --who ada
run aimwell undo small.dish --who ada
run aimwell undo small.dish --who ada
run aimwell status small.dish | grep -A1 Place
ls *.png *.svg *.pdf

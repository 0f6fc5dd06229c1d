# Every measurement of the sample morning on a small dish; the offset and the relocation reach the target list.
small_scan
cp -r "$SAMPLES/calibration" cal
quietly aimwell start small.dish --scan scan.csv --who ada
run aimwell calibrate small.dish pixel cal/pixel.csv --at 2026-05-04T08:05:00Z --who ada --figure pixel.png
run aimwell calibrate small.dish marks cal/marks.csv --fit rigid --at 2026-05-04T09:30:00Z --who ada --figure marks.svg
run aimwell calibrate small.dish edge cal/edge-x.csv --axis x --crosshair 50120 --at 2026-05-04T08:20:00Z --who ada --figure edge.png
run aimwell calibrate small.dish edge cal/edge-y.csv --axis y --plateaus --crosshair 30110 --at 2026-05-04T08:22:00Z --who ada
run aimwell calibrate small.dish bead cal/bead-0830.csv --crosshair 52012,31408 --at 2026-05-04T08:30:00Z --who ada
run aimwell calibrate small.dish bead cal/bead.csv --elliptical --crosshair 52012,31408 --at 2026-05-04T09:40:00Z --who ada --figure bead.pdf
run aimwell calibrate small.dish beam cal/proton.beam --at 2026-05-04T08:00:00Z --who ada
run aimwell calibrate small.dish error --term stage --um 0.25 --at 2026-05-04T08:00:00Z --who ada
run aimwell calibrate small.dish --show --at 2026-05-04T10:12:00Z --figure budget.png
aimwell calibrate small.dish --show --at 2026-05-04T10:12:00Z --json | python3 -c '
import json, sys
d = json.load(sys.stdin)
print(len(d["calibrations"]), [t["term"] for t in d["budget"]], round(sum(t["share_frac"] for t in d["budget"]), 6))'
echo "--- undone, the older check counts again"
run aimwell undo small.dish --who ada
run aimwell undo small.dish --who ada
run aimwell undo small.dish --who ada
run aimwell undo small.dish --who ada
run aimwell status small.dish | grep -A1 Place
echo "--- positions before and after relocation and offset: b = T(q) + o"
quietly aimwell segment small.dish --who ada
quietly aimwell choose small.dish --accept 1,2,3 --who ada
quietly aimwell route small.dish --who ada
run aimwell calibrate small.dish marks cal/marks.csv --fit affine --localisation-um 0.8 --at 2026-05-04T09:35:00Z --who ada --map error.png |
  sed -n '/Localisation/,$s/at the [0-9]* nuclei/at the N nuclei/p'
quietly aimwell calibrate small.dish bead cal/bead.csv --crosshair 52012,31408 --at 2026-05-04T09:40:00Z --who ada
quietly aimwell export small.dish -o placed.csv --who ada
grep '^# origin' placed.csv | sed 's/calibrated from one mark.*/calibrated from one mark .../'
quietly aimwell start plain.dish --scan scan.csv --who ada
quietly aimwell calibrate plain.dish pixel cal/pixel.csv --who ada
quietly aimwell segment plain.dish --who ada
quietly aimwell choose plain.dish --accept 1,2,3 --who ada
quietly aimwell route plain.dish --who ada
quietly aimwell export plain.dish -o plain.csv --who ada
# the truth that the tables were drawn from, within 1 um
python3 -c '
import csv, math
rows = [{r["nucleus"]: (float(r["x_um"]), float(r["y_um"])) for r in csv.DictReader(l for l in open(f) if l[0] != "#")}
        for f in ("plain.csv", "placed.csv")]
c, s = math.cos(0.0062), math.sin(0.0062)
for k, (x, y) in rows[0].items():
    b = c * x - s * y + 312.4 + 3.42, s * x + c * y - 187.9 - 1.87
    print("nucleus", k, "where it should be:", math.dist(b, rows[1][k]) < 1)'
ls *.png *.svg *.pdf

# What cannot be calibrated is refused by name, and nothing is stored.
# The tables are made with decimal points under every locale.
awk() { LC_ALL=C command awk "$@"; }
small_scan
cp -r "$SAMPLES/calibration" cal
quietly aimwell start small.dish --scan scan.csv --who ada
bad() { run aimwell calibrate small.dish "$@" --who ada; }

echo "--- marks"
head -3 cal/marks.csv > two.csv
bad marks two.csv
printf 'scan_x_um,scan_y_um,beam_x_um,beam_y_um\n0,0,5,5\n1000,1000,1005,1005\n3000,3000,3005,3005\n' > line.csv
bad marks line.csv
head -4 cal/marks.csv > three.csv
bad marks three.csv --fit affine
awk -F, 'NR == 1 { print; next } { print $1 "," $2 "," $3 "," $4 / 1000 "," $5 / 1000 }' cal/marks.csv > mm.csv
bad marks mm.csv
awk -F, 'NR == 1 { print; next } { print $1 "," $2 "," $3 "," (-$4) "," $5 }' cal/marks.csv > flipped.csv
bad marks flipped.csv
sed 's/beam_x_um/beam_x_mm/' cal/marks.csv > unit.csv
bad marks unit.csv
bad marks cal/marks.csv --fit elastic
echo "--- a swapped pair is named, not refused"
awk -F, 'NR == 3 { split($0, a, ","); next } NR == 5 { print a[1] "," a[2] "," a[3] "," $4 "," $5; print $1 "," $2 "," $3 "," a[4] "," a[5]; next } { print }' cal/marks.csv > swapped.csv
bad marks swapped.csv --fit rigid | grep 'Wrong pairs'
quietly aimwell undo small.dish --who ada

echo "--- pixel"
head -3 cal/pixel.csv > two.csv
bad pixel two.csv
awk -F, 'NR == 1 { print; next } { print $1 ",500," $3 "," $4 }' cal/pixel.csv > line.csv
bad pixel line.csv
awk -F, 'NR == 1 { print; next } { print $1 / 1000 "," $2 / 1000 "," $3 "," $4 }' cal/pixel.csv > mm.csv
bad pixel mm.csv
printf 'file,stage_x_um,stage_y_um\nframes/nuclei-1.tif,0,0\n' > images.csv
bad pixel images.csv

echo "--- edge"
bad edge cal/edge-x.csv
head -12 cal/edge-x.csv > short.csv
bad edge short.csv --axis x
head -19 cal/edge-x.csv > half.csv
bad edge half.csv --axis x
sed '5s/,0,/,-3,/' cal/edge-x.csv > negative.csv
bad edge negative.csv --axis x
printf 'position_um,n_full,n_degraded\n0,0,50\n1,0,0\n2,50,0\n3,50,0\n' > zero.csv
bad edge zero.csv --axis x
printf 'position_um,fraction\n0,0\n1,0.5\n2,1.2\n3,1\n4,1\n' > over.csv
bad edge over.csv --axis y

echo "--- bead"
head -8 cal/bead.csv > few.csv
bad bead few.csv --crosshair 52012,31408
awk -F, 'NR == 1 { print; next } { print $1 "," $2 ",99,1" }' cal/bead.csv > none.csv
bad bead none.csv
awk -F, 'NR == 1 || $1 <= 52015' cal/bead.csv > edge.csv
bad bead edge.csv
bad bead cal/bead.csv --image frames/nuclei-1.tif

echo "--- beam"
sed 's/thickness-um=2$/thickness-um=900/' cal/proton.beam > stops.beam
bad beam stops.beam
sed 's/energy-mev=3/energy-mev=0.5/' cal/proton.beam > slow.beam
bad beam slow.beam
sed 's/energy-mev=3/energy-mev=700/' cal/proton.beam > fast.beam
bad beam fast.beam
sed 's/shape=gaussian/sigma-x-um=0/' cal/proton.beam > sigma.beam
bad beam sigma.beam

echo "--- error, and words"
bad error --term wind --um 1
bad error --term stage --um -1
bad error --term stage
bad wind scan.csv
bad edge
bad edge cal/edge-x.csv --axis x --at yesterday
echo "--- a figure that cannot be written keeps the calibration out"
bad edge cal/edge-x.csv --axis x --figure nowhere/edge.png
bad edge cal/edge-x.csv --axis x --figure edge.gif
run aimwell journal small.dish | wc -l

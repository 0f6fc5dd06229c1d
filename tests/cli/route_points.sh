# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Points of a table: other columns carried along, ends, closed tours, spots named twice, bad tables.
cat > points.csv <<'P'
# a comment stays
name,x_um,y_um
"far, away",100,0
near,0,0
mid,50,0
top,50,40
P
run aimwell route points.csv -o ordered.csv --from -10,0
run cat ordered.csv
run aimwell route points.csv -o closed.csv --closed --json
run cat closed.csv
run aimwell route points.csv -o /dev/stdout --to 0,0 --from 0,0
printf 'x_um,y_um\n1,1\n5,5\n1,1\n' > twice.csv
run aimwell route twice.csv -o twice_out.csv
run cat twice_out.csv
printf 'x_um,y_um\n' > empty.csv
run aimwell route empty.csv -o no.csv
printf 'x_um,z\n1,1\n' > column.csv
run aimwell route column.csv -o no.csv
printf 'x_um,y_um\n1,"1,5"\n' > comma.csv
run aimwell route comma.csv -o no.csv
printf 'x_um,y_um\n1,nan\n' > nan.csv
run aimwell route nan.csv -o no.csv
printf 'x_um,y_um\n1,one\n' > word.csv
run aimwell route word.csv -o no.csv
printf 'x_um,y_um\n1,1e9\n' > large.csv
run aimwell route large.csv -o no.csv
printf 'x_um,y_um,order\n1,1,1\n' > order.csv
run aimwell route order.csv -o no.csv
run aimwell route missing.csv -o no.csv
run aimwell route points.csv -o nofolder/out.csv
run aimwell route points.csv -o /dev/full
printf '\357\273\277x_um,y_um\r\n3,3\r\n1,1\r\n' > bom.csv
run aimwell route bom.csv -o bom_out.csv --from 0,0
run cat bom_out.csv
list

# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Target lists in other controllers' layouts: axis signs, units, stage limits, misspelt keys.
small_scan
quietly aimwell start a.dish --scan scan.csv
quietly aimwell segment a.dish
quietly aimwell choose a.dish --accept 1-30
quietly aimwell route a.dish
for name in heron willow; do
  run aimwell export a.dish -o $name.txt --layout $SAMPLES/layouts/$name.layout | sed "s|$SAMPLES|SAMPLES|"
  ls $name.txt*
  grep -v -e '^#' $name.txt | wc -l
done
cat > narrow.layout <<'L'
[layout]
name=narrow
[limits]
x-min-um=0
x-max-um=1000
[column.x]
value=x
[column.y]
value=y
[column.n]
value=particles
L
run aimwell export a.dish -o t.csv --layout narrow.layout
sed -i 's/x-max-um/x-maximum/' narrow.layout
run aimwell export a.dish -o t.csv --layout narrow.layout
list | grep -v frames

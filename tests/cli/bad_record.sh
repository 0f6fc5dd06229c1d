# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Records that cannot be used, and steps out of turn.
small_scan
run aimwell segment missing.dish
echo text > text.dish
run aimwell status text.dish
: > empty.dish
run aimwell status empty.dish
sqlite3 foreign.dish 'create table t(x)'
run aimwell status foreign.dish
quietly aimwell start a.dish --scan scan.csv
cp a.dish newer.dish
sqlite3 newer.dish 'pragma user_version=99'
run aimwell status newer.dish
cp a.dish cut.dish
truncate -s 6000 cut.dish
run aimwell status cut.dish
run aimwell choose a.dish
run aimwell route a.dish
run aimwell export a.dish -o t.csv
run aimwell undo a.dish
run aimwell undo a.dish --redo
quietly aimwell segment a.dish
quietly aimwell choose a.dish
run aimwell route a.dish
quietly aimwell choose a.dish --accept 1-9
run aimwell export a.dish -o t.csv
quietly aimwell route a.dish
run aimwell export a.dish -o nofolder/t.csv
run aimwell export a.dish -o /dev/full
run aimwell export a.dish -o t.csv --layout nothere.layout
run aimwell map a.dish -o nofolder/m.png
run aimwell map a.dish -o /dev/full
run aimwell map a.dish -o m.bmp
quietly aimwell choose a.dish --accept 10
run aimwell export a.dish -o t.csv
aimwell journal a.dish | wc -l
list

# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Words that make no command: exit status 2 and a hint, for every command.
run aimwell
run aimwell frobnicate
run aimwell start
run aimwell start x.dish
run aimwell start x.dish --scan a.csv b.tif
run aimwell start x.dish --scan a.csv --pixel-um 0,65
run aimwell start x.dish --scan a.csv --pixel-um -1
run aimwell segment
run aimwell segment a.tif
run aimwell segment a.tif b.dish --labels out
run aimwell segment x.dish --labels out
run aimwell segment x.dish --sensitivity 3
run aimwell segment x.dish --pixel-map 1,0,0
run aimwell segment x.dish --pixel-map 1,1,1,1
run aimwell segment a.tif --labels out --nucleus-width-um 12
run aimwell choose
run aimwell choose x.dish y.dish
run aimwell choose x.dish --frob
run aimwell route
run aimwell route a.csv
run aimwell route x.dish -o out.csv
run aimwell route a.csv -o b.csv --from 1
run aimwell route a.csv -o b.csv --closed --from 1,2
run aimwell route a.csv -o b.csv --steps 5 --budget 1
run aimwell export x.dish
run aimwell map x.dish
run aimwell map x.dish -o m.png --width 3
run aimwell status
run aimwell undo
run aimwell journal x.dish extra
run aimwell status x.dish --threads -2
list

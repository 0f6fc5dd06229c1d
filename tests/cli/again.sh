# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Segmenting again keeps numbers and decisions on nuclei that are the same, and names those it could not keep.
small_scan
quietly aimwell start a.dish --scan scan.csv
quietly aimwell segment a.dish
quietly aimwell choose a.dish
quietly aimwell choose a.dish --accept 1-20 --reject 21-40
run aimwell segment a.dish
aimwell status a.dish | grep Nuclei
run aimwell segment a.dish --sensitivity -1
aimwell status a.dish | grep Nuclei
run aimwell undo a.dish
aimwell status a.dish | grep Nuclei
run aimwell choose a.dish --gate area_um2=80..250 --gate isolation_um=3..
run aimwell choose a.dish --no-default-gates --gate confidence=0.5..
run aimwell choose a.dish --gate confidence=2..1
run aimwell choose a.dish --gate confidence
run aimwell choose a.dish --gate weight=1..2
run aimwell choose a.dish --gate 'area_um2=1,5..3'
run aimwell choose a.dish --accept 5000
run aimwell choose a.dish --accept 9-3
run aimwell choose a.dish --accept 4 5 --reject 5
run aimwell choose a.dish --particles 0
run aimwell choose a.dish --particles -1
run aimwell choose a.dish --particles 1000000000
run aimwell choose a.dish --particles 4
aimwell status a.dish --json | grep -o '"particles": [0-9]*'

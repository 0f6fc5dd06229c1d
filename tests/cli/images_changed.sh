# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Moved images are found again, changed ones are refused by name.
small_scan
quietly aimwell start a.dish --scan scan.csv
first=$(sed -n 2p scan.csv | cut -d, -f1)
mkdir elsewhere
mv "$first" elsewhere/
run aimwell status a.dish | grep -E '^(Image|\()'
run aimwell segment a.dish
run aimwell status a.dish --relink elsewhere | grep -E '^(Image|[0-9]|\()'
quietly aimwell segment a.dish
mv elsewhere/* "$first"
run aimwell status a.dish --relink . | grep -E '^(Image|[0-9]|\()'
touch "$first"
run aimwell status a.dish --verify | grep -E '^(Image|\()'
printf '\001' | dd of="$first" bs=1 seek=5000 conv=notrunc 2>/dev/null
run aimwell status a.dish --verify | grep -E '^(Image|\()'
run aimwell segment a.dish
aimwell status a.dish | grep Nuclei

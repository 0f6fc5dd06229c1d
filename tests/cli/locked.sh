# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# A record that another process writes is locked for writers, open for readers; read-only files and folders are refused.
small_scan
quietly aimwell start a.dish --scan scan.csv
flock a.dish.lock sleep 3 &
sleep 0.3
run aimwell segment a.dish | sed 's/process [0-9]*/process N/'
aimwell status a.dish | grep Nuclei
wait
mkdir shut
cp a.dish shut/a.dish
cp -r --parents $(grep -v '^file' scan.csv | cut -d, -f1) shut/
chmod 444 shut/a.dish
chmod 555 shut
as() { if [ "$(id -u)" = 0 ]; then setpriv --reuid 65534 --regid 65534 --clear-groups "$@"; else "$@"; fi; }
chmod 755 .
run as "$AIMWELL" status shut/a.dish | grep -E 'Nuclei|\(exit|\$' | sed "s|$AIMWELL|aimwell|"
run as "$AIMWELL" segment shut/a.dish | sed "s|$AIMWELL|aimwell|"
run as "$AIMWELL" start shut/b.dish --scan scan.csv | sed "s|$AIMWELL|aimwell|"
(cd shut && list | grep -v tif)

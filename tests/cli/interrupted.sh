# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Ctrl-C and SIGTERM during segment: exit status 1, the record as it was, nothing left behind.
small_scan
image=$(sed -n 2p scan.csv | cut -d, -f1)
echo file,stage_x_um,stage_y_um,pixel_um > many.csv
for i in $(seq 40); do cp "$image" f$i.tif; echo f$i.tif,$((i * 5000)),0,0.65 >> many.csv; done
quietly aimwell start a.dish --scan many.csv
before=$(state a.dish)
for signal in INT TERM; do
  "$AIMWELL" segment a.dish --threads 1 > out.txt 2>&1 &
  until [ -e a.dish.lock ]; do sleep 0.02; done
  kill -$signal $!
  wait $!
  echo "$signal: exit $?"
  cat out.txt
  [ "$(state a.dish)" = "$before" ] && echo "the record is as it was"
done
rm f*.tif
list

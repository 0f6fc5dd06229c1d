# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Same input, same bytes, for any number of threads; the journal's times and the record's file apart.
small_scan
for n in 1 2 3; do
  quietly aimwell start t$n.dish --scan scan.csv --threads $n
  quietly aimwell segment t$n.dish --threads $n
  quietly aimwell choose t$n.dish
  quietly aimwell choose t$n.dish --accept proposed
  quietly aimwell route t$n.dish
  quietly aimwell export t$n.dish -o t$n.csv
  quietly aimwell map t$n.dish -o t$n.png
  grep -v '^#' t$n.csv > t$n.rows
done
cmp t1.rows t2.rows && cmp t1.rows t3.rows && echo "target lists equal"
images=$(grep -v '^file' scan.csv | cut -d, -f1)
quietly aimwell segment $images --labels a1 --table a1.csv --threads 1
quietly aimwell segment $images --labels a2 --table a2.csv --threads 2
diff -r a1 a2 && cmp a1.csv a2.csv && echo "label images and tables equal"

# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Words that the command line tests share; sourced by run.py before each test.

aimwell() { "$AIMWELL" "$@"; }

# Prints the command and what it says, then its exit status when that is not 0.
run() {
  echo "\$ $*"
  "$@" 2>&1
  local status=$?
  [ $status = 0 ] || echo "(exit $status)"
}

# Runs quietly; prints only when it fails.
quietly() {
  local out
  out=$("$@" 2>&1) || { echo "\$ $*"; echo "$out"; echo "(failed)"; }
}

# A small dish made of four sample frames: small.dish with nuclei found. Copies the frames so that tests may spoil them.
small_scan() {
  head -1 "$SAMPLES/scan.csv" | cat > scan.csv
  grep -v '^#' "$SAMPLES/scan.csv" | sed -n '2,3p;6,7p' >> scan.csv
  grep -v '^file' scan.csv | cut -d, -f1 | while read -r f; do mkdir -p "$(dirname "$f")"; cp "$SAMPLES/$f" "$f"; done
}

# Files and folders here with sizes left out: shows that nothing half-written stays behind.
list() { find . -mindepth 1 | sed 's|^\./||' | LC_ALL=C sort; }

# A fingerprint of a record's content through its own commands, to show that it did not change.
state() { "$AIMWELL" journal "$1" | sed 's/^ *//' | wc -l; "$AIMWELL" status "$1" --json; }

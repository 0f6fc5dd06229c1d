#!/bin/sh
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# need.sh LIST...: installs the Debian packages of app/packaging/packages-LIST.txt that are missing, and says so first.
set -eu
here=$(dirname "$0")
if ! command -v dpkg-query >/dev/null 2>&1; then
  echo "need.sh: this is no Debian system; install what app/packaging/packages-*.txt name by your own means" >&2
  exit 0
fi
missing=
for list in "$@"; do
  for package in $(grep -v '^#' "$here/packages-$list.txt"); do
    status=$(dpkg-query -W -f='${db:Status-Status}' "$package" 2>/dev/null || true)
    [ "$status" = installed ] || missing="$missing $package"
  done
done
[ -n "$missing" ] || exit 0
run=
if [ "$(id -u)" != 0 ]; then
  command -v sudo >/dev/null 2>&1 || { echo "need.sh: missing packages:$missing; neither root nor sudo here to install them" >&2; exit 1; }
  run=sudo
fi
echo "Aimwell needs Debian packages that are not installed yet:$missing"
echo "Installing them with ${run:+$run }apt-get ..."
log=$(mktemp)
if ! { $run apt-get update && $run env DEBIAN_FRONTEND=noninteractive apt-get install -y --no-install-recommends $missing; } >"$log" 2>&1; then
  tail -20 "$log" >&2
  rm -f "$log"
  echo "need.sh: apt-get failed" >&2
  exit 1
fi
rm -f "$log"

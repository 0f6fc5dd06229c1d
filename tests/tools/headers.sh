#!/bin/sh
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# headers.sh CC FLAGS PKG_FLAGS: every header compiles alone.
bad=0
for header in $(git ls-files -co --exclude-standard 'core/*.h' 'app/*.h' 'tests/*.h'); do
  # shellcheck disable=SC2086
  $1 $2 $3 -Werror -fsyntax-only -x c "$header" || { echo "$header does not compile alone"; bad=1; }
done
[ $bad = 0 ] && echo "every header compiles alone"
exit $bad

# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# The help of every command; every option stands in the manual page too.
run aimwell --help
aimwell --version | sed 's|[0-9][0-9.]*|N|g'
for command in start segment choose route export map status undo journal; do
  run aimwell $command --help
  page=$TESTS/../docs/man/aimwell-$command.1
  [ -f "$page" ] || echo "no manual page for $command"
  for option in $(aimwell $command --help | grep -o -- '--[a-z-]*' | sort -u); do
    [ "$option" = --help ] || tr -d '\\' < "$page" | grep -q -- "$option" || echo "$command $option is not in its manual page"
  done
done

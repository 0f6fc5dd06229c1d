#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""The plan hash, found again without Aimwell's code.

Python's csv and hashlib read target lists in the built-in layouts and rebuild the canonical text as docs/formats.md
("Plan hash") words it. Lists: the expected files of the unit tests, and one exported now where `aimwell` is built.
"""
import csv
import hashlib
import os
import subprocess
import sys
import tempfile

RECIPE = r"""{ echo "aimwell plan 1 targets $(($(grep -vc '^#' "$1") - 1))"
grep -v '^#' "$1" | tail -n +2 | tr , ' '; } | sha256sum | cut -d' ' -f1"""


def read_list(path, delimiter):
    with open(path, encoding='utf-8', newline='') as f:
        lines = f.read().splitlines()
    heads = [line for line in lines if line.startswith('#')]
    rows = list(csv.DictReader(lines[len(heads):], delimiter=delimiter))
    stated = [line.split(': ', 1)[1] for line in heads if line.startswith('# plan-hash: ')]
    return stated, rows


def plan_hash(rows):
    text = f'aimwell plan 1 targets {len(rows)}\n'
    for row in rows:
        x, y = (f"{float(row[name]) + 0.0:.3f}" for name in ('x_um', 'y_um'))
        text += f"{row['target']} {row['nucleus']} {x} {y} {row['particles']} {row['arm']}\n"
    return hashlib.sha256(text.encode('ascii')).hexdigest()


def check_list(path, delimiter):
    stated, rows = read_list(path, delimiter)
    return len(rows) > 0 and stated == [plan_hash(rows)]


def check_recipe(path):
    """The shell lines that docs/formats.md gives, by grep, tr and sha256sum (GNU coreutils)."""
    found = subprocess.run(['sh', '-c', RECIPE, 'sh', path], capture_output=True, text=True, check=True).stdout.strip()
    return [found] == read_list(path, ',')[0]


def recipe_is_documented():
    with open('docs/formats.md', encoding='utf-8') as f:
        squeezed = ' '.join(f.read().split())
    return ' '.join(RECIPE.replace('"$1"', 'targets.csv').split()) in squeezed


def exported(folder):
    """A list of the demo's record, or None where there is none."""
    aimwell, dish = os.environ.get('AIMWELL', 'build/aimwell'), 'build/demo/demo.dish'
    if not os.access(aimwell, os.X_OK) or not os.path.exists(dish):
        return None
    path = os.path.join(folder, 'targets.csv')
    subprocess.run(['cp', dish, folder], check=True)
    copy = os.path.join(folder, os.path.basename(dish))
    done = subprocess.run([aimwell, 'export', copy, '-o', path], capture_output=True, text=True, check=False)
    return path if done.returncode == 0 else done.stderr.strip()


def main():
    expected = 'tests/unit/expected/targets'
    checks = [('plan hash of the expected csv list', check_list(expected + '.csv', ',')),
              ('plan hash of the expected tsv list', check_list(expected + '.tsv', '\t')),
              ('plan hash by grep, tr and sha256sum', check_recipe(expected + '.csv')),
              ('that recipe stands in docs/formats.md', recipe_is_documented())]
    print(f'1..{len(checks) + 1}')
    for i, (name, good) in enumerate(checks, 1):
        print(f"{'ok' if good else 'not ok'} {i} - {name}")
    with tempfile.TemporaryDirectory() as folder:
        path = exported(folder)
        if path is None:
            print(f'ok {len(checks) + 1} - plan hash of an exported list # SKIP build/demo/demo.dish is absent (make demo)')
        else:
            good = os.path.exists(path) and check_list(path, ',')
            print(f"{'ok' if good else 'not ok'} {len(checks) + 1} - plan hash of an exported list")
            checks.append((path, good))
    return 0 if all(good for _, good in checks) else 1


if __name__ == '__main__':
    sys.exit(main())

# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Measured quality, kept in tests/reference/results.csv so that a change shows as a diff.

A row is `measure,value,limit,source`. `keep(rows)` replaces the rows of the same measures and leaves the others; the file
is only written when AIMWELL_KEEP_RESULTS is set, so that a plain test run leaves the tree alone.
"""
import csv
import os
import pathlib

FILE = pathlib.Path(__file__).resolve().parent.parent / 'reference' / 'results.csv'
HEAD = ['measure', 'value', 'limit', 'source']


def opendata():
    """The folder of open data, or None."""
    root = pathlib.Path(__file__).resolve().parents[2]
    folder = pathlib.Path(os.environ.get('AIMWELL_OPENDATA', root / '..' / 'shared' / 'opendata')).resolve()
    return folder if folder.is_dir() else None


def keep(rows):
    if not os.environ.get('AIMWELL_KEEP_RESULTS'):
        return
    table = {}
    if FILE.exists():
        with open(FILE, newline='') as f:
            table = {r['measure']: r for r in csv.DictReader(f)}
    for measure, value, limit, source in rows:
        table[measure] = dict(zip(HEAD, (measure, value, limit, source)))
    with open(FILE, 'w', newline='') as f:
        w = csv.DictWriter(f, HEAD, lineterminator='\n')
        w.writeheader()
        w.writerows(table[k] for k in sorted(table))


class Tap:
    """Counts and prints TAP lines; `check` compares a value with a limit."""

    def __init__(self):
        self.n, self.rows = 0, []

    def ok(self, good, name):
        self.n += 1
        print(f'{"ok" if good else "not ok"} {self.n} - {name}', flush=True)

    def skip(self, name, why):
        self.n += 1
        print(f'ok {self.n} - {name} # SKIP {why}', flush=True)

    def check(self, measure, value, relation, limit, source):
        good = value >= limit if relation == '>=' else value <= limit
        self.rows.append((measure, f'{value:.4g}', f'{relation} {limit:g}', source))
        self.ok(good, f'{measure}: {value:.4g} {relation} {limit:g}')

    def end(self):
        keep(self.rows)
        print(f'1..{self.n}')

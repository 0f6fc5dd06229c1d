#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Runs test programs that print TAP and adds up what they say.

    tap.py [--logs DIR] [--timeout S] [--total FILE] [--prefix WORDS] [--args WORDS] PROGRAM...

Each PROGRAM runs alone (WORDS of --args go to the compiled unit tests, which need them to print TAP); `ok`, `not ok` and `# SKIP` lines are counted, a crash, a time-out, a plan that is not
kept or a program without any test counts as one failure. Failures and skips are printed by name. The last line is
'N passed, N failed, N skipped'; with --total the three numbers are also appended to FILE, and `tap.py --sum FILE`
prints their sums in the same form. Exit status 1 when anything failed.
"""
import argparse
import os
import re
import shlex
import subprocess
import sys

LINE = re.compile(r'^\s*(not )?ok\b\s*\d*\s*-?\s*(.*?)(?:\s*#\s*(skip|todo)\b\s*(.*))?$', re.I)
PLAN = re.compile(r'^1\.\.(\d+)')


def read(text):
    passed, failed, skipped, planned = 0, [], [], None
    for line in text.splitlines():
        plan = PLAN.match(line)
        if plan:
            planned = int(plan.group(1))
        found = LINE.match(line) if re.match(r'^\s*(not )?ok\b', line) else None
        if not found or line.startswith('    '):
            continue
        bad, name, word, why = found.groups()
        if word and word.lower() == 'skip':
            skipped.append(f'{name} ({why})' if why else name)
        elif bad:
            failed.append(name)
        else:
            passed += 1
    return passed, failed, skipped, planned


def run(command, timeout):
    try:
        p = subprocess.run(command, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, stdin=subprocess.DEVNULL,
                           timeout=timeout)
        return p.returncode, p.stdout.decode('utf-8', 'replace')
    except subprocess.TimeoutExpired as e:
        return 'time-out', (e.stdout or b'').decode('utf-8', 'replace')


def main():
    ap = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    ap.add_argument('--logs')
    ap.add_argument('--timeout', type=float, default=600)
    ap.add_argument('--total')
    ap.add_argument('--sum')
    ap.add_argument('--prefix', default='')
    ap.add_argument('--args', default='')
    ap.add_argument('program', nargs='*')
    a = ap.parse_args()
    if a.sum:
        rows = [[int(x) for x in line.split()] for line in open(a.sum)]
        n = [sum(c) for c in zip(*rows)] if rows else [0, 0, 0]
        print('%d passed, %d failed, %d skipped' % tuple(n))
        return 1 if n[1] or not n[0] else 0
    n = [0, 0, 0]
    for program in a.program:
        code, text = run(shlex.split(a.prefix) + [program] + (shlex.split(a.args) if '/tests/test_' in program else []), a.timeout)
        passed, failed, skipped, planned = read(text)
        if code != 0 and not failed:
            failed.append(f'{program}: ended with {code}')
        elif planned is not None and planned != passed + len(failed) + len(skipped):
            failed.append(f'{program}: planned {planned} tests, ran {passed + len(failed) + len(skipped)}')
        elif not (passed or failed or skipped):
            failed.append(f'{program}: no test')
        name = os.path.basename(program)
        if a.logs:
            os.makedirs(a.logs, exist_ok=True)
            with open(os.path.join(a.logs, name + '.tap'), 'w') as log:
                log.write(text)
        print(f'{"FAIL" if failed else "ok":4} {name}: {passed} passed' +
              (f', {len(failed)} failed' if failed else '') + (f', {len(skipped)} skipped' if skipped else ''))
        for line in failed:
            print(f'     not ok: {line}')
        for line in skipped:
            print(f'     skipped: {line}')
        if failed:
            print('\n'.join('       | ' + line for line in text.splitlines()[-40:]))
        n = [n[0] + passed, n[1] + len(failed), n[2] + len(skipped)]
        sys.stdout.flush()
    if a.total:
        with open(a.total, 'a') as f:
            f.write('%d %d %d\n' % tuple(n))
    print('%d passed, %d failed, %d skipped' % tuple(n))
    return 1 if n[1] else 0


if __name__ == '__main__':
    sys.exit(main())

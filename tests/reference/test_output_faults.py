#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Every system call of a file's way to its name fails once; strace injects the fault.

What must hold each time: either the new file stands whole under its name and the program says so, or the old one is
untouched, the program fails with a message that names the file, and nothing is left beside it. A kill at any of these
calls may leave the hidden part behind, but never a damaged file under the name.
"""
import os
import shutil
import subprocess
import sys
import tempfile

WRITER = os.path.join(os.environ.get('BIN', 'build'), 'reference', 'write_file')
N = 300000
OLD = b'old contents\n'
FAULTS = [('write', 'ENOSPC', range(1, 3)), ('write', 'EIO', range(1, 3)), ('write', 'EDQUOT', range(1, 2)),
          ('fsync', 'EIO', range(1, 2)), ('close', 'EIO', ()), ('rename', 'EACCES', range(1, 2)),
          ('fchmod', 'EPERM', range(1, 2))]
HARMLESS = {('fchmod', 'EPERM')}  # the file is whole, with other permissions


def run(folder, injection):
    """Runs the writer under strace; gives its exit status, message and the trace."""
    path, trace = os.path.join(folder, 'list.csv'), os.path.join(folder, '..', 'trace')
    with open(path, 'wb') as f:
        f.write(OLD)
    words = ['strace', '-f', '-o', trace, '-e', 'trace=openat,write,fsync,close,rename,fchmod']
    if injection:
        words += ['-e', 'inject=' + injection]
    done = subprocess.run(words + [WRITER, path, str(N)], capture_output=True, text=True, check=False)
    with open(trace, encoding='utf-8', errors='replace') as f:
        return done, f.read()


def state(folder):
    with open(os.path.join(folder, 'list.csv'), 'rb') as f:
        content = f.read()
    kind = 'old' if content == OLD else 'new' if content == b'x' * N else 'damaged'
    return kind, [name for name in os.listdir(folder) if name != 'list.csv']


def check_error(folder, call, code, when):
    done, trace = run(folder, f'{call}:error={code}:when={when}')
    kind, rest = state(folder)
    if '(INJECTED)' not in trace:
        return False, 'the call was never made'
    if (call, code) in HARMLESS:
        return done.returncode == 0 and kind == 'new' and not rest, f'{done.returncode} {kind} {rest}'
    good = done.returncode == 1 and kind == 'old' and not rest and 'list.csv' in done.stderr
    return good, f'{done.returncode} {kind} {rest} {done.stderr.strip()}'


def check_kill(folder, call, when):
    done, trace = run(folder, f'{call}:signal=KILL:when={when}')
    kind, rest = state(folder)
    for name in rest:
        os.unlink(os.path.join(folder, name))
    hidden = all(name.startswith('.aimwell-') and name.endswith('.part') for name in rest)
    good = 'killed by SIGKILL' in trace and kind != 'damaged' and hidden
    return good, f'{done.returncode} {kind} {rest}'


def count_before_name(folder):
    """How often each call is made by a run without faults, counted from its start."""
    _, trace = run(folder, None)
    return {call: trace.count(f' {call}(') for call in ('write', 'fsync', 'close', 'rename')}


def plan(folder):
    """(name, function) of every check."""
    counts = count_before_name(folder)
    checks = []
    for call, code, times in FAULTS:
        if call == 'close':  # the last but one close is the file's, the last the folder's
            times = [counts['close'] - 1]
        for when in times:
            checks.append((f'{call} {when} fails with {code}', lambda c=call, e=code, w=when: check_error(folder, c, e, w)))
    for call in ('write', 'fsync', 'rename'):
        for when in range(1, counts[call] + 1):
            checks.append((f'killed at {call} {when}', lambda c=call, w=when: check_kill(folder, c, w)))
    return checks


def main():
    if not shutil.which('strace'):
        print('1..1\nok 1 - faults while a file is written # SKIP strace is not installed')
        return 0
    root = tempfile.mkdtemp()
    folder = os.path.join(root, 'out')
    os.mkdir(folder)
    probe, trace = run(folder, None)
    if probe.returncode != 0 or 'exited with 0' not in trace:
        print(f'1..1\nok 1 - faults while a file is written # SKIP strace does not work here: {probe.stderr.strip()[:80]}')
        return 0
    checks, failed = plan(folder), 0
    print(f'1..{len(checks)}')
    for i, (name, check) in enumerate(checks, 1):
        good, told = check()
        failed += not good
        print(f"{'ok' if good else 'not ok'} {i} - {name}" + ('' if good else f': {told}'))
    shutil.rmtree(root)
    return 1 if failed else 0


if __name__ == '__main__':
    sys.exit(main())

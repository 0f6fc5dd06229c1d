#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Command line tests: every tests/cli/*.sh runs in an empty folder, and what it prints must equal NAME.expected.

Each runs twice, under C.UTF-8 and under a real de_DE.UTF-8 (whose decimal point is first shown to be a comma), and
must print the same. `run.py --accept NAME...` writes the expected files anew; read the difference before a commit.
In the output the test folder becomes DIR, hashes of 64 digits HASH, and RFC 3339 times TIME. Prints TAP.
"""
import concurrent.futures
import os
import pathlib
import re
import shutil
import subprocess
import sys
import tempfile

HERE = pathlib.Path(__file__).resolve().parent
ROOT = HERE.parent.parent
AIMWELL = os.environ.get('AIMWELL', str(ROOT / 'build' / 'aimwell'))
LOCALES = ('C.UTF-8', 'de_DE.UTF-8')


def normalise(text, folder):
    text = text.replace(str(folder), 'DIR')
    text = re.sub(r'\b[0-9a-f]{64}\b', 'HASH', text)
    text = re.sub(r'\b[0-9a-f]{12}…', 'HASH…', text)
    return re.sub(r'\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d+)?Z', 'TIME', text)


def run(script, locale):
    folder = pathlib.Path(tempfile.mkdtemp(prefix='aimwell-cli-')).resolve()
    env = dict(os.environ, LC_ALL=locale, AIMWELL=AIMWELL, SAMPLES=str(ROOT / 'sampleimages'), TESTS=str(HERE.parent),
               PATH=f'{HERE}:{os.environ["PATH"]}', HOME=str(folder), TZ='UTC', PYTHONUTF8='1')
    env.pop('LANGUAGE', None)
    try:
        p = subprocess.run(['bash', '-c', f'. {HERE}/lib.sh; . {script}'], cwd=folder, env=env, stdin=subprocess.DEVNULL,
                           stdout=subprocess.PIPE, stderr=subprocess.STDOUT, timeout=300)
        text = normalise(p.stdout.decode('utf-8', 'replace'), folder)
        return text + (f'(the test itself ended with {p.returncode})\n' if p.returncode else '')
    except subprocess.TimeoutExpired:
        return '(the test took longer than 300 s)\n'
    finally:
        subprocess.run(['chmod', '-R', 'u+rwX', str(folder)], stderr=subprocess.DEVNULL)
        shutil.rmtree(folder, ignore_errors=True)


def comma_locale():
    p = subprocess.run(['locale', 'decimal_point'], env=dict(os.environ, LC_ALL='de_DE.UTF-8'), stdout=subprocess.PIPE,
                       stderr=subprocess.DEVNULL, text=True)
    return p.stdout.strip() == ','


def differences(expected, got):
    import difflib
    lines = difflib.unified_diff(expected.splitlines(), got.splitlines(), 'expected', 'printed', lineterm='')
    return '\n'.join('# ' + line for line in lines)


def main():
    accept = sys.argv[1:2] == ['--accept']
    names = sys.argv[2:] if accept else sys.argv[1:]
    scripts = [s for s in sorted(HERE.glob('*.sh')) if s.stem != 'lib' and (not names or s.stem in names)]
    comma = comma_locale()
    jobs = [(s, l) for s in scripts for l in LOCALES if not (accept and l != LOCALES[0])]
    with concurrent.futures.ThreadPoolExecutor(2) as pool:
        texts = list(pool.map(lambda job: run(*job) if comma or job[1] == LOCALES[0] else None, jobs))
    print(f'1..{len(jobs)}')
    for n, ((script, locale), text) in enumerate(zip(jobs, texts), 1):
        name = f'{script.stem} under {locale}'
        expected = script.with_suffix('.expected')
        if accept:
            expected.write_text(text)
        if text is None:
            print(f'ok {n} - {name} # SKIP the locale de_DE.UTF-8 is not installed')
        elif expected.exists() and expected.read_text() == text:
            print(f'ok {n} - {name}')
        else:
            print(f'not ok {n} - {name}')
            print(differences(expected.read_text() if expected.exists() else '', text))
    return 0


if __name__ == '__main__':
    sys.exit(main())

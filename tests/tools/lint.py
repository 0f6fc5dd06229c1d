#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Holds the tree to its own rules: layers by includes, library surfaces, file and function sizes, first lines, words.

Prints one line per fault ('file:line: rule') and exits 1 when there is any. The rules are DEVELOPERS.md's.
"""
import os
import re
import subprocess
import sys

LAYERS = ['base', 'image', 'geometry', 'nuclei', 'beam', 'plan', 'audit', 'record', 'steps']
APP = {'figures': set(LAYERS), 'view': set(LAYERS) | {'figures'},
       'cli': set(LAYERS) | {'figures', 'view'}, 'viewer': set(LAYERS) | {'figures', 'view'}}
# A library surface and the only files that may include it.
SURFACES = [(r'tiffio?\.h', r'core/image/tiff\w*\.[ch]'), (r'png\.h', r'core/image/png\w*\.[ch]'),
            (r'sqlite3\.h', r'core/record/'), (r'gtk/|gdk/', r'app/viewer/|tests/viewer/'),
            (r'cairo|pango', r'app/|tests/')]
MAX_SOURCE, MAX_HEADER, MAX_FUNCTION, MAX_PARAMETERS = 500, 260, 80, 7
faults = []


def fault(path, line, text):
    faults.append(f'{path}:{line}: {text}')


def tracked():
    out = subprocess.run(['git', 'ls-files', '-co', '--exclude-standard', 'core', 'app', 'tests', 'sampleimages'],
                         stdout=subprocess.PIPE, check=True, text=True).stdout
    return [p for p in out.split('\n') if p.endswith(('.c', '.h')) and os.path.exists(p)]


def allowed_rooms(path):
    part = path.split('/')
    if part[0] == 'core':
        return set(LAYERS[:LAYERS.index(part[1]) + 1])
    if part[0] == 'app' and part[1] in APP:
        return APP[part[1]] | {part[1]}
    return None


def check_includes(path, lines):
    rooms = allowed_rooms(path)
    for n, line in enumerate(lines, 1):
        m = re.match(r'\s*#\s*include\s*([<"])([^>"]+)', line)
        if not m:
            continue
        room = m.group(2).split('/')[0]
        if m.group(1) == '"' and rooms is not None and room not in rooms:
            fault(path, n, f'layer: {"/".join(path.split("/")[:2])} may not use {m.group(2)}')
        for what, where in SURFACES:
            if m.group(1) == '<' and re.match(what, m.group(2)) and not re.match(where, path):
                fault(path, n, f'surface: <{m.group(2)}> belongs to {where}')


def check_text(path, lines):
    if 'SPDX-License-Identifier: GPL-3.0-or-later' not in lines[0]:
        fault(path, 1, 'first line without the licence identifier')
    limit = MAX_HEADER if path.endswith('.h') else MAX_SOURCE
    if len(lines) > limit:
        fault(path, limit, f'{len(lines)} lines, limit {limit}')
    if path.startswith('core/') or path.startswith(('app/figures', 'app/view/')):
        for n, line in enumerate(lines, 1):
            if re.search(r'\b(printf|puts|putchar|perror|g_print|g_printerr|g_warning|g_message|exit|abort)\s*\(', line):
                fault(path, n, 'prints or ends the process below app/')


def check_numbers(path, lines):
    """printf writes decimal commas under some locales; numbers go through base/text.h."""
    for n, line in enumerate(lines, 1):
        if path.startswith(('core/', 'app/')) and 'g_ascii' not in line and not re.match(r'\s*(/\*|\*)', line) and re.search(r'%[-+ 0-9.*]*l?[eEfFgG](?![a-zA-Z])[^%]*"', line):
            fault(path, n, 'formats a number by printf, which depends on the locale')


def functions(path, lines):
    """Yields (first line, name, length, parameters): definitions whose body opens with '{' in column 0."""
    for n, line in enumerate(lines):
        if line.rstrip() != '{' or n == 0:
            continue
        start = n - 1
        while start > 0 and lines[start].strip() and lines[start][0] in ' \t':
            start -= 1
        head = ' '.join(x.strip() for x in lines[start:n])
        m = re.search(r'(\w+)\((.*)\)$', head)
        if not m or head.startswith(('struct', 'typedef', 'enum')):
            continue
        end = next((k for k in range(n, len(lines)) if lines[k].startswith('}')), len(lines) - 1)
        depth, count = 0, 1
        for ch in m.group(2):
            depth += ch == '('
            depth -= ch == ')'
            count += ch == ',' and depth == 0
        yield start + 1, m.group(1), end - n - 1, 0 if m.group(2).strip() in ('', 'void') else count


def check_functions(paths):
    sizes = []
    for path, lines in paths:
        for line, name, length, n_par in functions(path, lines):
            if path.startswith(('core', 'app')):
                sizes.append(length)
            if length > MAX_FUNCTION:
                fault(path, line, f'function {name}: {length} lines, limit {MAX_FUNCTION}')
            if n_par > MAX_PARAMETERS:
                fault(path, line, f'function {name}: {n_par} parameters, limit {MAX_PARAMETERS}')
    sizes.sort()
    if sizes:
        median, p90 = sizes[len(sizes) // 2], sizes[int(len(sizes) * 0.9)]
        print(f'{len(sizes)} functions: median {median} lines, 90 % within {p90}, longest {sizes[-1]}')
        if median > 15 or p90 > 45:
            fault('core', 0, f'function sizes: median {median} (limit 15), 90 % within {p90} (limit 45)')


def main():
    paths = []
    for path in tracked():
        with open(path, encoding='utf-8') as f:
            lines = f.read().split('\n')
        if lines and lines[-1] == '':
            lines.pop()
        paths.append((path, lines))
        check_includes(path, lines)
        check_text(path, lines)
        check_numbers(path, lines)
    check_functions(paths)
    print('\n'.join(faults) if faults else f'{len(paths)} sources keep the rules')
    return 1 if faults else 0


if __name__ == '__main__':
    sys.exit(main())

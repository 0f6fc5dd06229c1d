#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Fits the tables of the segmentation (docs/methods-segmentation.md) on images with known labels.

fit_segment.py DIR [--fold K]: DIR holds NAME.tif and NAME.labels.tif. Writes core/nuclei/segment_tables.h and builds anew
after every table, because each stage is fitted on what the one before it gives. With --fold K (0 to 4) the images of that
fold are left out, so that the tables can be judged on them. Run from the top of the tree; takes some minutes.
"""
import argparse
import glob
import os
import subprocess
import zlib

import numpy as np
from scipy.optimize import minimize

OUT = 'core/nuclei/segment_tables.h'
DUMP = 'build/reference/dump_segment'
tables = {}


def basis(x, mean, scale):
    z = np.clip((x - mean) * scale, -3, 3)
    n = z.shape[1]
    pairs = [0.5 * z[:, i] * z[:, j] for i in range(n) for j in range(i, n)]
    return np.stack([np.ones(len(z)), *z.T, *pairs], 1)


def logistic(a, y, w, ridge):
    def loss(b):
        z = a @ b
        g = a.T @ (w * (1 / (1 + np.exp(-z)) - y))
        g[1:] += ridge * b[1:]
        return (w * (np.logaddexp(0, z) - y * z)).sum() + ridge / 2 * (b[1:] ** 2).sum(), g
    return minimize(loss, np.zeros(a.shape[1]), jac=True, method='L-BFGS-B', options={'maxiter': 300}).x


def level(a, t, w, width):
    """Least squares with large residuals damped, then the soft count of outlines off by 27 % of the area."""
    b, damped = np.zeros(a.shape[1]), w
    ridge = 10 * np.diag([0] + [1] * (a.shape[1] - 1))
    for _ in range(5):
        b = np.linalg.solve(a.T @ (a * damped[:, None]) + ridge, a.T @ (t * damped))
        damped = w / np.maximum(1, abs(t - a @ b) / 0.1)

    def loss(b):
        r = a @ b - t
        size = np.sqrt(r * r + 1e-6)
        s = 1 / (1 + np.exp((0.27 - 2 * size * width) / 0.08))
        g = a.T @ (w * s * (1 - s) / 0.08 * 2 * width * r / size)
        return (w * s).sum() + 50 * (b[1:] ** 2).sum(), g + 100 * np.r_[0, b[1:]]
    return minimize(loss, b, jac=True, method='L-BFGS-B').x


def dump(names, kind, enlarge=1):
    rows, group = [], []
    for name in names:
        out = subprocess.run([DUMP, kind, name + '.tif', name + '.labels.tif', str(enlarge)], check=True,
                             stdout=subprocess.PIPE, text=True).stdout.splitlines()
        rows += [[float(v) for v in line.split()] for line in out]
        group += [os.path.basename(name).split('-')[0]] * len(out)
    return np.array(rows), np.array(group)


def even(group):
    """Weights that let a group count with the square root of its size."""
    names, index, count = np.unique(group, return_inverse=True, return_counts=True)
    w = 1 / np.sqrt(count[index])
    return w / w.mean()


def write():
    text = ['/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */', '#ifndef AW_NUCLEI_SEGMENT_TABLES_H',
            '#define AW_NUCLEI_SEGMENT_TABLES_H', '', '/* Written by tests/reference/fit_segment.py; do not edit. */', '']
    for name, parts in tables.items():
        for part, values in zip(('mean', 'scale', 'weight'), parts):
            text.append('static const double %s_%s[] = { %s };' % (name, part, ', '.join('%.5g' % v for v in values)))
        text.append('')
    with open(OUT, 'w') as f:
        f.write('\n'.join(text + ['#endif', '']))
    subprocess.run(['clang-format', '-i', OUT], check=False)
    subprocess.run(['make', '-s', '-j2', DUMP], check=True)


def set_table(name, x, fit):
    mean, scale = x.mean(0), 1 / (x.std(0) + 1e-9)
    tables[name] = (mean, scale, fit(basis(x, mean, scale)))


def fit_pairs(data, group):
    x = np.clip(data[:, 1:], -20, 20)
    w = np.minimum(np.exp(x[:, 8]), 1) ** 0.5 * np.where(group == 'm520', 1, 1.5)
    set_table('pair', x, lambda a: logistic(a, data[:, 0], w, 10))


def read_tables():
    body = open(OUT).read().split('static const double ')[1:]
    flat = {b.split('[')[0]: [float(v) for v in b.split('{')[1].split('}')[0].split(',')] for b in body}
    for name in ('pair', 'outline', 'object'):
        tables[name] = tuple(np.array(flat[f'{name}_{part}']) for part in ('mean', 'scale', 'weight'))


def main():
    ap = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    ap.add_argument('folder')
    ap.add_argument('--fold', type=int, default=-1)
    a = ap.parse_args()
    names = [p[:-len('.labels.tif')] for p in sorted(glob.glob(os.path.join(a.folder, '*.labels.tif')))]
    names = [n for n in names if zlib.crc32(os.path.basename(n).encode()) % 5 != a.fold]
    read_tables()
    write()
    taught = [dump(names, 'taught', k) for k in (1, 2)]
    for own in (False, True):
        parts = taught + ([dump(names, 'pairs')] if own else [])
        fit_pairs(np.concatenate([p[0] for p in parts]), np.concatenate([p[1] for p in parts]))
        write()
    data, group = dump(names, 'outline')
    w = even(group) * np.where(group == 'x256', 2, 1)
    target = np.clip(data[:, 0], -0.1, 0.9)
    set_table('outline', data[:, 1:], lambda b: level(b, target, w, np.exp(data[:, 2])))
    write()
    data, group = dump(names, 'objects')
    set_table('object', data[:, 1:], lambda b: logistic(b, data[:, 0], even(group), 30))
    write()


if __name__ == '__main__':
    main()

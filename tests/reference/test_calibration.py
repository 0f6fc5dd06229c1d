#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Calibration against SciPy: each likelihood is written here once more and maximised by scipy.optimize."""
import csv
import json
import math
import os
import pathlib
import re
import subprocess
import tempfile

import numpy as np
from scipy import optimize, stats

ROOT = pathlib.Path(__file__).resolve().parents[2]
AIMWELL = os.environ.get('AIMWELL', str(ROOT / 'build' / 'aimwell'))
SAMPLE = ROOT / 'sampleimages'
CAL = SAMPLE / 'calibration'
results = []


def ok(good, name):
    results.append(bool(good))
    print(f"{'ok' if good else 'not ok'} {len(results)} - {name}", flush=True)


def table(path):
    with open(path) as f:
        return list(csv.DictReader(f))


def column(rows, name):
    return np.array([float(r[name]) for r in rows])


def calibrate(folder, *words):
    dish = folder / 'dish.dish'
    if not dish.exists():
        subprocess.run([AIMWELL, 'start', dish, '--scan', SAMPLE / 'scan.csv'], check=True, capture_output=True)
    subprocess.run([AIMWELL, 'calibrate', dish, *words], check=True, capture_output=True)
    shown = json.loads(subprocess.run([AIMWELL, 'calibrate', dish, '--show', '--json'], check=True,
                                      capture_output=True, text=True).stdout)
    newest = [c for c in shown['calibrations'] if c['kind'].startswith(words[0])][-1]
    return {k: float(v) for k, v in re.findall(r'^([a-z0-9-]+)=([-+.0-9e]+)$', newest['numbers'], re.M)}


def close(a, b, tolerance=1e-4):
    return abs(a - b) <= tolerance * max(1, abs(b))


def edge(folder, path, axis):
    got = calibrate(folder, 'edge', path, '--axis', axis)
    rows = table(path)
    x, full, degraded = column(rows, 'position_um'), column(rows, 'n_full'), column(rows, 'n_degraded')
    x0 = x.mean()

    def negative(p):
        u = (x - x0 - p[0]) / math.exp(p[1])
        return -np.sum(full * stats.norm.logcdf(u) + degraded * stats.norm.logsf(u))

    start = optimize.minimize(negative, [0, 0], method='Nelder-Mead', options={'xatol': 1e-10, 'fatol': 1e-12})
    fit = optimize.minimize(negative, start.x, method='BFGS', options={'gtol': 1e-9})
    ok(abs(got['centre-um'] - x0 - fit.x[0]) < 1e-4, f'edge {axis}: the centre is that of the largest likelihood (SciPy)')
    ok(close(got['sigma-um'], math.exp(fit.x[1])), f'edge {axis}: so is sigma, 1e-4')
    h = 1e-4
    second = [[(negative(fit.x + h * (np.eye(2)[i] + np.eye(2)[j])) - negative(fit.x + h * (np.eye(2)[i] - np.eye(2)[j]))
                - negative(fit.x - h * (np.eye(2)[i] - np.eye(2)[j])) + negative(fit.x - h * (np.eye(2)[i] + np.eye(2)[j])))
               / (4 * h * h) for j in range(2)] for i in range(2)]
    se = math.sqrt(np.linalg.inv(second)[0, 0])
    ok(abs(got['centre-se-um'] / se - 1) < 0.1, f'edge {axis}: its error is near that of the observed information')


def bead(folder, path):
    got = calibrate(folder, 'bead', path, '--crosshair', '52012,31408')
    rows = table(path)
    x, y = column(rows, 'x_um'), column(rows, 'y_um')
    full, degraded = column(rows, 'n_full'), column(rows, 'n_degraded')
    mx, my = x.mean(), y.mean()

    def negative(p):
        bump = np.exp(-((x - mx - p[0]) ** 2 + (y - my - p[1]) ** 2) / (2 * math.exp(2 * p[2])))
        low, high = np.sin(p[3]) ** 2, np.sin(p[4]) ** 2
        f = np.clip(low + (high - low) * bump, 1e-12, 1 - 1e-12)
        return -np.sum(degraded * np.log(f) + full * np.log1p(-f))

    p = np.array([0, 0, math.log(2), 0.1, 1.3])
    for _ in range(4):
        p = optimize.minimize(negative, p, method='Nelder-Mead',
                              options={'xatol': 1e-9, 'fatol': 1e-11, 'maxiter': 20000, 'maxfev': 20000}).x
    ok(abs(got['centre-x-um'] - mx - p[0]) < 1e-4 and abs(got['centre-y-um'] - my - p[1]) < 1e-4,
       'bead: the centre is that of the largest likelihood (SciPy), 1e-4')
    ok(close(got['sigma-x-um'], math.exp(p[2])), 'bead: so is sigma')


def pixel(folder):
    got = calibrate(folder, 'pixel', CAL / 'pixel.csv')
    rows = table(CAL / 'pixel.csv')
    p = np.column_stack([column(rows, 'x_px'), column(rows, 'y_px'), np.ones(len(rows))])
    s = np.column_stack([column(rows, 'stage_x_um'), column(rows, 'stage_y_um')])
    a, rss, _, _ = np.linalg.lstsq(p, s, rcond=None)
    mine = np.array([[got['a-xx'], got['a-xy']], [got['a-yx'], got['a-yy']]])
    ok(np.allclose(mine, a[:2].T, atol=1e-9), 'pixel map: NumPy least squares gives the same matrix')
    covariance = rss.sum() / (2 * len(rows) - 6) * np.linalg.inv(p.T @ p)[:2, :2]
    ok(np.allclose([got['covariance-xx'], got['covariance-xy'], got['covariance-yy']],
                   [covariance[0, 0], covariance[0, 1], covariance[1, 1]], rtol=1e-6), 'pixel map: and the same covariance')


def truth(folder):
    t = {r['quantity']: float(r['value']) for r in table(CAL / 'truth.csv')}
    e = calibrate(folder, 'edge', CAL / 'edge-x.csv', '--axis', 'x', '--crosshair', '50120')
    ok(abs(e['offset-um'] - t['offset_x']) < 3 * e['centre-se-um'], 'sample: the edge gives the true offset, 3 sigma')
    ok(abs(e['sigma-um'] - t['beam_sigma_x']) < 3 * e['sigma-se-um'], 'sample: and the true width, 3 sigma')
    b = calibrate(folder, 'bead', CAL / 'bead.csv', '--crosshair', '52012,31408')
    ok(math.hypot(b['x-um'] - t['offset_x'], b['y-um'] - t['offset_y']) < 0.15, 'sample: so does the bead, 0.15 um')
    m = calibrate(folder, 'pixel', CAL / 'pixel.csv')
    scale, turn = t['pixel_map_scale'], t['pixel_map_rotation']
    ok(abs(m['a-xx'] - scale * math.cos(turn)) < 3e-4 and abs(m['a-yx'] - scale * math.sin(turn)) < 3e-4,
       'sample: the pixel map is the true one, 0.05 %')


def main():
    with tempfile.TemporaryDirectory() as d:
        folder = pathlib.Path(d)
        for axis in 'xy':
            edge(folder, CAL / f'edge-{axis}.csv', axis)
        bead(folder, CAL / 'bead.csv')
        pixel(folder)
        truth(folder)
    print(f'1..{len(results)}')


main()

#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""The sample dish from frames to nuclei against its drawn truth (sampleimages/truth.csv, truth_views.csv).

Every true nucleus that is whole in some frame and stands free must be found exactly once, centroids within 0.5 px and scan
coordinates within 0.3 um rms per axis; the pixel map within its own residual. Nothing may depend on the number of threads.
"""
import csv
import os
import re
import subprocess
import sys
import tempfile

import numpy as np
from scipy.spatial import cKDTree

BIN = os.environ.get('BIN', 'build')
SAMPLE = sys.argv[1] if len(sys.argv) > 1 else 'sampleimages'
PIXEL_UM = 0.6506
TURN_DEG = 2.4


def run(threads):
    return subprocess.run([os.path.join(BIN, 'reference', 'segment_scan'), os.path.join(SAMPLE, 'scan.csv'), str(threads)],
                          check=True, stdout=subprocess.PIPE, text=True).stdout


def table(text):
    rows = list(csv.DictReader([line for line in text.splitlines() if not line.startswith('#')]))
    return rows, np.array([[float(r['x_um']), float(r['y_um'])] for r in rows])


def read(name):
    with open(os.path.join(SAMPLE, name), newline='', encoding='utf-8') as f:
        return [r for r in csv.DictReader(line for line in f if not line.startswith('#'))]


def refusal(change):
    """What is said of the scan after `change` was made to every row of its table."""
    rows = read('scan.csv')
    for r in rows:
        change(r)
        r['file'] = os.path.abspath(os.path.join(SAMPLE, r['file']))
    with tempfile.TemporaryDirectory() as folder:
        path = os.path.join(folder, 'scan.csv')
        with open(path, 'w', newline='', encoding='utf-8') as f:
            table_out = csv.DictWriter(f, list(rows[0]))
            table_out.writeheader()
            table_out.writerows(rows)
        out = subprocess.run([os.path.join(BIN, 'reference', 'segment_scan'), path], stdout=subprocess.PIPE,
                             stderr=subprocess.PIPE, text=True)
    return out.stderr.strip() if out.returncode else 'accepted'


class Tap:
    def __init__(self):
        self.n = 0

    def check(self, good, name):
        self.n += 1
        print(f'{"ok" if good else "not ok"} {self.n} - {name}', flush=True)


def main():
    print('1..10')
    tap = Tap()
    text = run(2)
    found, at = table(text)
    notes = [line for line in text.splitlines() if line.startswith('#')]
    pixel = float(re.search(r'pixel ([\d.]+) um', notes[0]).group(1))
    turn = float(re.search(r'turned by ([-\d.]+) degrees', notes[0]).group(1))
    tap.check(abs(pixel / PIXEL_UM - 1) < 5e-4 and abs(turn - TURN_DEG) < 0.05,
              f'the map is fitted: pixel {pixel} um, {turn} degrees (true {PIXEL_UM}, {TURN_DEG})')
    truth = read('truth.csv')
    frames = {r['file']: i for i, r in enumerate(read('scan.csv'))}
    views = {(int(r['id']), frames[r['file']]): (float(r['x_px']), float(r['y_px'])) for r in read('truth_views.csv')}
    nuclei = [t for t in truth if t['kind'] in ('interphase', 'mitotic')]
    wanted = [t for t in nuclei if int(t['n_whole']) > 0 and t['separate'] == '1']
    tree = cKDTree(at)
    missed, twice, scan_error, pixel_error = [], [], [], []
    for t in wanted:
        q = np.array([float(t['x_um']), float(t['y_um'])])
        near = tree.query_ball_point(q, float(t['minor_um']) / 2)
        if len(near) != 1:
            (missed if not near else twice).append(t['id'])
            continue
        row = found[near[0]]
        scan_error.append(at[near[0]] - q)
        view = views[int(t['id']), int(row['frame'])]
        pixel_error.append((float(row['x_px']) - view[0], float(row['y_px']) - view[1]))
    tap.check(not missed, f'no whole, separate nucleus of {len(wanted)} is missed: {missed}')
    tap.check(not twice, f'none is found twice: {twice}')
    rms_px = np.sqrt(np.mean(np.square(pixel_error), 0))
    rms_um = np.sqrt(np.mean(np.square(scan_error), 0))
    tap.check((rms_px <= 0.5).all(), f'centroids within 0.5 px rms per axis: x {rms_px[0]:.3f}, y {rms_px[1]:.3f}')
    tap.check((rms_um <= 0.3).all(), f'scan coordinates within 0.3 um rms per axis: x {rms_um[0]:.3f}, y {rms_um[1]:.3f}')
    # No two kept nuclei may be views of one: nearer than a quarter of a diameter.
    d = tree.query(at, k=2)[0][:, 1]
    size = np.array([float(r['diameter_um']) for r in found])
    tap.check((d > size / 4).all(), f'no two kept nuclei are one: nearest {np.min(d / size):.2f} diameters apart')
    # A nucleus whole in some frame does not keep a cut view.
    whole = cKDTree([[float(t['x_um']), float(t['y_um'])] for t in wanted])
    border = [i for i, r in enumerate(found) if 'border' in r['flags']]
    wrong = [found[i]['number'] for i in border if whole.query(at[i])[0] < 1.5]
    tap.check(not wrong, f'{len(border)} border nuclei, none of them whole in another frame: {wrong}')
    tap.check(run(1).replace('\n', '').split('number,')[1] == text.replace('\n', '').split('number,')[1],
              'the same nuclei with one thread as with two')
    for name, change, part in (('mirrored x readings', lambda r: r.update(stage_x_um=str(80000 - float(r['stage_x_um']))),
                                'the x readings of the stage run the other way'),
                               ('half the pixel size', lambda r: r.update(pixel_um='0.325'), '(2.00 times')):
        message = refusal(change)
        tap.check('contradict the assumed pixel map' in message and part in message, f'refused, {name}: {message}')
    true = cKDTree([[float(t['x_um']), float(t['y_um'])] for t in nuclei])
    lone = sum(1 for i, q in enumerate(at) if true.query(q)[0] > size[i] / 2)
    print(f'# {len(found)} nuclei found, {len(nuclei)} true; {lone} found ones lie on no true nucleus')
    for line in notes:
        print(line)
    return 0


if __name__ == '__main__':
    sys.exit(main())

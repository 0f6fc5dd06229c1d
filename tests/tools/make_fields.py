#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Fields of the sample dish as if imaged again on a beam stage, with known truth; for tests/cli/calibrate_fields.sh.

    make_fields.py SAMPLES FOLDER [--others]

Each field is a plain ground onto which nuclei of the sample's frames are pasted, cut from the frame where the truth says
that they are whole: half of them are left out, the others moved by 3 um rms per axis. The dish lies turned by 12.3
degrees, 0.4 % larger, shifted; the camera's y axis runs against the stage's. Writes FOLDER/fields.csv and field-N.tif.
--others puts the nuclei at random places instead: a dish that is not the sample.
"""
import csv
import math
import os
import sys

import numpy as np
import tifffile

PIXEL_UM, SIDE, PATCH, MOVEMENT_UM = 0.65, 640, 16, 3.0
ANGLE, SCALE, SHIFT = math.radians(12.3), 1.004, (5000.0, -2000.0)
FIELDS = [(40760, 28240), (41740, 28300), (41300, 28800), (40800, 29240)]


def beam(q):
    c, s = SCALE * math.cos(ANGLE), SCALE * math.sin(ANGLE)
    return c * q[0] - s * q[1] + SHIFT[0], s * q[0] + c * q[1] + SHIFT[1]


def read(path):
    with open(path, newline='') as f:
        return list(csv.DictReader(line for line in f if not line.startswith('#')))


def patches(samples):
    """Scan position and pixels of every whole nucleus."""
    frames = [tifffile.imread(os.path.join(samples, r['file'])).astype(float) for r in read(samples + '/scan.csv')]
    place = {r['id']: (float(r['x_um']), float(r['y_um'])) for r in read(samples + '/truth.csv')}
    ground, out = float(np.median(frames[0])), {}
    for v in read(samples + '/truth_views.csv'):
        x, y = round(float(v['x_px'])), round(float(v['y_px']))
        image = frames[int(digits(v['file'])) - 1]
        if v['id'] in place and v['whole'] == '1' and PATCH <= x < 1024 - PATCH and PATCH <= y < 1024 - PATCH:
            out.setdefault(v['id'], (place[v['id']], image[y - PATCH:y + PATCH + 1, x - PATCH:x + PATCH + 1] - ground))
    return ground, list(out.values())


def digits(text):
    return ''.join(ch for ch in text if ch.isdigit())


def main():
    samples, folder = sys.argv[1:3]
    rng = np.random.default_rng(5)
    ground, nuclei = patches(samples)
    kept = [n for n in nuclei if rng.random() < 0.5]
    v, u = np.mgrid[-PATCH:PATCH + 1, -PATCH:PATCH + 1]
    soft = np.clip((PATCH - np.hypot(u, v)) / 4, 0, 1)
    rows, centre = [], (SIDE - 1) / 2
    for k, field in enumerate(FIELDS):
        image, stage = np.zeros((SIDE, SIDE)), beam(field)
        for q, patch in kept:
            if max(abs(q[0] - field[0]), abs(q[1] - field[1])) > 0.75 * SIDE * PIXEL_UM:
                continue
            b = np.array(beam(q)) + rng.normal(0, MOVEMENT_UM, 2)
            if '--others' in sys.argv:
                b = np.array(stage) + rng.uniform(-0.5, 0.5, 2) * SIDE * PIXEL_UM
            x = round(centre + (stage[0] - b[0]) / PIXEL_UM)
            y = round(centre - (stage[1] - b[1]) / PIXEL_UM)
            if PATCH <= x < SIDE - PATCH and PATCH <= y < SIDE - PATCH:
                at = np.s_[y - PATCH:y + PATCH + 1, x - PATCH:x + PATCH + 1]
                image[at] = np.maximum(image[at], patch * soft)
        image = np.clip(image + ground + rng.normal(0, 12, image.shape), 0, 65535)
        tifffile.imwrite(f'{folder}/field-{k + 1}.tif', image.astype(np.uint16))
        rows.append(f'field-{k + 1}.tif,{stage[0]:.2f},{stage[1]:.2f},{PIXEL_UM},2026-05-04T11:12:2{k}Z')
    with open(f'{folder}/fields.csv', 'w') as f:
        f.write('file,stage_x_um,stage_y_um,pixel_um,taken_at\n' + '\n'.join(rows) + '\n')


if __name__ == '__main__':
    main()

#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Compares a table of nuclei with the truth of the sample dish.

    truth_score.py FOUND.csv [--truth sampleimages/truth.csv] [--views sampleimages/truth_views.csv]

FOUND.csv has x_um and y_um (scan coordinate of each nucleus); '#' lines before the header are skipped. A true nucleus
(interphase or mitotic) that is separate and whole in some frame counts as found once when exactly one found centroid
lies inside the ellipse of its second moments, doubled when more do, missed when none does. `stray` are found centroids
inside no true object at all. Rms errors are per axis over the nuclei found once.

When FOUND.csv also has `file` (or `frame`, counted from 1), x_px and y_px, the centroids are compared in the pixels of
that frame as well, where the truth says that the nucleus is whole. Prints one line of JSON; other tests import score().
"""
import argparse
import csv
import json
import math
import os
import re

HERE = os.path.dirname(os.path.abspath(__file__))
SAMPLE = os.path.join(HERE, '..', '..', 'sampleimages')


def read(path):
    with open(path, newline='', encoding='utf-8-sig') as f:
        return list(csv.DictReader(line for line in f if not line.startswith('#')))


def inside(truth, x, y, grow=1.0):
    """Whether (x, y) um lies in the true ellipse; plates are so thin that 1.5 um are always allowed."""
    dx, dy = x - float(truth['x_um']), y - float(truth['y_um'])
    c, s = math.cos(float(truth['angle_rad'])), math.sin(float(truth['angle_rad']))
    a, b = (max(grow * float(truth[k]) / 2, 1.5) for k in ('major_um', 'minor_um'))
    return ((dx * c + dy * s) / a) ** 2 + ((dy * c - dx * s) / b) ** 2 <= 1


class Near:
    """Found points by 40 um cells."""

    def __init__(self, rows):
        self.cells = {}
        for r in rows:
            x, y = float(r['x_um']), float(r['y_um'])
            self.cells.setdefault((int(x // 40), int(y // 40)), []).append((x, y, r))

    def within(self, truth):
        cx, cy = int(float(truth['x_um']) // 40), int(float(truth['y_um']) // 40)
        return [p for i in (-1, 0, 1) for j in (-1, 0, 1) for p in self.cells.get((cx + i, cy + j), ())
                if inside(truth, p[0], p[1])]


def rms(values):
    return math.sqrt(sum(v * v for v in values) / len(values)) if values else float('nan')


def frame_number(row):
    text = row.get('file') or row.get('frame') or ''
    digits = re.findall(r'\d+', os.path.basename(text))
    return int(digits[-1]) if digits else None


def score(found, truths, views):
    nuclei = [t for t in truths if t['kind'] in ('interphase', 'mitotic')]
    wanted = [t for t in nuclei if t['separate'] == '1' and int(t['n_whole']) > 0]
    where = {(v['id'], frame_number(v)): v for v in views if v['whole'] == '1'}
    near = Near(found)
    missed, doubled, dx, dy, px, py = [], [], [], [], [], []
    for t in wanted:
        hits = near.within(t)
        if len(hits) != 1:
            (doubled if hits else missed).append(int(t['id']))
            continue
        x, y, row = hits[0]
        dx.append(x - float(t['x_um']))
        dy.append(y - float(t['y_um']))
        view = where.get((t['id'], frame_number(row)))
        if view and row.get('x_px') and row.get('y_px'):
            px.append(float(row['x_px']) - float(view['x_px']))
            py.append(float(row['y_px']) - float(view['y_px']))
    inside_any = {id(p[2]) for t in truths if t['kind'] != 'fibre' for p in near.within(t)}
    return {'wanted': len(wanted), 'once': len(dx), 'missed': missed, 'doubled': doubled,
            'rms_x_um': rms(dx), 'rms_y_um': rms(dy), 'n_px': len(px), 'rms_x_px': rms(px), 'rms_y_px': rms(py),
            'all_nuclei_found': sum(bool(near.within(t)) for t in nuclei), 'all_nuclei': len(nuclei),
            'stray': sum(id(r) not in inside_any for r in found), 'found': len(found)}


def main():
    ap = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    ap.add_argument('found')
    ap.add_argument('--truth', default=os.path.join(SAMPLE, 'truth.csv'))
    ap.add_argument('--views', default=os.path.join(SAMPLE, 'truth_views.csv'))
    a = ap.parse_args()
    print(json.dumps(score(read(a.found), read(a.truth), read(a.views))))


if __name__ == '__main__':
    main()

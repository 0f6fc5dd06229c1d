#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Segmentation against reference labels of open fluorescence images.

Source: 150 images of the 2018 Data Science Bowl's corrected stage-1 training set (Broad Bioimage Benchmark Collection
BBBC038; Caicedo et al., Nature Methods 16:1247, 2019), CC0, with the scoring script that comes with them. One parameter
set for all. The same images transposed, padded by mirroring, and mapped v -> 37 v + 500 must score alike. Confidence is
held against the scoring script's rule for a good aim point. Skipped by name where the data are absent.
"""
import csv
import importlib.util
import os
import pathlib
import subprocess
import sys
import tempfile

import numpy as np
import tifffile

sys.path.insert(0, str(pathlib.Path(__file__).resolve().parent.parent / 'tools'))
import results  # noqa: E402

AIMWELL = os.environ.get('AIMWELL', 'build/aimwell')
PAD = 7
SOURCE = 'BBBC038 stage 1, 150 images, scored as delivered'
F1 = {'m520': 0.865, 'm360': 0.862, 'x256': 0.745}
AIM = {'m520': 0.965, 'm360': 0.955, 'x256': 0.955}
FOUND = {'m520': 0.79, 'm360': 0.71, 'x256': 0.71}
ERR50 = {'m520': 0.5, 'm360': 0.6, 'x256': 0.5}

CHANGES = {
    'transposed': (lambda v: v.T, lambda l: l.T),
    'padded': (lambda v: np.pad(v, PAD, mode='symmetric'), lambda l: l[PAD:-PAD, PAD:-PAD]),
    'mapped': (lambda v: (37 * v.astype(np.uint32) + 500).astype(np.uint16), lambda l: l),
}


def load_scorer(folder):
    spec = importlib.util.spec_from_file_location('score_labels', folder.parent / 'score_labels.py')
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def segment(images, out, *options):
    subprocess.run([AIMWELL, 'segment', *map(str, images), '--labels', str(out), *options], check=True,
                   stdout=subprocess.DEVNULL)


def pooled(scorer, nuclei, labels, undo=lambda l: l):
    """Scores as the script does, per group."""
    groups = {}
    for ref_path in sorted(nuclei.glob('*.labels.tif')):
        name = ref_path.name[:-len('.labels.tif')]
        pred = undo(tifffile.imread(labels / f'{name}.tif'))
        out, err, aim, rec, merged, split = scorer.score(np.ascontiguousarray(pred), tifffile.imread(ref_path))
        g = groups.setdefault(name.split('-')[0], dict(f=np.zeros(3), aim=np.zeros(2), rec=np.zeros(2), err=[]))
        g['f'] += out[0.7]
        g['aim'] += aim
        g['rec'] += rec
        g['err'] += err
    return {k: dict(f1=2 * g['f'][0] / (2 * g['f'][0] + g['f'][1] + g['f'][2]), aim=g['aim'][0] / g['aim'][1],
                    found=g['rec'][0] / g['rec'][1], err50=float(np.percentile(g['err'], 50))) for k, g in groups.items()}


def good_targets(scorer, pred, ref):
    """The scoring script's rule, per predicted nucleus: alone in one reference nucleus that nobody else claims."""
    pred, ref = scorer.compact(pred), scorer.compact(ref)
    n, m = int(pred.max()), int(ref.max())
    inter = np.bincount(pred.ravel().astype(np.int64) * (m + 1) + ref.ravel(), minlength=(n + 1) * (m + 1))
    inter = inter.reshape(n + 1, m + 1)
    centre = np.rint(scorer.centroids(pred, n)[1:]).astype(int)
    home = ref[centre[:, 1], centre[:, 0]] if n else np.zeros(0, int)
    merged = (inter[1:, 1:] > 0.2 * np.bincount(ref.ravel(), minlength=m + 1)[None, 1:]).sum(1) > 1
    visits = np.bincount(home, minlength=m + 1)
    return (home > 0) & ~merged & (visits[home] == 1), ~scorer.on_border(pred, n)[1:]


def check_confidence(tap, scorer, nuclei, labels, table):
    confidence = {}
    with open(table, newline='') as f:
        for row in csv.DictReader(f):
            confidence.setdefault(pathlib.Path(row['image']).stem, []).append(float(row['confidence']))
    good, sure = [], []
    for name, values in confidence.items():
        g, inner = good_targets(scorer, tifffile.imread(labels / f'{name}.tif'), tifffile.imread(nuclei / f'{name}.labels.tif'))
        good.append(g[inner])
        sure.append(np.array(values)[inner] >= 0.9)
    good, sure = np.concatenate(good), np.concatenate(sure)
    tap.check('confidence 0.9 to 1: part that is good', good[sure].mean(), '>=', 0.95, SOURCE)
    tap.check('confidence 0.9 to 1: part of all nuclei', sure.mean(), '>=', 0.5, SOURCE)


def check_groups(tap, scorer, nuclei, work):
    images = [p for p in sorted(nuclei.glob('*.tif')) if '.labels.' not in p.name]
    segment(images, work / 'plain', '--table', str(work / 'plain.csv'))
    segment(images, work / 'gated', '--gated')
    plain, gated = pooled(scorer, nuclei, work / 'plain'), pooled(scorer, nuclei, work / 'gated')
    for g in F1:
        tap.check(f'F1 at IoU 0.7, {g}', plain[g]['f1'], '>=', F1[g], SOURCE)
    for g in F1:
        tap.check(f'gated: good aim points, {g}', gated[g]['aim'], '>=', AIM[g], SOURCE)
        tap.check(f'gated: nuclei found, {g}', gated[g]['found'], '>=', FOUND[g], SOURCE)
        tap.check(f'gated: median centroid error px, {g}', gated[g]['err50'], '<=', ERR50[g], SOURCE)
    check_confidence(tap, scorer, nuclei, work / 'plain', work / 'plain.csv')
    for change, (apply, undo) in CHANGES.items():
        folder = work / change
        folder.mkdir()
        for p in images:
            tifffile.imwrite(folder / p.name, np.ascontiguousarray(apply(tifffile.imread(p))))
        segment(sorted(folder.glob('*.tif')), work / (change + '-labels'))
        other = pooled(scorer, nuclei, work / (change + '-labels'), undo)
        for g in F1:
            tap.check(f'F1 changes when {change}, {g}', abs(other[g]['f1'] - plain[g]['f1']), '<=', 0.01, SOURCE)


def main():
    tap = results.Tap()
    folder = results.opendata()
    if not folder or not (folder / 'nuclei').is_dir() or not (folder.parent / 'score_labels.py').exists():
        tap.skip('segmentation against open data', 'AIMWELL_OPENDATA and its scoring script are absent')
    else:
        with tempfile.TemporaryDirectory() as work:
            check_groups(tap, load_scorer(folder), folder / 'nuclei', pathlib.Path(work))
    tap.end()


if __name__ == '__main__':
    main()

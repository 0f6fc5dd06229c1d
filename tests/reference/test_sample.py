#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""The sample dish: the generator reproduces it, and what its tables say is what its pixels show.

The pixels are read by python3-tifffile, and the geometry of sampleimages/README.md is computed here once more, so that
a mistake shared by Aimwell's reader, its pixel map and its renderer would show.
"""
import math
import os
import subprocess
import sys
import tempfile

import numpy as np
import tifffile
from scipy import ndimage

sys.path.insert(0, os.path.dirname(os.path.abspath(__file__)))
import truth_score  # noqa: E402

SAMPLE = truth_score.SAMPLE
GENERATE = os.path.join(os.environ.get('BIN', 'build'), 'generate-sample')
results = []


def ok(good, name):
    results.append(bool(good))
    print(f"{'ok' if good else 'not ok'} {len(results)} - {name}", flush=True)


def generate(*words):
    return subprocess.run([GENERATE, *words], capture_output=True, text=True)


def reproduced():
    run = generate('--check', SAMPLE)
    ok(run.returncode == 0, 'sample: drawn anew, every pixel and table row is the same' + ' ' + run.stderr.strip())
    run = generate('--check', '--threads', '1', SAMPLE)
    ok(run.returncode == 0, 'sample: the same on one thread')
    with tempfile.TemporaryDirectory() as d:
        os.mkdir(os.path.join(d, 'frames'))
        for k in range(1, 10):
            name = f'frames/nuclei-{k}.tif'
            pixels = tifffile.imread(os.path.join(SAMPLE, name))
            if k == 6:
                pixels[700, 31] += 1
            tifffile.imwrite(os.path.join(d, name), pixels)
        run = generate('--check', d)
        ok(run.returncode == 1 and 'nuclei-6.tif' in run.stderr and '(31, 700)' in run.stderr,
           'sample: one changed count is found and named')
    run = generate('--channel', 'marks', '/nowhere')
    ok(run.returncode == 1 and 'marks' in run.stderr, 'sample: an unknown channel is named')


def size_in_bytes():
    return sum(os.path.getsize(os.path.join(at, f)) for at, _, files in os.walk(SAMPLE) for f in files)


def frames(scan):
    images = {}
    good = True
    for row in scan:
        with tifffile.TiffFile(os.path.join(SAMPLE, row['file'])) as tiff:
            images[row['file']] = tiff.asarray()
            good &= tiff.pages[0].compression == tifffile.COMPRESSION.ADOBE_DEFLATE
    good &= all(a.shape == (1024, 1024) and a.dtype == np.uint16 and a.max() <= 4095 for a in images.values())
    ok(good and len(images) == 9, 'sample: nine Deflate frames of 1024 x 1024, 16 bits, counts up to 4095')
    ok(size_in_bytes() < 11e6, 'sample: under 11 MB, so that the folder stays under 20 MB')
    return images


def geometry(scan, truths, views):
    """p = c - A^-1 (q - S) with the readings: agrees with the views to the readings' error."""
    t = 0.0419
    a = 0.6506 * np.array([[math.cos(t), -math.sin(t)], [math.sin(t), math.cos(t)]])
    stage = {r['file']: np.array([float(r['stage_x_um']), float(r['stage_y_um'])]) for r in scan}
    worst = 0.0
    for v in views:
        q = np.array([float(truths[v['id']]['x_um']), float(truths[v['id']]['y_um'])])
        p = 511.5 - np.linalg.solve(a, q - stage[v['file']])
        worst = max(worst, abs(p[0] - float(v['x_px'])), abs(p[1] - float(v['y_px'])))
    ok(0.05 < worst < 0.4, f'sample: views follow p = c - A^-1 (q - S) within the error of the readings ({worst:.3f} px)')
    steps = [np.abs(stage[scan[i + 1]['file']] - stage[scan[i]['file']]).max() for i in range(8)]
    ok(all(s < 0.905 * 1024 * 0.6506 for s in steps), 'sample: neighbouring frames overlap by a tenth')


def disc(image, x, y, r):
    yy, xx = np.mgrid[0:1024, 0:1024]
    return image[(xx - x) ** 2 + (yy - y) ** 2 <= r * r]


def mask_centre(image, x, y, r):
    """Offset of the middle of what is brighter than half the plateau from (x, y)."""
    x0, y0 = int(round(x)) - r, int(round(y)) - r
    part = image[y0:y0 + 2 * r + 1, x0:x0 + 2 * r + 1].astype(float)
    dark = np.median(np.concatenate([part[0], part[-1], part[:, 0], part[:, -1]]))
    mask = part - dark > 0.45 * (np.median(part[r - 4:r + 5, r - 4:r + 5]) - dark)
    label, _ = ndimage.label(ndimage.binary_opening(mask))
    yy, xx = np.nonzero(ndimage.binary_fill_holes(label == label[r, r]) if label[r, r] else mask)
    return x0 + xx.mean() - x, y0 + yy.mean() - y


def pixels_agree(images, truths, views):
    """Lone nuclei stand where the truth says, by a mask that has nothing to do with Aimwell's."""
    errors = []
    for v in views:
        t = truths[v['id']]
        x, y = float(v['x_px']), float(v['y_px'])
        lone = t['kind'] == 'interphase' and float(t['gap_um']) > 9 and t['saturated'] == '0'
        if lone and v['whole'] == '1' and 30 < min(x, y) and max(x, y) < 990:
            errors.append(mask_centre(images[v['file']], x, y, 23))
    rms = np.sqrt((np.array(errors) ** 2).mean(0))
    ok(len(errors) > 60 and rms.max() < 0.4, f'sample: {len(errors)} lone nuclei shine where they should, '
                                             f'rms {rms[0]:.2f}, {rms[1]:.2f} px')


def flags(images, truths, views):
    clipped = {}
    for v in views:
        t = truths[v['id']]
        r = 0.4 * float(t['minor_um']) / 0.65
        part = disc(images[v['file']], float(v['x_px']), float(v['y_px']), r)
        if t['kind'] == 'interphase' and part.size:
            clipped[v['id']] = max(clipped.get(v['id'], 0), (part >= 4095).mean())
    said = {i for i in clipped if truths[i]['saturated'] == '1'}
    seen = {i for i, part in clipped.items() if part > 0.02}
    ok(len(said) >= 4 and seen <= said, f'sample: {len(said)} saturated nuclei, and every clipped one says so')
    nuclei = [t for t in truths.values() if t['kind'] in ('interphase', 'mitotic')]
    ok(350 <= len(nuclei) <= 600, f'sample: {len(nuclei)} nuclei')
    kinds = {k: sum(t['kind'] == k for t in truths.values()) for k in ('mitotic', 'debris', 'fibre')}
    ok(kinds['mitotic'] >= 10 and kinds['debris'] >= 50 and kinds['fibre'] == 1, f'sample: {kinds}')
    ok(sum(t['defocused'] == '1' for t in nuclei) >= 20, 'sample: a defocused place')


def large_scans():
    """The large scans, small: plain TIFF and tiled BigTIFF as tifffile reads them, and the same on any threads."""
    with tempfile.TemporaryDirectory() as d:
        one, two = os.path.join(d, 'one'), os.path.join(d, 'two')
        size = ['--side', '300', '--nuclei-per-frame', '25']
        runs = [generate('--stress', '3', *size, '--threads', n, where) for n, where in (('1', one), ('3', two))]
        ok(not any(r.returncode for r in runs), 'stress: written')
        frames = [[tifffile.imread(os.path.join(at, f'frame-00{k}.tif')) for k in (1, 2, 3)] for at in (one, two)]
        ok(all(a.shape == (300, 300) and a.dtype == np.uint16 and 400 < np.percentile(a, 99) <= 4095
               for a in frames[0]), 'stress: plain frames of the size asked for, with nuclei in them')
        ok(all((a == b).all() for a, b in zip(*frames)), 'stress: the same on one thread and three')
        truth = truth_score.read(os.path.join(one, 'truth.csv'))
        scan = truth_score.read(os.path.join(one, 'scan.csv'))
        ok(len(scan) == 3 and 75 <= sum(t['kind'] != 'debris' for t in truth) <= 200, 'stress: its tables')
        big = [os.path.join(d, n) for n in ('big1.tif', 'big2.tif')]
        for path, threads in zip(big, ('1', '2')):
            generate('--bigtiff', '700', '--nuclei-per-frame', '900', '--threads', threads, path)
        with tifffile.TiffFile(big[0]) as tiff:
            page, pixels = tiff.pages[0], tiff.asarray()
            ok(tiff.is_bigtiff and page.is_tiled and page.compression == 1 and pixels.shape == (700, 700) and
               pixels[690:, 690:].min() > 90, 'bigtiff: tiled, plain, whole to its last corner')
            ok((tifffile.imread(big[1]) == pixels).all(), 'bigtiff: the same on one thread and two')


def refusals():
    with tempfile.TemporaryDirectory() as d:
        cases = [(['--bigtiff', '300', os.path.join(d, 'none', 'x.tif')], 'none'),
                 (['--bigtiff', '300', '/dev/full'], 'No space'),
                 (['--stress', '1', '--side', '128', '--nuclei-per-frame', '500', d], 'found room'),
                 (['--stress', '1', '--side', '9', d], '--side 64 to 8192'),
                 (['--stress', '1', os.path.join(os.path.abspath(__file__), 'x')], 'test_sample.py'),
                 ([], 'one folder')]
        runs = [(generate(*words), want) for words, want in cases]
        ok(all(r.returncode == 1 and want in r.stderr for r, want in runs), 'generator: refusals name what is wrong')


def scorer(truths, views):
    """The scorer itself: the truth scores perfectly; a mirrored, doubled or shortened one does not."""
    rows = [{'x_um': t['x_um'], 'y_um': t['y_um']} for t in truths.values()]
    table = list(truths.values())
    s = truth_score.score(rows, table, views)
    ok(s['once'] == s['wanted'] > 200 and s['rms_x_um'] == 0 and s['stray'] <= 1, 'score: the truth is perfect')
    mirrored = [{'x_um': str(2 * 41250 - float(r['x_um'])), 'y_um': r['y_um']} for r in rows]
    s = truth_score.score(mirrored, table, views)
    ok(s['once'] < 0.1 * s['wanted'], 'score: a mirrored table fails')
    s = truth_score.score(rows + rows[:50], table, views)
    ok(s['doubled'] and not s['missed'], 'score: doubles are counted')
    s = truth_score.score(rows[50:], table, views)
    ok(s['missed'] and not s['doubled'], 'score: misses are counted')


def main():
    scan, table, views = (truth_score.read(os.path.join(SAMPLE, f))
                          for f in ('scan.csv', 'truth.csv', 'truth_views.csv'))
    truths = {t['id']: t for t in table}
    reproduced()
    images = frames(scan)
    geometry(scan, truths, views)
    pixels_agree(images, truths, views)
    flags(images, truths, views)
    scorer(truths, views)
    large_scans()
    refusals()
    print(f'1..{len(results)}')
    sys.exit(0 if all(results) else 1)


if __name__ == '__main__':
    main()

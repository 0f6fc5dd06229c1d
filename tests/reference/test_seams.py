#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""An image of 6000 x 6000 px worked in overlapping blocks against the same image worked whole: at most 0.1 % may differ.

A nucleus differs when no nucleus of the other result shares 0.9 of the union of their outlines.
"""
import os
import subprocess
import sys
import tempfile

BIN = os.environ.get('BIN', 'build')


def main():
    print('1..1', flush=True)
    with tempfile.TemporaryDirectory() as folder:
        image = os.path.join(folder, 'large.tif')
        subprocess.run([os.path.join(BIN, 'generate-sample'), '--bigtiff', '6000', image], check=True,
                       stdout=subprocess.DEVNULL)
        out = subprocess.run([os.path.join(BIN, 'reference', 'compare_seams'), image], check=True, text=True,
                             stdout=subprocess.PIPE).stdout
    blocks, whole, same, close, missing, extra = map(int, out.split())
    good = whole > 5000 and max(missing, extra) <= 0.001 * whole
    print(f'{"ok" if good else "not ok"} 1 - seams of a 6000 x 6000 px image: {blocks} nuclei in blocks, {whole} whole, '
          f'{same} with the same mask to the pixel, {missing} missing, {extra} extra')
    return 0


if __name__ == '__main__':
    sys.exit(main())

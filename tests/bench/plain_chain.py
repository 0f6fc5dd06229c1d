#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""The plain segmentation chain of scikit-image on a raw 16-bit frame; prints the best processor time in seconds."""
import os
import sys
import time

for name in ('OMP_NUM_THREADS', 'OPENBLAS_NUM_THREADS'):
    os.environ[name] = '1'
import numpy as np  # noqa: E402
from scipy import ndimage  # noqa: E402
from skimage import feature, filters, measure, segmentation  # noqa: E402


def chain(image):
    smooth = filters.gaussian(image, 1, preserve_range=True)
    mask = smooth > filters.threshold_otsu(smooth)
    distance = ndimage.distance_transform_edt(mask)
    peaks = feature.peak_local_max(distance, min_distance=8, labels=measure.label(mask))
    markers = np.zeros(image.shape, np.int32)
    markers[tuple(peaks.T)] = np.arange(1, len(peaks) + 1)
    labels = segmentation.watershed(-distance, markers, mask=mask)
    measure.regionprops_table(labels, image, ('area', 'centroid', 'mean_intensity', 'major_axis_length'))
    return labels


frame = np.fromfile(sys.argv[1], np.uint16).reshape(int(sys.argv[2]), -1)
best = float('inf')
for _ in range(int(sys.argv[3])):
    start = time.process_time()
    chain(frame)
    best = min(best, time.process_time() - start)
print(best)

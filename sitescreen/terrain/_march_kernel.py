"""Compiled loops of :mod:`sitescreen.terrain.horizon`: rays followed sample by sample over a short distance.

Sample n of every cell's ray lies n rows (or columns) ahead and the same fraction of a cell aside, so one instruction
works on a whole run of cells along the row, whatever the azimuth.
"""

import math
from typing import Any

import numpy as np
from numba import njit

_NAN = np.float32(math.nan)
_LOWEST = np.float32(-math.inf)

_CHUNK = 1024
"""Columns worked on at a time: the rows that their rays cross stay in the processor's cache."""


@njit(nogil=True, cache=True, error_model="numpy")
def reach_tangents(
    elevation_m: Any,
    by_row: Any,
    ahead: Any,
    whole: Any,
    part: Any,
    spacing_m: Any,
    height_m: Any,
    out: Any,
    start: Any,
    stop: Any,
) -> None:
    """Largest tangent from ``height_m`` above each cell to the samples 1 … n of its ray; NaN where one is unknown."""
    rows, cols = elevation_m.shape
    samples = whole.shape[0] - 1
    # cells whose whole ray lies inside the grid
    if by_row:
        top, bottom = (samples, rows) if ahead < 0 else (0, rows - samples)
        left, right = 0, cols
        for sample in range(1, samples + 1):
            left = max(left, -whole[sample])
            right = min(right, cols - whole[sample] - (1 if part[sample] > 0 else 0))
    else:
        left, right = (samples, cols) if ahead < 0 else (0, cols - samples)
        top, bottom = 0, rows
        for sample in range(1, samples + 1):
            top = max(top, -whole[sample])
            bottom = min(bottom, rows - whole[sample] - (1 if part[sample] > 0 else 0))
    for row in range(start, stop):
        if row < top or row >= bottom or left >= right:
            out[row, :] = _NAN
        else:
            out[row, :left] = _NAN
            out[row, max(right, left) :] = _NAN
    per_m = np.empty(samples + 1, dtype=np.float32)
    for sample in range(samples + 1):
        per_m[sample] = 1.0 / (spacing_m * max(sample, 1))
    base = np.empty(_CHUNK, dtype=np.float32)
    trace = np.empty(_CHUNK, dtype=np.float32)
    best = np.empty(_CHUNK, dtype=np.float32)
    for chunk in range(left, right, _CHUNK):
        cells = min(_CHUNK, right - chunk)
        for row in range(max(start, top), min(stop, bottom)):
            here = elevation_m[row, chunk:]
            for i in range(cells):
                base[i] = here[i] + height_m
                best[i] = _LOWEST
                trace[i] = here[i]
            sample = 1
            while sample <= samples:
                # two at a time: half the traffic through ``best`` and ``trace``
                second = min(sample + 1, samples)
                if by_row:
                    r1, c1 = row + ahead * sample, chunk + whole[sample]
                    r2, c2 = row + ahead * second, chunk + whole[second]
                    a1, b1 = elevation_m[r1, c1:], elevation_m[r1, c1 + (1 if part[sample] > 0 else 0) :]
                    a2, b2 = elevation_m[r2, c2:], elevation_m[r2, c2 + (1 if part[second] > 0 else 0) :]
                else:
                    r1, c1 = row + whole[sample], chunk + ahead * sample
                    r2, c2 = row + whole[second], chunk + ahead * second
                    a1, b1 = elevation_m[r1, c1:], elevation_m[r1 + (1 if part[sample] > 0 else 0), c1:]
                    a2, b2 = elevation_m[r2, c2:], elevation_m[r2 + (1 if part[second] > 0 else 0), c2:]
                p1, m1, p2, m2 = part[sample], per_m[sample], part[second], per_m[second]
                for i in range(cells):
                    z1 = a1[i] + p1 * (b1[i] - a1[i])
                    z2 = a2[i] + p2 * (b2[i] - a2[i])
                    t1 = (z1 - base[i]) * m1
                    t2 = (z2 - base[i]) * m2
                    t1 = t1 if t1 > t2 else t2
                    best[i] = t1 if t1 > best[i] else best[i]
                    # a sum keeps any NaN on the way
                    trace[i] += z1 + z2
                sample += 2
            target = out[row, chunk:]
            for i in range(cells):
                target[i] = best[i] if trace[i] == trace[i] else _NAN

"""Compiled loops of :mod:`sitescreen.terrain.buildable`."""

import math
from typing import Any

import numpy as np
from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def chances(
    east: Any,
    north: Any,
    reach: Any,
    noise_variance: Any,
    limit: Any,
    table: Any,
    u_most: Any,
    chance: Any,
    start: Any,
    stop: Any,
) -> None:
    """Chance that each cell's true gradient is within ``limit``, its noise taken out by its (2·reach + 1)² neighbours.

    Sums run in the same order round every cell, so they do not depend on where the window begins.
    """
    rows, cols = east.shape
    sums = np.zeros((4, cols), dtype=np.float64)
    wide = np.zeros((4, cols), dtype=np.float64)
    for row in range(start, stop):
        sums[:] = 0.0
        for r in range(max(row - reach, 0), min(row + reach + 1, rows)):
            to_east, to_north = east[r], north[r]
            for col in range(cols):
                known = to_east[col] == to_east[col]
                p = np.float64(to_east[col] if known else 0.0)
                q = np.float64(to_north[col] if known else 0.0)
                sums[0, col] += 1.0 if known else 0.0
                sums[1, col] += p
                sums[2, col] += q
                sums[3, col] += p * p + q * q
        wide[:] = 0.0
        for k in range(-reach, reach + 1):
            low, high = max(0, -k), min(cols, cols - k)
            for i in range(4):
                source, target = sums[i], wide[i]
                for col in range(low, high):
                    target[col] += source[col + k]
        for col in range(cols):
            p, q = np.float64(east[row, col]), np.float64(north[row, col])
            if p != p:
                chance[row, col] = math.nan
                continue
            count = wide[0, col]
            mean_p, mean_q = wide[1, col] / count, wide[2, col] / count
            observed = 0.5 * (wide[3, col] / count - mean_p * mean_p - mean_q * mean_q)
            keep = 1.0 - noise_variance / observed if observed > noise_variance else 0.0
            p = mean_p + keep * (p - mean_p)
            q = mean_q + keep * (q - mean_q)
            steepness = math.sqrt(p * p + q * q)
            spread = math.sqrt(keep * noise_variance)
            if not spread > 0.0:
                chance[row, col] = 1.0 if steepness <= limit else 0.0
                continue
            # the table runs over (limit − steepness)/spread and spread/(spread + limit)
            u = min(max((limit - steepness) / spread, -u_most), u_most)
            v = spread / (spread + limit)
            x = (u + u_most) / (2.0 * u_most) * (table.shape[1] - 1)
            y = v * (table.shape[0] - 1)
            i = min(int(x), table.shape[1] - 2)
            j = min(int(y), table.shape[0] - 2)
            fx, fy = x - i, y - j
            chance[row, col] = (1.0 - fy) * ((1.0 - fx) * table[j, i] + fx * table[j, i + 1]) + fy * (
                (1.0 - fx) * table[j + 1, i] + fx * table[j + 1, i + 1]
            )

"""Compiled loops of :mod:`sitescreen.terrain.buildable`."""

import math
from typing import Any

import numpy as np
from numba import njit

# Gradients are summed in whole steps of 2⁻²⁰: such sums are exact in any order, so the window can run along rows and
# columns, one in and one out, and still leave no trace of where it began. Steeper ground counts as 86°.
_STEPS = 1048576.0
_STEEPEST = 16.0


@njit(nogil=True, cache=True, error_model="numpy")
def _add_row(to_east: Any, to_north: Any, sign: Any, columns: Any) -> None:
    """Add a row (or take it away) to the columns' counts, sums and sums of squares."""
    for col in range(to_east.shape[0]):
        known = to_east[col] == to_east[col]
        east = np.float64(to_east[col]) if known else 0.0
        north = np.float64(to_north[col]) if known else 0.0
        p = np.int64(np.rint(min(max(east, -_STEEPEST), _STEEPEST) * _STEPS))
        q = np.int64(np.rint(min(max(north, -_STEEPEST), _STEEPEST) * _STEPS))
        columns[0, col] += sign if known else 0
        columns[1, col] += sign * p
        columns[2, col] += sign * q
        columns[3, col] += sign * (p * p + q * q)


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
    """Chance that each cell's true gradient is within ``limit``, its noise taken out by (2·reach + 1)² neighbours."""
    rows, cols = east.shape
    columns = np.zeros((4, cols), dtype=np.int64)
    for r in range(max(start - reach, 0), min(start + reach, rows)):
        _add_row(east[r], north[r], 1, columns)
    for row in range(start, stop):
        if row + reach < rows:
            _add_row(east[row + reach], north[row + reach], 1, columns)
        if row > start and row - reach - 1 >= 0:
            _add_row(east[row - reach - 1], north[row - reach - 1], -1, columns)
        counted, sum_p, sum_q, sum_2 = np.int64(0), np.int64(0), np.int64(0), np.int64(0)
        for col in range(min(reach, cols)):
            counted += columns[0, col]
            sum_p += columns[1, col]
            sum_q += columns[2, col]
            sum_2 += columns[3, col]
        for col in range(cols):
            if col + reach < cols:
                counted += columns[0, col + reach]
                sum_p += columns[1, col + reach]
                sum_q += columns[2, col + reach]
                sum_2 += columns[3, col + reach]
            if col > reach:
                counted -= columns[0, col - reach - 1]
                sum_p -= columns[1, col - reach - 1]
                sum_q -= columns[2, col - reach - 1]
                sum_2 -= columns[3, col - reach - 1]
            p, q = np.float64(east[row, col]), np.float64(north[row, col])
            if p != p:
                chance[row, col] = math.nan
                continue
            share = 1.0 / (counted * _STEPS)
            mean_p, mean_q = sum_p * share, sum_q * share
            observed = 0.5 * (sum_2 * share / _STEPS - mean_p * mean_p - mean_q * mean_q)
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

"""Compiled loops of :mod:`sitescreen.terrain.terrain_error`: random numbers by place, and their smoothing."""

import math
from typing import Any

import numpy as np
from numba import njit

_LOW = np.uint64(0xFFFFFFFF)
_32 = np.uint64(32)


@njit(nogil=True, cache=True, error_model="numpy")
def philox(a: Any, b: Any, c: Any, d: Any, key_a: Any, key_b: Any) -> Any:
    """Philox 4 × 32 with 10 rounds: four words from a counter of four words and a key of two, all as uint64 < 2³²."""
    for _ in range(10):
        one = np.uint64(0xD2511F53) * a
        two = np.uint64(0xCD9E8D57) * c
        a, b, c, d = (two >> _32) ^ b ^ key_a, two & _LOW, (one >> _32) ^ d ^ key_b, one & _LOW
        key_a = (key_a + np.uint64(0x9E3779B9)) & _LOW
        key_b = (key_b + np.uint64(0xBB67AE85)) & _LOW
    return a, b, c, d


@njit(nogil=True, cache=True, error_model="numpy")
def normals(key_a: Any, key_b: Any, about: Any, layer: Any, row0: Any, col0: Any, out: Any) -> None:
    """Independent normal numbers for the cells from (row0, col0) on, the same for a cell in whatever window it is.

    Columns 2k and 2k + 1 share one call: the cosine and the sine of one Box–Muller pair.
    """
    rows, cols = out.shape
    first = col0 >> 1
    last = (col0 + cols - 1) >> 1
    for row in range(rows):
        for pair in range(first, last + 1):
            a, b, c, _ = philox(
                np.uint64((row0 + row) & 0xFFFFFFFF),
                np.uint64(pair & 0xFFFFFFFF),
                np.uint64(layer),
                np.uint64(about),
                key_a,
                key_b,
            )
            # 53 bits, never 0
            even = (np.float64(((a << _32) | b) >> np.uint64(11)) + 0.5) * 2.0**-53
            size = math.sqrt(-2.0 * math.log(even))
            angle = 2.0 * math.pi * (np.float64(c) + 0.5) * 2.0**-32
            col = 2 * pair - col0
            if col >= 0:
                out[row, col] = size * math.cos(angle)
            if col + 1 < cols:
                out[row, col + 1] = size * math.sin(angle)


@njit(nogil=True, cache=True, error_model="numpy")
def smooth_both_ways(white: Any, weights: Any, out: Any) -> None:
    """Weighted sums along columns, then rows; ``white`` reaches len(weights) // 2 cells further on each side.

    Each cell's sum is taken in one order, so that no window changes a bit.
    """
    taps = weights.shape[0]
    rows, cols = out.shape
    down = np.empty(cols + taps - 1)
    for row in range(rows):
        down[:] = 0.0
        for i in range(taps):
            line, weight = white[row + i], weights[i]
            for col in range(cols + taps - 1):
                down[col] += weight * line[col]
        here = out[row]
        here[:] = 0.0
        for j in range(taps):
            weight = weights[j]
            shifted = down[j : j + cols]
            for col in range(cols):
                here[col] += weight * shifted[col]


@njit(nogil=True, cache=True, error_model="numpy")
def weigh_square(white: Any, weights: Any, out: Any) -> None:
    """Weighted sums over a square of cells; ``white`` reaches half its side further on each side."""
    taps = weights.shape[0]
    rows, cols = out.shape
    for row in range(rows):
        here = out[row]
        here[:] = 0.0
        for i in range(taps):
            line = white[row + i]
            for j in range(taps):
                weight = weights[i, j]
                shifted = line[j : j + cols]
                for col in range(cols):
                    here[col] += weight * shifted[col]


@njit(nogil=True, cache=True, error_model="numpy")
def between_nodes(nodes: Any, row0: Any, col0: Any, node_row0: Any, node_col0: Any, weights: Any, out: Any) -> None:
    """Cubic interpolation between nodes, one node each ``weights.shape[0]`` cells; adds nothing, writes ``out``."""
    per = weights.shape[0]
    rows, cols = out.shape
    down = np.empty(nodes.shape[1])
    for row in range(rows):
        part = (row0 + row) % per
        at = (row0 + row) // per - 1 - node_row0
        for k in range(nodes.shape[1]):
            total = 0.0
            for i in range(4):
                total += weights[part, i] * nodes[at + i, k]
            down[k] = total
        for col in range(cols):
            part = (col0 + col) % per
            left = (col0 + col) // per - 1 - node_col0
            total = 0.0
            for j in range(4):
                total += weights[part, j] * down[left + j]
            out[row, col] = total

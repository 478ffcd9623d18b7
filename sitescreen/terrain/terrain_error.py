"""The terrain model's error: how alike it is at two places, and fields drawn from it, the same wherever one looks."""

import math
from functools import cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Grid
from sitescreen.terrain._terrain_error_kernel import between_nodes, normals, smooth_both_ways, weigh_square

FloatArray = NDArray[np.float64]

SHORT_SHARE = 0.7
"""Share of the height error's variance that is of short range; the rest is of long range (our closure)."""

LONG_RANGE_M = 1500.0
"""Practical range of the long part (our closure; radar terrain models show parts of 1–20 km)."""

NODE_M = 180.0
"""The long part is drawn on nodes this far apart, a whole multiple of every cell of the lattice. [m]"""

NODE_REACH = 9
"""Nodes within this many steps each way make a node's long error: 1.6 km, just beyond its range."""

Key = tuple[np.uint64, np.uint64]

_SHORT, _LONG, _NO_PLACE = 0, 1, 2


class ErrorParts(NamedTuple):
    """One draw of the height's error over a window, [m], float64 arrays of the window's shape; their sum is the error.

    ``short_m``: alike over the error's range. ``long_m``: alike over 1.5 km.
    """

    short_m: FloatArray
    long_m: FloatArray


def error_correlation(distance_m: FloatArray, error_range_m: float) -> FloatArray:
    """How alike the height errors of two places are, 1 at the same place.

    Parameters
    ----------
    distance_m : array
        [m]
    error_range_m : float
        Practical range of the short part: where its correlation has fallen to 5 %. [m] 0 stands for errors that differ
        from cell to cell.

    Notes
    -----
    0.7·exp(−3 d²/a²) + 0.3·exp(−3 d/1500 m): Gaussian and exponential models with practical ranges, as Oksanen and
    Sarjakoski (2005, Comput. Geosci. 31:1015–1027) used them; the split is ours.
    """
    distance = np.asarray(distance_m, dtype=np.float64)
    short = np.exp(-3.0 * (distance / error_range_m) ** 2) if error_range_m > 0 else (distance == 0).astype(np.float64)
    return SHORT_SHARE * short + (1.0 - SHORT_SHARE) * np.exp(-3.0 * distance / LONG_RANGE_M)


def error_parts(grid: Grid, vertical_error_m: float, error_range_m: float, seed: int, draw: int) -> ErrorParts:
    """One draw of the terrain model's error over a window of the lattice.

    Parameters
    ----------
    grid : Grid
        A window whose edges lie on whole multiples of its cells.
    vertical_error_m : float
        One standard deviation of the height. [m]
    error_range_m : float
        See :func:`error_correlation`. [m]
    seed : int
        Another seed, other draws.
    draw : int
        Which draw: the same number is the same error for all plots.

    Returns
    -------
    ErrorParts

    Raises
    ------
    GridError
        If the window does not lie on the lattice, or the error or its range is negative.

    Notes
    -----
    Every cell has its own random number, from the counter-based generator Philox 4 × 32-10 (Salmon et al. 2011, SC'11,
    doi:10.1145/2063384.2063405) with the seed and the draw as key and the cell's absolute row and column as counter.
    The numbers are smoothed by kernels of stated reach, summed in one order. So any two windows see the same error bit
    for bit where they overlap. A Gaussian kernel of s cells gives the correlation exp(−d²/(4 s²)), hence s = a/√12.
    """
    cell = grid.cell_size_m
    row0, col0 = -grid.north_m / cell, grid.west_m / cell
    per_node = NODE_M / cell
    on_lattice = all(abs(number - round(number)) < 1e-6 for number in (row0, col0, per_node))
    if not on_lattice or not vertical_error_m >= 0 or not error_range_m >= 0:
        raise GridError(
            f"cells of {cell:g} m from {grid.west_m:g}, {grid.north_m:g}, height error {vertical_error_m} m and error "
            f"range {error_range_m} m were given",
            "a window of the lattice and errors of at least 0 are needed",
            "Take windows from sitescreen.lattice, and check vertical_error_m and error_range_m in the brief",
        )
    key = (np.uint64(seed & 0xFFFFFFFF), np.uint64(draw & 0xFFFFFFFF))
    # the numbers of two UTM zones at the same row and column have nothing to do with each other
    about = sum((i + 1) * ord(letter) for i, letter in enumerate(grid.crs))
    place = (round(row0), round(col0))
    short = _short(grid.shape, place, error_range_m / cell, key, about)
    long = _long(grid.shape, place, round(per_node), key, about)
    short *= vertical_error_m * math.sqrt(SHORT_SHARE)
    long *= vertical_error_m * math.sqrt(1.0 - SHORT_SHARE)
    return ErrorParts(short, long)


def standard_normals(seed: int, draw: int, count: int) -> FloatArray:
    """Independent normal numbers that belong to a draw as a whole, not to a place. Shape (count,)."""
    out = np.empty((1, count))
    normals(np.uint64(seed & 0xFFFFFFFF), np.uint64(draw & 0xFFFFFFFF), 0, _NO_PLACE, 0, 0, out)
    return np.asarray(out[0])


def gaussian_weights(width_cells: float) -> FloatArray:
    """Weights along one axis whose squares sum to 1, so that white noise keeps its variance; [1] for a width of 0."""
    reach = math.ceil(4.0 * width_cells)
    steps = np.arange(-reach, reach + 1)
    weights = np.exp(-0.5 * (steps / width_cells) ** 2) if reach else np.ones(1)
    return np.asarray(weights / math.sqrt(float(np.sum(weights**2))), dtype=np.float64)


def _short(shape: tuple[int, int], place: tuple[int, int], range_cells: float, key: Key, about: int) -> FloatArray:
    weights = gaussian_weights(range_cells / math.sqrt(12.0))
    reach = len(weights) // 2
    white = np.empty((shape[0] + 2 * reach, shape[1] + 2 * reach))
    normals(key[0], key[1], about, _SHORT, place[0] - reach, place[1] - reach, white)
    out = np.empty(shape)
    smooth_both_ways(white, weights, out)
    return out


def _long(shape: tuple[int, int], place: tuple[int, int], per_node: int, key: Key, about: int) -> FloatArray:
    # the nodes before and behind each cell, and one more on both sides
    first = [start // per_node - 1 for start in place]
    count = [(start + size - 1) // per_node + 3 - low for start, size, low in zip(place, shape, first, strict=True)]
    white = np.empty((count[0] + 2 * NODE_REACH, count[1] + 2 * NODE_REACH))
    normals(key[0], key[1], about, _LONG, first[0] - NODE_REACH, first[1] - NODE_REACH, white)
    nodes = np.empty((count[0], count[1]))
    weigh_square(white, _node_weights(per_node), nodes)
    out = np.empty(shape)
    between_nodes(nodes, place[0], place[1], first[0], first[1], _cubic_weights(per_node), out)
    return out


@cache
def _cubic_weights(per_node: int) -> FloatArray:
    """Weights of the four nodes about each of a node's cells (cubic convolution, a = −0.5); shape (per_node, 4)."""
    t = ((np.arange(per_node) + 0.5) / per_node)[:, None]
    return np.hstack(
        [
            -0.5 * t + t**2 - 0.5 * t**3,
            1.0 - 2.5 * t**2 + 1.5 * t**3,
            0.5 * t + 2.0 * t**2 - 1.5 * t**3,
            -0.5 * t**2 + 0.5 * t**3,
        ]
    )


@cache
def _node_weights(per_node: int) -> FloatArray:
    """Weights that make of white noise on the nodes an error of exponential correlation.

    The square root of the correlation's spectrum, cut to its reach and scaled so that the error interpolated to cells
    has a variance of 1 on average.
    """
    size = 128
    step = np.minimum(np.arange(size), size - np.arange(size)) * NODE_M
    correlation = np.exp(-3.0 * np.hypot(step[:, None], step) / LONG_RANGE_M)
    kernel = np.fft.ifft2(np.sqrt(np.maximum(np.fft.fft2(correlation).real, 0.0))).real
    around = np.arange(-NODE_REACH, NODE_REACH + 1)
    weights = kernel[around[:, None], around]
    wide = np.pad(weights, 3)
    alike = np.array(
        [[np.sum(weights * wide[3 + i : 3 + i + len(around), 3 + j : 3 + j + len(around)]) for j in range(-3, 4)]
         for i in range(-3, 4)]
    )  # fmt: skip
    cubic = _cubic_weights(per_node)
    lag = np.arange(4)[:, None] - np.arange(4)
    # one axis: mean over a node's cells of w_i·w_k, for each pair of its four nodes
    pairs = np.einsum("pi,pk->ik", cubic, cubic) / per_node
    variance = sum(
        pairs[i, k] * pairs[j, m] * alike[3 + lag[i, k], 3 + lag[j, m]]
        for i in range(4)
        for k in range(4)
        for j in range(4)
        for m in range(4)
    )
    return np.asarray(weights / math.sqrt(float(variance)), dtype=np.float64)

"""The ground as it most likely is, once the terrain model's error is allowed for, and how far it stays uncertain."""

from functools import cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.grid import Field
from sitescreen.terrain.terrain_error import LONG_RANGE_M, ErrorParts, error_correlation

_STEPS_PER_M = 1024.0
"""Heights are summed in whole steps of 1 mm: such sums are exact in any order, so windows leave no trace."""

DOUBT = 1.5
"""The error counts for this many times its variance when detail is told from it: the variance seen about a cell is
itself a guess from few cells, and what it overstates would stay as false relief (our closure)."""

FloatArray = NDArray[np.float64]


class ExpectedGround(NamedTuple):
    """Most likely height, and the shares 0–1 of the short and the long error's variance that remain; NaN where unknown.

    All arrays of shape (rows, cols), float64.
    """

    height_m: FloatArray
    short_left: FloatArray
    long_left: FloatArray

    def drawn(self, error: ErrorParts) -> FloatArray:
        """Height of the ground in one draw of the error. [m]"""
        return np.asarray(
            self.height_m + np.sqrt(self.short_left) * error.short_m + np.sqrt(self.long_left) * error.long_m
        )


def reaches_cells(error_range_m: float, cell_size_m: float) -> tuple[int, int]:
    """How many cells each way the near and the wider surroundings reach: two ranges of the short error, and 1.5 km."""
    near = max(2, round(2.0 * error_range_m / cell_size_m))
    return near, max(near + 1, round(LONG_RANGE_M / cell_size_m))


def support_m(error_range_m: float, cell_size_m: float) -> float:
    """How far round a cell :func:`expected_ground` looks. [m]"""
    near, wide = reaches_cells(error_range_m, cell_size_m)
    return (near + 2 * wide) * cell_size_m


def expected_ground(
    elevation: Field, level: NDArray[np.bool_], vertical_error_m: float, error_range_m: float
) -> ExpectedGround:
    """Draw the ground's detail towards its surroundings by as much of it as the known error explains.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m] NaN where unknown.
    level : bool array, shape (rows, cols)
        Open water: its height is known.
    vertical_error_m : float
        One standard deviation of the height. [m]
    error_range_m : float
        Practical range of the short error. [m]

    Returns
    -------
    ExpectedGround

    Notes
    -----
    A height is the mean of its wider surroundings (1.5 km each way), plus what the near surroundings (two ranges)
    differ from that, plus what the cell differs from those. Both differences hold true relief and error. With the
    error's variance N, known from its correlation, times :data:`DOUBT`, and the variance V seen about the cell, the
    share (V − N)/V of a difference is kept (0 where V < N), and the variance that remains is that share of N: error
    added to a surface that has its error already would count it twice. On plains nearly all detail is error; on broken
    ground nearly none is.
    """
    values = elevation.values.astype(np.float64)
    if vertical_error_m == 0.0:
        none = np.where(np.isnan(values), np.nan, 0.0)
        return ExpectedGround(values, none, none)
    near, wide = reaches_cells(error_range_m, elevation.grid.cell_size_m)
    noise_near, noise_wide = noise_variances(error_range_m, elevation.grid.cell_size_m)
    known = ~np.isnan(values)
    steps = np.where(known, np.rint(values * _STEPS_PER_M), 0.0).astype(np.int64)
    close = _mean_steps(steps, known, near)
    broad = _mean_steps(close, known, wide)
    short_left = _kept(steps - close, known, max(2, near // 2), noise_near * vertical_error_m**2)
    long_left = _kept(close - broad, known, near, noise_wide * vertical_error_m**2)
    height = (broad + long_left * (close - broad) + short_left * (steps - close)) / _STEPS_PER_M
    height = np.where(level | ~known, values, height)
    nothing = np.where(known, 0.0, np.nan)
    return ExpectedGround(
        height, np.where(level | ~known, nothing, short_left), np.where(level | ~known, nothing, long_left)
    )


def _sums(values: NDArray[np.int64], reach: int) -> NDArray[np.int64]:
    """Sums over (2·reach + 1)² cells, as far as they exist."""
    for axis in (0, 1):
        total = np.cumsum(values, axis=axis)
        total = np.concatenate([np.zeros_like(np.take(total, [0], axis=axis)), total], axis=axis)
        at = np.arange(values.shape[axis])
        high = np.minimum(at + reach + 1, values.shape[axis])
        values = np.take(total, high, axis=axis) - np.take(total, np.maximum(at - reach, 0), axis=axis)
    return values


def _mean_steps(steps: NDArray[np.int64], known: NDArray[np.bool_], reach: int) -> NDArray[np.int64]:
    """Mean of the known cells about each known cell, in whole steps; 0 elsewhere."""
    count = np.maximum(_sums(known.astype(np.int64), reach), 1)
    mean = np.rint(_sums(np.where(known, steps, 0), reach) / count).astype(np.int64)
    return np.where(known, mean, 0)


def _kept(steps: NDArray[np.int64], known: NDArray[np.bool_], reach: int, noise_m2: float) -> FloatArray:
    """The share of the variance seen about each cell that is not error."""
    count = np.maximum(_sums(known.astype(np.int64), reach), 1)
    seen_m2 = _sums(np.where(known, steps**2, 0), reach) / count / _STEPS_PER_M**2
    return np.maximum(1.0 - DOUBT * noise_m2 / np.maximum(seen_m2, 1e-12), 0.0)


@cache
def noise_variances(error_range_m: float, cell_size_m: float) -> tuple[float, float]:
    """Variance, for a height error of 1 m, of cell less near mean, and of near mean less wider mean of that. [m²]"""
    from scipy.signal import fftconvolve

    near, wide = reaches_cells(error_range_m, cell_size_m)
    close = np.full((2 * near + 1,) * 2, (2.0 * near + 1.0) ** -2)
    broad = np.full((2 * wide + 1,) * 2, (2.0 * wide + 1.0) ** -2)
    out = []
    for middle, around in ((np.ones((1, 1)), close), (close, fftconvolve(close, broad))):
        weights = -around
        gap = (around.shape[0] - middle.shape[0]) // 2
        weights[gap : gap + middle.shape[0], gap : gap + middle.shape[1]] += middle
        pairs = fftconvolve(weights, weights[::-1, ::-1])
        lag = (np.arange(pairs.shape[0]) - pairs.shape[0] // 2) * cell_size_m
        out.append(float(np.sum(pairs * error_correlation(np.hypot(lag[:, None], lag), error_range_m))))
    return out[0], out[1]

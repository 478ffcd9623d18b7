"""How likely the ground is to be gentle enough to build on, given that the terrain model has errors."""

import math
from functools import cache

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Field
from sitescreen.terrain._buildable_kernel import chances
from sitescreen.terrain.slope import gradient
from sitescreen.terrain.terrain_error import error_correlation
from sitescreen.terrain.threads import in_bands

_U_MOST = 6.0
_HORN_EAST = np.array([[-1.0, 0.0, 1.0], [-2.0, 0.0, 2.0], [-1.0, 0.0, 1.0]]) / 8.0


def gradient_error(vertical_error_m: float, error_range_m: float, cell_size_m: float) -> float:
    """Standard deviation of either component of Horn's gradient that comes from the heights' error alone [1].

    Parameters
    ----------
    vertical_error_m : float
        One standard deviation of the height. [m]
    error_range_m : float
        See :func:`sitescreen.terrain.terrain_error.error_correlation`. [m]
    cell_size_m : float
        [m]

    Notes
    -----
    The gradient is a weighted sum of nine heights, so its variance is Σᵢ Σⱼ wᵢ wⱼ ρ(dᵢⱼ) σ². For errors that differ
    from cell to cell the standard deviation is (√12/8)·σ/L.
    """
    row, col = np.mgrid[0:3, 0:3].reshape(2, 9) * cell_size_m
    distance = np.hypot(row[:, None] - row, col[:, None] - col)
    weights = _HORN_EAST.ravel() / cell_size_m
    variance = weights @ error_correlation(distance, error_range_m) @ weights
    return vertical_error_m * math.sqrt(max(float(variance), 0.0))


@cache
def _chance_table() -> NDArray[np.float64]:
    """P(gradient ≤ limit) when its true value scatters round a known mean in both directions alike.

    Row j: spread/(spread + limit) = j/256; column i: (limit − steepness of the mean)/spread from −6 to 6.
    """
    from scipy.special import chndtr

    v = np.linspace(0.0, 1.0, 257)[:, None]
    u = np.linspace(-_U_MOST, _U_MOST, 193)[None, :]
    # row 0 is the limit of small spread, where the circle is a straight line; the last row that of endless spread
    limit = (1.0 - v[1:-1]) / v[1:-1]
    steepness = np.maximum(limit - u, 0.0)
    table = np.empty((257, 193))
    table[1:-1] = chndtr(limit**2, 2.0, steepness**2)
    table[0] = [0.5 * math.erfc(-x / math.sqrt(2.0)) for x in u[0]]
    table[-1] = 0.0
    table.flags.writeable = False
    return table


def chance_buildable(elevation: Field, limit_pct: float, vertical_error_m: float, error_range_m: float) -> Field:
    """Chance that the true slope of each cell is within a limit.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m]
    limit_pct : float
        Steepest slope that can be built on. [%]
    vertical_error_m : float
        One standard deviation of the terrain model's height. [m]
    error_range_m : float
        Distance at which neighbouring errors have become independent (correlation 5 %). [m]

    Returns
    -------
    Field, shape (rows, cols)
        0–1. NaN on the outer ring and wherever any of the nine cells is NaN.

    Raises
    ------
    GridError
        If the limit is not positive, or the error or its range is negative.

    Notes
    -----
    Noise makes level ground look steep: with σ = 4.4 m at 30 m a fifth to a third of it shows over 10 %. So each
    component of the gradient is first drawn towards its neighbourhood's mean, by the share of the observed variance
    that the known error explains; what is left uncertain is a normal scatter of variance keep·noise in both components.
    A flat prior instead would count the noise twice. The neighbourhood reaches twice the error's range, at least two
    cells, each way; known cells of it count.
    """
    if not limit_pct > 0 or not vertical_error_m >= 0 or not error_range_m >= 0:
        raise GridError(
            f"limit {limit_pct} %, height error {vertical_error_m} m and error range {error_range_m} m were given",
            "a positive limit and errors of at least 0 are needed",
            "Check vertical_error_m and error_range_m in the brief",
        )
    grid = elevation.grid
    slope = gradient(elevation)
    noise = gradient_error(vertical_error_m, error_range_m, grid.cell_size_m)
    reach = max(2, round(2.0 * error_range_m / grid.cell_size_m))
    values = np.empty(grid.shape, dtype=np.float32)
    in_bands(
        chances,
        grid.rows,
        slope.east.values,
        slope.north.values,
        reach,
        noise**2,
        limit_pct / 100.0,
        _chance_table(),
        _U_MOST,
        values,
    )
    return Field(values, grid, "1", f"chance that the slope is within {limit_pct:g} %")

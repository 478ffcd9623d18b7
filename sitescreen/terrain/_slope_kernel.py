"""Compiled loops of :mod:`sitescreen.terrain.slope`."""

import math
from typing import Any

import numpy as np
from numba import njit

# Everything stays in float32 and free of branches, so that the loops run on eight or sixteen cells at once. Heights are
# subtracted before they are added: the differences of neighbouring heights are exact, their sums would not be.
_EIGHTH = np.float32(0.125)
_ONE = np.float32(1.0)
_ZERO = np.float32(0.0)
_TAN_22_5 = np.float32(math.tan(math.pi / 8))
_TAN_67_5 = np.float32(math.tan(3 * math.pi / 8))
_45_DEG = np.float32(45.0)
_90_DEG = np.float32(90.0)
_180_DEG = np.float32(180.0)
_360_DEG = np.float32(360.0)
# atan(x)/x as a polynomial in x² on 0 … tan 22.5°, through Chebyshev nodes; off by 7e-9 at most, below float32's own
# step. Given in degrees.
_ATAN = tuple(
    np.float32(math.degrees(c))
    for c in (0.9999999812646109, -0.33332785771920825, 0.19974082415395403, -0.13848490211185763, 0.07976291803477809)
)
_A0, _A1, _A2, _A3, _A4 = _ATAN


@njit(nogil=True, cache=True, error_model="numpy")
def _atan_deg(x: Any) -> Any:
    """Arc tangent of x ≥ 0, in degrees."""
    steep = x > _TAN_67_5
    middle = x > _TAN_22_5
    over = -_ONE if steep else (x - _ONE if middle else x)
    under = x if steep else (x + _ONE if middle else _ONE)
    base = _90_DEG if steep else (_45_DEG if middle else _ZERO)
    y = over / under
    u = y * y
    return base + y * (_A0 + u * (_A1 + u * (_A2 + u * (_A3 + u * _A4))))


@njit(nogil=True, cache=True, error_model="numpy")
def _aspect_deg(east: Any, north: Any) -> Any:
    """Bearing that a gradient falls to, 0 ≤ bearing < 360; NaN where it is level (0/0)."""
    wide = abs(east)
    tall = abs(north)
    flat_side = wide > tall
    low = tall if flat_side else wide
    high = wide if flat_side else tall
    # the arc tangent of low / high ≤ 1 with one division: 45° + atan((low − high) / (low + high)) in its upper half
    middle = low > _TAN_22_5 * high
    over = low - high if middle else low
    under = low + high if middle else high
    y = over / under
    u = y * y
    angle = (_45_DEG if middle else _ZERO) + y * (_A0 + u * (_A1 + u * (_A2 + u * (_A3 + u * _A4))))
    angle = _90_DEG - angle if flat_side else angle
    angle = _180_DEG - angle if north > _ZERO else angle
    angle = _360_DEG - angle if east > _ZERO else angle
    return _ZERO if angle >= _360_DEG else angle


@njit(nogil=True, cache=True, error_model="numpy")
def horn_gradient(elevation_m: Any, cell_size_m: Any, east: Any, north: Any, start: Any, stop: Any) -> None:
    """Horn's 3 × 3 gradient; writes rows start … stop of ``east`` and ``north``, but not the outer ring."""
    scale = _EIGHTH / np.float32(cell_size_m)
    cols = elevation_m.shape[1]
    for row in range(max(start, 1), min(stop, elevation_m.shape[0] - 1)):
        above, here, below = elevation_m[row - 1], elevation_m[row], elevation_m[row + 1]
        to_east, to_north = east[row], north[row]
        for col in range(1, cols - 1):
            # Horn gives the centre no weight: centre − centre keeps a hole a hole
            hole = here[col] - here[col]
            rise = (above[col + 1] - above[col - 1]) + (below[col + 1] - below[col - 1])
            side = here[col + 1] - here[col - 1]
            p = (rise + (side + side)) * scale + hole
            rise = (above[col - 1] - below[col - 1]) + (above[col + 1] - below[col + 1])
            side = above[col] - below[col]
            q = (rise + (side + side)) * scale + hole
            # either component passes over a row or column of three, and with it over a hole there
            to_east[col] = p + (q - q)
            to_north[col] = q + (p - p)


@njit(nogil=True, cache=True, error_model="numpy")
def horn_slope_aspect(
    elevation_m: Any, cell_size_m: Any, slope_deg: Any, aspect_deg: Any, start: Any, stop: Any
) -> None:
    """Slope and aspect in one pass over the heights; an output of no rows is left alone."""
    scale = _EIGHTH / np.float32(cell_size_m)
    cols = elevation_m.shape[1]
    slope_wanted, aspect_wanted = slope_deg.shape[0] > 0, aspect_deg.shape[0] > 0
    east = np.empty(cols, dtype=np.float32)
    north = np.empty(cols, dtype=np.float32)
    for row in range(max(start, 1), min(stop, elevation_m.shape[0] - 1)):
        above, here, below = elevation_m[row - 1], elevation_m[row], elevation_m[row + 1]
        for col in range(1, cols - 1):
            hole = here[col] - here[col]
            rise = (above[col + 1] - above[col - 1]) + (below[col + 1] - below[col - 1])
            side = here[col + 1] - here[col - 1]
            east[col] = (rise + (side + side)) * scale + hole
            rise = (above[col - 1] - below[col - 1]) + (above[col + 1] - below[col + 1])
            side = above[col] - below[col]
            north[col] = (rise + (side + side)) * scale + hole
        if slope_wanted:
            slope = slope_deg[row]
            for col in range(1, cols - 1):
                slope[col] = _atan_deg(math.sqrt(east[col] * east[col] + north[col] * north[col]))
        if aspect_wanted:
            aspect = aspect_deg[row]
            for col in range(1, cols - 1):
                aspect[col] = _aspect_deg(east[col], north[col])

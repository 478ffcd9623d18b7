"""Compiled loops of :mod:`sitescreen.terrain.sky_view`."""

import math
from typing import Any

import numpy as np
from numba import njit

_ZERO = np.float32(0.0)
_ONE = np.float32(1.0)
_QUARTER_TURN = np.float32(math.pi / 2)
_EIGHTH_TURN = np.float32(math.pi / 4)
_TAN_22_5 = np.float32(math.tan(math.pi / 8))
_TAN_67_5 = np.float32(math.tan(3 * math.pi / 8))
# as in the slope kernel: atan(x)/x in x², on 0 … tan 22.5°, off by 7e-9 at most
_A0 = np.float32(0.9999999812646109)
_A1 = np.float32(-0.33332785771920825)
_A2 = np.float32(0.19974082415395403)
_A3 = np.float32(-0.13848490211185763)
_A4 = np.float32(0.07976291803477809)


@njit(nogil=True, cache=True, error_model="numpy")
def _atan_rad(x: Any) -> Any:
    """Arc tangent of x ≥ 0."""
    steep = x > _TAN_67_5
    middle = x > _TAN_22_5
    over = -_ONE if steep else (x - _ONE if middle else x)
    under = x if steep else (x + _ONE if middle else _ONE)
    base = _QUARTER_TURN if steep else (_EIGHTH_TURN if middle else _ZERO)
    y = over / under
    u = y * y
    return base + y * (_A0 + u * (_A1 + u * (_A2 + u * (_A3 + u * _A4))))


@njit(nogil=True, cache=True, error_model="numpy")
def add_direction(
    tangent: Any, east: Any, north: Any, sin_azimuth: Any, cos_azimuth: Any, total: Any, start: Any, stop: Any
) -> None:
    """Add one azimuth's integrand sin²H − g·(H − sin H cos H) to the running total.

    H is measured from the zenith and g is the ground's rise per metre along the azimuth, so that
    sin S·cos(φ − A) = −g·cos S. The slope's own horizon has the tangent g, the sky ends at the horizontal: the horizon
    is the highest of the three. A direction without known ground (NaN) counts as open.
    """
    for row in range(start, stop):
        seen, to_east, to_north, sum_ = tangent[row], east[row], north[row], total[row]
        for col in range(seen.shape[0]):
            g = to_east[col] * sin_azimuth + to_north[col] * cos_azimuth
            t = g if g > _ZERO else _ZERO
            t = seen[col] if seen[col] > t else t
            sin2 = _ONE / (_ONE + t * t)
            sum_[col] += sin2 - g * (_QUARTER_TURN - _atan_rad(t) - t * sin2)


@njit(nogil=True, cache=True, error_model="numpy")
def finish(total: Any, east: Any, north: Any, azimuths: Any, start: Any, stop: Any) -> None:
    """Turn the running total into the sky view factor: mean over the azimuths times cos S."""
    share = _ONE / np.float32(azimuths)
    for row in range(start, stop):
        sum_, to_east, to_north = total[row], east[row], north[row]
        for col in range(sum_.shape[0]):
            steepness = to_east[col] * to_east[col] + to_north[col] * to_north[col]
            value = sum_[col] * share / math.sqrt(_ONE + steepness)
            # rounding alone can pass 1 on open level ground
            value = _ONE if value > _ONE else value
            sum_[col] = _ZERO if value < _ZERO else value

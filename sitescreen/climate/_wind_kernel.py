"""Compiled loop of :mod:`sitescreen.climate.wind`: one sector's wind added to the sums of a rose."""

import math
from typing import Any

import numpy as np
from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def shelter(tangent: Any, from_tangent: Any, span_tangent: Any, most: Any) -> Any:
    """Speed left behind upwind ground; NaN where the angle is."""
    t = min(max((tangent - from_tangent) / span_tangent, 0.0), 1.0)
    return math.nan if math.isnan(tangent) else 1.0 - most * t * t * (3.0 - 2.0 * t)


@njit(nogil=True, cache=True, error_model="numpy")
def capped(speed_up: Any, least: Any, most: Any) -> Any:
    """Speed-up bent towards its caps."""
    cap = most if speed_up > 0.0 else -least
    return cap * math.tanh(speed_up / cap)


@njit(nogil=True, cache=True, error_model="numpy")
def add_sector(
    tangent: Any,
    east_east: Any,
    east_north: Any,
    north_north: Any,
    east: float,
    north: float,
    closure: Any,
    weights: Any,
    place: Any,
    air: Any,
    energy: Any,
    kept_off: Any,
    first: int,
    stop: int,
) -> None:
    """Add one sector to the three sums, for rows first … stop.

    ``closure``: shelter's start, span and most, speed-up's least and most. ``weights``: (places, 3) of this sector for
    air, energy and time; a place that has no wind from it skips it, so that unknown ground there does not spread.
    """
    from_tangent, span_tangent, most_shelter, least, most = closure
    for row in range(first, stop):
        for col in range(tangent.shape[1]):
            here = place[row, col]
            air_weight, energy_weight, time_weight = weights[here, 0], weights[here, 1], weights[here, 2]
            if air_weight == 0.0 and energy_weight == 0.0 and time_weight == 0.0:
                continue
            left = shelter(tangent[row, col], from_tangent, span_tangent, most_shelter)
            up = capped(
                east * east * east_east[row, col]
                + 2.0 * east * north * east_north[row, col]
                + north * north * north_north[row, col],
                least,
                most,
            )
            slowed = left if math.isnan(left) else min(1.0 + min(up, 0.0), left)
            ratio = slowed * (1.0 + max(up, 0.0))
            if air_weight > 0.0:
                air[row, col] += np.float32(air_weight * ratio)
            if energy_weight > 0.0:
                energy[row, col] += np.float32(energy_weight * ratio * ratio * ratio)
            if time_weight > 0.0:
                kept_off[row, col] += np.float32(time_weight * (1.0 - left))

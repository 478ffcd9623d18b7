"""Compiled loop of :class:`sitescreen.climate.sun_field.SunField`."""

from typing import Any

import numpy as np
from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def add_hours(tangent: Any, south: Any, north: Any, northward: Any, total: Any, start: Any, stop: Any) -> None:
    """Add the hours of one direction to each cell, read from a table over the tangent of its horizon.

    Entry i of a table stands for t/(1 + t) = i/(entries − 1). Of horizons below the level, and where no ground is
    known, it takes entry 0. Tables of two latitudes are mixed row by row.
    """
    entries = south.shape[0]
    table = np.empty(entries, dtype=np.float32)
    last = np.float32(entries - 1)
    for row in range(start, stop):
        share = northward[row]
        for i in range(entries):
            table[i] = south[i] + share * (north[i] - south[i])
        for col in range(tangent.shape[1]):
            t = tangent[row, col]
            hours = table[0]
            if t > 0.0:
                place = t / (np.float32(1.0) + t) * last
                i = min(int(place), entries - 2)
                hours = table[i] + (place - np.float32(i)) * (table[i + 1] - table[i])
            total[row, col] += hours

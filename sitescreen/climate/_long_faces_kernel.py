"""Sums over the sun's moments for every bearing of a long axis. Called by ``long_faces.py`` only."""

from typing import Any

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def long_faces(
    across: Any,
    tan_height: Any,
    degree: Any,
    sin_azimuth: Any,
    cos_azimuth: Any,
    sin_bearing: Any,
    cos_bearing: Any,
    faces: Any,
    level: Any,
    start: int,
    stop: int,
) -> None:
    """Beam on both long faces (n, 180), and on level ground (n,), of plots from ``start`` to before ``stop``.

    ``across`` (n, times): the beam's horizontal part. ``degree`` (times,): whole degree of the sun's azimuth mod 180,
    of which sine and cosine are given too. Sums run from the first moment to the last, whatever the number of plots.
    """
    bearings = len(sin_bearing)
    by_sine = np.empty(bearings)
    by_cosine = np.empty(bearings)
    for plot in range(start, stop):
        by_sine[:] = 0.0
        by_cosine[:] = 0.0
        total = 0.0
        for moment in range(len(degree)):
            beam = across[plot, moment]
            if beam == 0.0:
                continue
            by_sine[degree[moment]] += beam * sin_azimuth[moment]
            by_cosine[degree[moment]] += beam * cos_azimuth[moment]
            total += beam * tan_height[moment]
        level[plot] = total
        # the sun's azimuth stands at or above the bearing (+) or below it (−); at bearing 0 nothing is below
        sine = 0.0
        cosine = 0.0
        for bearing in range(bearings):
            sine += by_sine[bearing]
            cosine += by_cosine[bearing]
        for bearing in range(bearings):
            faces[plot, bearing] = cos_bearing[bearing] * sine - sin_bearing[bearing] * cosine
            sine -= 2.0 * by_sine[bearing]
            cosine -= 2.0 * by_cosine[bearing]

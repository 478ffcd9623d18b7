"""Corners for the page: whole steps of a hundred-thousandth of a degree, each from the corner before."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

STEPS_A_DEGREE = 100_000
"""Corners are kept to a metre."""


def in_steps(lon_lat: NDArray[np.float64]) -> list[int]:
    """The first corner, then the way to each next one: lon, lat, lon, lat …

    Parameters
    ----------
    lon_lat : float64 array, shape (n, 2)
        [°]
    """
    corners = np.rint(lon_lat * STEPS_A_DEGREE).astype(np.int64)
    steps: Any = np.vstack([corners[:1], np.diff(corners, axis=0)]).ravel().tolist()
    return list(steps)

"""Analytic ground for tests of the flow over hills, with its middle in the middle of a cell."""

from collections.abc import Callable
from typing import Any

import numpy as np

from sitescreen.grid import Field, Grid

HALF = float(np.sqrt(2.0 * np.log(2.0)))
"""Half-height half-width of a Gaussian over its standard deviation."""


def ground(shape: Callable[[Any, Any], Any], cells: int = 800, step_m: float = 30.0) -> Field:
    """Ground of a shape in metres east and north of the middle cell's centre."""
    grid = Grid("EPSG:32641", 0.0, cells * step_m, step_m, cells, cells)
    middle = grid.x_centres_m()[cells // 2], grid.y_centres_m()[cells // 2]
    x, y = np.meshgrid(grid.x_centres_m() - middle[0], grid.y_centres_m() - middle[1])
    return Field(shape(x, y), grid, "m", "an analytic hill")


def at(values: Any, east_cells: int = 0) -> float:
    """The value some cells east of the middle."""
    rows, cols = values.shape
    return float(values[rows // 2, cols // 2 + east_cells])

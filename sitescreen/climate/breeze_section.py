"""The ground from a plot to its shore in section, to be drawn: how the breeze comes, and over what."""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate._breeze_path_kernel import profile
from sitescreen.climate.breeze_path import Way, steps_to
from sitescreen.grid import Field
from sitescreen.terrain.threads import in_bands

FloatArray = NDArray[np.float64]

MOST_POINTS = 120
"""Points of a section: enough for a drawing as wide as a page, and 1 kB a plot."""


class Section(NamedTuple):
    """Ground along the straight way from a plot to the shore that its breeze comes from."""

    distance_m: NDArray[np.float32]
    """Distances from the plot, rising from 0; the last is the shore, or as far as is looked. [m] Shape (points,)."""
    ground_m: NDArray[np.float32]
    """Height of the ground there. [m] NaN where unknown."""
    shore_distance_m: float
    """From the plot to the shore, which may lie beyond the section's end. [m]"""
    bearing_deg: float
    """From the plot to the shore, clockwise from true north. [°] NaN in the water."""
    crest_distance_m: float
    """From the plot to the ground that makes the skyline. [m] NaN where none stands above the plot's own horizon."""
    crest_m: float
    """Height of that ground. [m] NaN likewise."""


def sections(
    elevation: Field,
    x_m: FloatArray,
    y_m: FloatArray,
    to_x_m: FloatArray,
    to_y_m: FloatArray,
    way: Way,
    shore_distance_m: FloatArray,
    bearing_deg: FloatArray,
    most_m: float,
    most_points: int = MOST_POINTS,
) -> list[Section | None]:
    """The sections of plots, from the same samples as their ways: one a cell.

    Parameters
    ----------
    elevation : Field
        Height. [m]
    x_m, y_m : array, shape (n,)
        Plots, in the grid's system. [m]
    to_x_m, to_y_m : array, shape (n,)
        Nearest points of their shores. [m] NaN without one.
    way : Way
        Of the same plots: it knows the crest.
    shore_distance_m, bearing_deg : array, shape (n,)
        On the ground [m], and from true north [°].
    most_m : float
        Where to end if the shore is farther. [m]
    most_points : int
        With more cells on the way, only the highest of every few is kept, so that no crest is lost.

    Returns
    -------
    list of Section, length n
        None for a plot without a shore.
    """
    row, col, row_step, col_step, length = steps_to(elevation.grid, x_m, y_m, to_x_m, to_y_m)
    step = elevation.grid.cell_size_m
    end = np.where(np.minimum(length, most_m) < 1e-6 * step, 0.0, np.minimum(length, most_m))
    distance, ground = (np.full((len(end), most_points), np.nan, dtype=np.float32) for _ in range(2))
    count = np.zeros(len(end), dtype=np.int64)
    in_bands(
        profile,
        len(end),
        elevation.values,
        step,
        row,
        col,
        row_step,
        col_step,
        end,
        distance,
        ground,
        count,
        bands_a_thread=4,
    )
    crest_m = way.plot_m + way.crest_above_plot_m
    return [
        None
        if math.isnan(end[k])
        else Section(
            distance[k, : count[k]],
            ground[k, : count[k]],
            float(shore_distance_m[k]),
            float(bearing_deg[k]),
            float(way.crest_distance_m[k]),
            float(crest_m[k]),
        )
        for k in range(len(end))
    ]


__all__ = ["Section", "sections"]

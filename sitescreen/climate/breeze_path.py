"""The way of the breeze: what ground stands between a plot and its shore, and how much of the breeze it takes."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate._breeze_path_kernel import walk
from sitescreen.grid import Field, Grid
from sitescreen.settings import BreezeSettings
from sitescreen.terrain.threads import in_bands

FloatArray = NDArray[np.float64]


class Way(NamedTuple):
    """Ground on the straight way from plots to their shores; arrays of shape (n,), NaN without a shore.

    The way ends at the shore, or at the farthest that is looked.
    """

    skyline_deg: FloatArray
    """Height of the skyline from 10 m above the plot; 0 where no ground stands above the horizon of the water. [°]"""
    crest_distance_m: FloatArray
    """To the ground that makes that skyline; NaN where it is 0. [m]"""
    crest_above_plot_m: FloatArray
    """Height of that ground over the plot's. [m]"""
    plot_m: FloatArray
    """Height of the plot's ground. [m]"""
    highest_m: FloatArray
    """Height of the highest ground on the way, the plot's included. [m]"""
    lowest_m: FloatArray
    """Height of the lowest. [m]"""
    shore_m: FloatArray
    """Height of the ground at the shore; NaN if the way ends before. [m]"""
    known: NDArray[np.bool_]
    """False where the terrain model has gaps on the way, or ends."""


def ways(
    elevation: Field, x_m: FloatArray, y_m: FloatArray, to_x_m: FloatArray, to_y_m: FloatArray, settings: BreezeSettings
) -> Way:
    """Walk from each plot straight towards its shore, one cell a step, over the bilinear ground.

    Parameters
    ----------
    elevation : Field
        Height. [m] NaN where unknown.
    x_m, y_m : array, shape (n,)
        Plots, in the grid's system. [m]
    to_x_m, to_y_m : array, shape (n,)
        Nearest points of their shores. [m] NaN without one.
    settings : BreezeSettings
        ``path_most_m``: ground farther from the plot is not looked at, so that a plot's reading depends on the ground
        near it alone. ``path_eye_m``.

    Returns
    -------
    Way
    """
    grid = elevation.grid
    row, col, row_step, col_step, length = steps_to(grid, x_m, y_m, to_x_m, to_y_m)
    reaches = length <= settings.path_most_m
    walked = np.minimum(length, settings.path_most_m)
    out = np.empty((8, length.size))
    in_bands(
        walk,
        length.size,
        elevation.values,
        grid.cell_size_m,
        row,
        col,
        row_step,
        col_step,
        walked,
        reaches,
        settings.path_eye_m,
        out,
        bands_a_thread=4,
    )
    tangent, distance, above, plot, highest, lowest, end, known = out
    seen = ~np.isnan(length)
    with np.errstate(invalid="ignore"):
        stands = tangent > 0.0
    return Way(
        skyline_deg=np.where(seen, np.degrees(np.arctan(np.where(stands, tangent, 0.0))), np.nan),
        crest_distance_m=np.where(stands, distance, np.nan),
        crest_above_plot_m=np.where(stands, above, np.nan),
        plot_m=plot,
        highest_m=highest,
        lowest_m=lowest,
        shore_m=np.where(reaches, end, np.nan),
        known=known == 1.0,
    )


def steps_to(
    grid: Grid, x_m: FloatArray, y_m: FloatArray, to_x_m: FloatArray, to_y_m: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]:
    """Rows and columns (of cell centres) of plots, what a step of one cell adds to them, and the way's length [m]."""
    x, y = np.asarray(x_m, dtype=np.float64), np.asarray(y_m, dtype=np.float64)
    east, north = np.asarray(to_x_m, dtype=np.float64) - x, np.asarray(to_y_m, dtype=np.float64) - y
    length = np.hypot(east, north)
    with np.errstate(invalid="ignore", divide="ignore"):
        row_step = np.where(length > 0.0, -north / length, 0.0)
        col_step = np.where(length > 0.0, east / length, 0.0)
    row = (grid.north_m - y) / grid.cell_size_m - 0.5
    col = (x - grid.west_m) / grid.cell_size_m - 0.5
    return row, col, row_step, col_step, length


def screen_share(way: Way, water_level_m: FloatArray, depth_m: float, settings: BreezeSettings) -> FloatArray:
    """Share of the breeze that the ground on its way takes, 0–1.

    Parameters
    ----------
    way : Way
    water_level_m : array, shape (n,)
        Level of the water that the breeze comes from. [m]
    depth_m : float
        Depth of the breeze over that level. [m]
    settings : BreezeSettings

    Returns
    -------
    float64 array, shape (n,)
        NaN where ground on the way is unknown, unless what is known screens it wholly.

    Notes
    -----
    Both parts are closures of ours, and each takes its share of what the other leaves:

    * depth: of the air between the plot's height and the top of the breeze, the part that lies below the highest ground
      on the way; all of it once that ground, or the plot itself, stands above the top. A breeze about 750 m deep over a
      great lake: Moroz 1967, J. Atmos. Sci. 24:337.
    * lee: 0.7·smoothstep((tan skyline − 0.03)/0.20). A crest at 9° takes half of the breeze that comes over it.

    One straight way stands for all: air also flows round a lone hill, which this reading takes for a ridge.
    """
    top = np.asarray(water_level_m, dtype=np.float64) + depth_m
    with np.errstate(invalid="ignore", divide="ignore"):
        cut = np.clip((way.highest_m - way.plot_m) / (top - way.plot_m), 0.0, 1.0)
        cut = np.where(way.highest_m >= top, 1.0, cut)
        x = (np.tan(np.radians(way.skyline_deg)) - settings.screen_from_tangent) / settings.screen_span_tangent
        lee = settings.screen_most * _smoothstep(x)
        share = 1.0 - (1.0 - cut) * (1.0 - lee)
        return np.where(way.known | (cut >= 1.0), share, np.nan)


def _smoothstep(x: FloatArray) -> FloatArray:
    inside = np.clip(x, 0.0, 1.0)
    return inside * inside * (3.0 - 2.0 * inside)


__all__ = ["Way", "screen_share", "steps_to", "ways"]

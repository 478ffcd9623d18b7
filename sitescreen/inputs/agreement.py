"""Whether the inputs fit one another: plots on the terrain, far enough from its edge, and a sea that is no land."""

from collections import Counter
from dataclasses import replace
from typing import Any

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import Transformer

from sitescreen.errors import InputError
from sitescreen.grid import Grid
from sitescreen.inputs.plot_geometry import WGS84
from sitescreen.inputs.plots import Plots
from sitescreen.inputs.shore import Shore
from sitescreen.inputs.terrain import Terrain
from sitescreen.lattice import blocks_of
from sitescreen.notes import Note

ZERO_WITHIN_M = 3.0
"""A sea this near to 0 m stands at its level, whatever tide and model make of it. Common practice, no source. [m]"""
SEAM_DEG = 1.0
"""Ground this near to the 180° meridian needs what lies across it. [°]"""
SAMPLES = 40
"""Places at which mapped sea is compared with the terrain."""
HIGH_M, HIGH_SHARE = 30.0, 0.9
"""A sea is doubted if this share of the places stands higher: no sea does, and hardly any land with a coast lies
lower everywhere. Common practice, no source."""
LEVEL_M = 10.0
"""Ground whose middle half varies less is level like water, whatever zero its heights count from (ellipsoidal ones are
off by up to 100 m). [m]"""


def refuse_both_sides_of_180(outline: Any) -> None:
    """Refuse terrain on both sides of the 180° meridian: shores and plots cannot be followed across it.

    Parameters
    ----------
    outline : shapely geometry, EPSG:4326
        Footprint of the terrain, longitudes from −180 to 180.

    Raises
    ------
    InputError
    """
    sides = (shapely.box(180.0 - SEAM_DEG, -90.0, 180.0, 90.0), shapely.box(-180.0, -90.0, SEAM_DEG - 180.0, 90.0))
    if all(shapely.intersects(outline, side) for side in sides):
        raise InputError(
            "the terrain lies on both sides of the 180° meridian",
            "terrain on one side of it is needed, since shores and plots cannot be followed across it yet",
            "Cut terrain, shoreline and plots along 180° and screen each side by itself; what needs ground from "
            "across the cut is then unknown",
        )


def refuse_without_plots(plots: Plots, outline: Any) -> None:
    """Refuse a file of plots none of which can be judged, and say why.

    Parameters
    ----------
    plots : Plots
    outline : shapely geometry, EPSG:4326
        Footprint of the terrain.

    Raises
    ------
    InputError
        With the places of plots and terrain, and whether a sign was forgotten.
    """
    table = plots.table
    if (table["outcome"] == "").any():
        return
    name, number = plots.stamp.name, len(table)
    outcome, times = Counter(table["outcome"]).most_common(1)[0]
    away = (table["outcome"] == OUTSIDE).to_numpy()
    if not away.any():
        raise InputError(
            f"no plot of {name} can be judged; for {times} of {number} that is because {outcome}",
            "at least one plot with ground on the terrain is needed",
            "Correct the file, then try it with “sitescreen check”",
        )
    lon, lat = (table.loc[away, key].to_numpy(dtype=np.float64) for key in ("lon", "lat"))
    there = f"the terrain covers {_place(*outline.bounds)}, the plots lie at "
    there += _place(lon.min(), lat.min(), lon.max(), lat.max())
    way_out = "Check the coordinates of the plots, and that the terrain is of the same place"
    shapely.prepare(outline)
    for what, x, y in (("latitude's sign", 1, -1), ("longitude's sign", -1, 1), ("signs of both", -1, -1)):
        meets = int(shapely.intersects_xy(outline, x * lon, y * lat).sum())
        if meets:
            way_out = (
                f"With the {what} changed {meets} of {number} would lie on it: perhaps a minus (south, west) "
                "is missing in the file, or one too many"
            )
            break
    raise InputError(f"no plot of {name} lies on the terrain: {there}", "plots on the terrain are needed", way_out)


OUTSIDE = "it lies outside the terrain"


def _place(west: float, south: float, east: float, north: float) -> str:
    """A stretch of degrees as people write it: 62.41° E to 63.02° E, 6.97° S to 6.47° S."""
    return f"{_span(west, east, 'E', 'W')}, {_span(south, north, 'N', 'S')}"


def _span(low: float, high: float, plus: str, minus: str) -> str:
    ends = [f"{abs(value):.2f}° {plus if value >= 0 else minus}" for value in (low, high)]
    return ends[0] if ends[0] == ends[1] else f"{ends[0]} to {ends[1]}"


def edge_notes(plots: Plots, outline: Any, reach_m: float) -> tuple[Note, ...]:
    """Name the plots that the terrain's edge is too near to.

    Parameters
    ----------
    plots : Plots
    outline : shapely geometry, EPSG:4326
    reach_m : float
        How far the ground upwind is looked at. [m]
    """
    fit = plots.table[plots.table["outcome"] == ""]
    lon, lat = fit["lon"].to_numpy(dtype=np.float64), fit["lat"].to_numpy(dtype=np.float64)
    # degrees of longitude shrunk to those of latitude, so that the nearest point of the edge is the nearest on the
    # ground; its distance is then measured along the ellipsoid
    shrink = np.array([np.cos(np.radians(np.median(lat))), 1.0])
    edge = shapely.transform(shapely.boundary(outline), lambda xy: xy * shrink)
    lines = shapely.shortest_line(shapely.points(lon * shrink[0], lat), edge)
    end = shapely.get_coordinates(shapely.get_point(lines, 1)) / shrink
    near = np.asarray(WGS84.inv(lon, lat, end[:, 0], end[:, 1])[2]) < reach_m
    if not near.any():
        return ()
    names = fit["plot"].to_numpy(dtype=object)[near]
    shown = ", ".join(names[:8]) + (" …" if len(names) > 8 else "")
    one = len(names) == 1
    text = (
        f"{len(names)} plot{' lies' if one else 's lie'} within {reach_m / 1000.0:g} km of the terrain's edge "
        f"({shown}): {'its' if one else 'their'} wind and shelter will be unknown where wind comes from there. Add the "
        "neighbouring terrain tiles."
    )
    return (Note("warning", "terrain", text),)


def check_sea_level(shore: Shore, terrain: Terrain, outline: Any, read_as_land: bool) -> tuple[Note, ...]:
    """Refuse a shore layer under whose sea the terrain has high ground; say where its sea is level, but not at 0 m.

    Parameters
    ----------
    shore : Shore
    terrain : Terrain
    outline : shapely geometry, EPSG:4326
    read_as_land : bool
        Whether the brief calls the polygons land, so that the sea is what they leave.

    Returns
    -------
    tuple of Note

    Raises
    ------
    InputError
        If at least nine in ten of 40 fixed places in the mapped sea stand above 30 m, and are not level.
    """
    lon, lat = _places_in_sea(shore, outline)
    sampled = replace(terrain)  # a copy, since a terrain counts the ground that is read
    heights: list[float] = []
    unknown = 0
    for block, x, y in zip(blocks_of(lon, lat, terrain.cell_size_m), lon, lat, strict=True):
        east, north = Transformer.from_crs("EPSG:4326", block.crs, always_xy=True).transform(x, y)
        half = terrain.cell_size_m / 2.0
        cell = Grid(block.crs, east - half, north + half, 2.0 * half, 1, 1)
        height = float(sampled.elevation(cell).values[0, 0])
        if np.isnan(height):
            unknown += 1
        else:
            heights.append(height)
        at_zero = sum(abs(one) <= ZERO_WITHIN_M for one in heights)
        if at_zero > (1.0 - HIGH_SHARE) * len(lon) or unknown > len(lon) / 2:
            return ()  # a sea, or one that the terrain says nothing of
    if not heights:
        return ()
    if np.subtract(*np.percentile(heights, [75, 25])) < LEVEL_M:
        return _level_notes(float(np.median(heights)))
    if sum(one > HIGH_M for one in heights) < HIGH_SHARE * len(lon):
        return ()
    name, highest = shore.stamp.name, max(heights)
    if read_as_land:
        raise InputError(
            f"{name} looks like water, not land: outside it the ground rises to {highest:.0f} m over the sea",
            "polygons that are what the brief calls them are needed",
            'If they are water, write kind = "sea" or "lake" under [shore] (--shore-kind on the command line)',
        )
    raise InputError(
        f"{name} looks like land, not sea: under it the ground rises to {highest:.0f} m over the sea",
        "polygons that are what the brief calls them are needed",
        'If they are land, write kind = "land" under [shore] (--shore-kind land on the command line)',
    )


def _level_notes(sea_m: float) -> tuple[Note, ...]:
    """What a level sea at some height says of the heights."""
    if abs(sea_m) <= ZERO_WITHIN_M:
        return ()
    text = (
        f"The mapped sea stands at {sea_m:.0f} m in the terrain, not at 0 m: its heights seem to count from another "
        "level than the sea's (the ellipsoid, perhaps). Elevations are off by as much, and with them the climate zones "
        f"by altitude{' and everything that looks over the shore' if sea_m < 0 else ''}. Use heights above mean sea "
        "level."
    )
    return (Note("warning", "terrain", text),)


def _places_in_sea(shore: Shore, outline: Any) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Up to 40 places on the terrain and in the mapped sea, the same in every run. [°]"""
    sea = shore.waters.geometry.values[(shore.waters["kind"] == "sea").to_numpy()]
    none = np.empty(0)
    if len(sea) == 0:
        return none, none
    west, south, east, north = (float(value) for value in outline.bounds)
    here = shapely.clip_by_rect(shapely.union_all(sea), west, south, east, north)
    if here.is_empty:
        return none, none
    shapely.prepare(here)
    shapely.prepare(outline)
    west, south, east, north = (float(value) for value in here.bounds)
    chance = np.random.default_rng(20)
    lon, lat = chance.uniform(west, east, 20 * SAMPLES), chance.uniform(south, north, 20 * SAMPLES)
    inside = shapely.contains_xy(here, lon, lat) & shapely.contains_xy(outline, lon, lat)
    return lon[inside][:SAMPLES], lat[inside][:SAMPLES]


__all__ = ["check_sea_level", "edge_notes", "refuse_both_sides_of_180", "refuse_without_plots"]

"""The ground of one block: every terrain quantity that later stages ask for, derived once."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from sitescreen.grid import Field
from sitescreen.settings import TerrainSettings
from sitescreen.terrain.buildable import chance_buildable
from sitescreen.terrain.flat_water import FlatWater, flat_water
from sitescreen.terrain.hollows import Hollows, hollows
from sitescreen.terrain.horizon import HorizonConsumer, horizon_stream
from sitescreen.terrain.position import rise_m
from sitescreen.terrain.sky_view import SkySum, even_azimuths
from sitescreen.terrain.slope import Gradient, gradient, slope_and_aspect

STRIP_CELLS = 3.0
"""Unknown ground this close to mapped water takes its level, as other gaps of that width are closed. [cells]"""


@dataclass(frozen=True)
class Ground:
    """What the terrain stage knows of a block. ``over_water_m``: height over the level of mapped water, NaN on land."""

    elevation: Field
    water_kind: NDArray[np.uint8]
    over_water_m: NDArray[np.float32]
    flat: FlatWater
    gradient: Gradient
    slope: Field
    aspect: Field
    buildable: Field
    rise: Field
    sky_view: Field
    hollows: Hollows


def water_level_m(elevation: Field, water_kind: NDArray[np.uint8]) -> NDArray[np.float32]:
    """Level of the mapped water at each of its cells. [m]

    Parameters
    ----------
    elevation : Field
        Height as read. [m]
    water_kind : uint8 array, shape (rows, cols)
        0 land, 1 sea, 2 lake, as mapped.

    Returns
    -------
    float32 array, shape (rows, cols)
        0 for the sea; for each connected lake the 5th percentile of the heights that the terrain model has inside its
        outline, which low water and ground mapped as lake by mistake hardly move. NaN on land, and in lakes of which
        the terrain model knows no height.
    """
    level = np.where(water_kind == 1, np.float32(0.0), np.float32(np.nan))
    lake = water_kind == 2
    if not lake.any():
        return level
    label, _ = ndimage.label(lake, structure=np.ones((3, 3)))
    for number, where in enumerate(ndimage.find_objects(label), start=1):
        inside = label[where] == number
        heights = elevation.values[where][inside]
        heights = heights[np.isfinite(heights)]
        if heights.size:
            level[where][inside] = np.percentile(heights, 5)
    return level


def with_level_water(elevation: Field, water_kind: NDArray[np.uint8], level_m: NDArray[np.float32]) -> Field:
    """The ground with mapped water at its level wherever the terrain model has a gap, or puts the sea below 0 m.

    Open water is a known, level surface: nothing on it hides the horizon or stops the wind. Mapped water over higher
    ground keeps its height; the disagreement is reported elsewhere.
    """
    values = elevation.values
    gap = np.isnan(values)
    fill = (water_kind > 0) & gap & np.isfinite(level_m)
    fill |= (water_kind == 1) & (values < 0.0)
    filled = np.where(fill, level_m, values) if fill.any() else values
    strip = gap & ~fill
    if strip.any() and np.isfinite(level_m).any():
        # a model's own shore and the mapped one differ by some cells: what lies unknown between them is shore too
        distance, (row, col) = ndimage.distance_transform_edt(~np.isfinite(level_m), return_indices=True)
        strip &= distance <= STRIP_CELLS
        filled = np.where(strip, level_m[row, col], filled)
    if filled is values:
        return elevation
    return Field(filled, elevation.grid, elevation.unit, elevation.what)


def open_to_cold_air(water_kind: NDArray[np.uint8], cell_size_m: float, smallest_km2: float) -> NDArray[np.bool_]:
    """Water over which cold air spreads away: the sea, and lakes of a stated size.

    Parameters
    ----------
    water_kind : uint8 array, shape (rows, cols)
        0 land, 1 sea, 2 lake, as mapped.
    cell_size_m : float
    smallest_km2 : float
        A smaller lake is the bottom of its hollow, not a way out of it. [km²] One cut by the edge of the window may be
        larger beyond it, and counts.

    Returns
    -------
    bool array, shape (rows, cols)
        Ground that is only as level as water, with no water mapped, is never a way out: a valley floor in a model of
        whole metres is as level.
    """
    out = water_kind == 1
    label, count = ndimage.label(water_kind == 2, structure=np.ones((3, 3)))
    if count:
        large = np.bincount(label.ravel()) * (cell_size_m / 1000.0) ** 2 >= smallest_km2
        for edge in (label[0], label[-1], label[:, 0], label[:, -1]):
            large[np.unique(edge)] = True
        large[0] = False
        out |= large[label]
    return np.asarray(out, dtype=np.bool_)


def read_ground(
    elevation: Field,
    stored: Field,
    water_kind: NDArray[np.uint8],
    vertical_error_m: float,
    error_range_m: float,
    settings: TerrainSettings,
    on_horizon: Sequence[HorizonConsumer] = (),
) -> Ground:
    """Derive a block's terrain quantities.

    Parameters
    ----------
    elevation : Field
        Height as read. [m] NaN where unknown.
    stored : Field
        The same, not interpolated: water is told by its being exactly level.
    water_kind : uint8 array, shape (rows, cols)
        0 land, 1 sea, 2 lake, as mapped; all 0 without a shoreline.
    vertical_error_m : float
        One standard deviation of the height. [m]
    error_range_m : float
        Distance over which neighbouring errors resemble one another. [m]
    settings : TerrainSettings
    on_horizon : sequence of HorizonConsumer
        Take the horizon over the ground with level water in each of the sky view's azimuths (``sky_azimuths`` of them,
        evenly spaced from grid north): sun and shelter ride on the one sweep.
    """
    level = water_level_m(elevation, water_kind)
    ground = with_level_water(elevation, water_kind, level)
    flat = flat_water(with_level_water(stored, water_kind, level), settings.smallest_water_km2)
    outlets = open_to_cold_air(water_kind, ground.grid.cell_size_m, settings.smallest_outlet_km2)
    slope = gradient(ground)
    steepness, aspect = slope_and_aspect(ground)
    sky = SkySum(slope)
    horizon_stream(ground, even_azimuths(settings.sky_azimuths), [sky, *on_horizon])
    return Ground(
        elevation=ground,
        water_kind=water_kind,
        over_water_m=ground.values - level,
        flat=flat,
        gradient=slope,
        slope=steepness,
        aspect=aspect,
        buildable=chance_buildable(ground, settings.buildable_limit_pct, vertical_error_m, error_range_m),
        rise=rise_m(ground, settings.rise_radius_m),
        sky_view=sky.sky_view(),
        hollows=hollows(ground, outlets),
    )

"""The ground of one block: every terrain quantity that later stages ask for, derived once."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sitescreen.grid import Field
from sitescreen.settings import TerrainSettings
from sitescreen.terrain.buildable import chance_buildable
from sitescreen.terrain.flat_water import FlatWater, flat_water
from sitescreen.terrain.hollows import Hollows, hollows
from sitescreen.terrain.position import rise_m
from sitescreen.terrain.sky_view import sky_view
from sitescreen.terrain.slope import Gradient, aspect_deg, gradient, slope_deg


@dataclass(frozen=True)
class Ground:
    """What the terrain stage knows of a block."""

    elevation: Field
    water_kind: NDArray[np.uint8]
    flat: FlatWater
    gradient: Gradient
    slope: Field
    aspect: Field
    buildable: Field
    rise: Field
    sky_view: Field
    hollows: Hollows


def at_sea_level(elevation: Field, water_kind: NDArray[np.uint8]) -> Field:
    """The ground with the mapped sea at 0 m wherever the terrain model says nothing, or less than 0, about it.

    Parameters
    ----------
    elevation : Field
        Height as read. [m]
    water_kind : uint8 array, shape (rows, cols)
        0 land, 1 sea, 2 lake, as mapped.

    Returns
    -------
    Field
        Open water is a known, level surface: nothing on it hides the horizon or stops the wind. Mapped sea over higher
        ground keeps its height; the disagreement is reported elsewhere.
    """
    values = elevation.values
    sea = (water_kind == 1) & ~(values >= 0.0)
    if not sea.any():
        return elevation
    return Field(np.where(sea, np.float32(0.0), values), elevation.grid, elevation.unit, elevation.what)


def read_ground(
    elevation: Field,
    water_kind: NDArray[np.uint8],
    vertical_error_m: float,
    error_range_m: float,
    settings: TerrainSettings,
) -> Ground:
    """Derive a block's terrain quantities.

    Parameters
    ----------
    elevation : Field
        Height as read. [m] NaN where unknown.
    water_kind : uint8 array, shape (rows, cols)
        0 land, 1 sea, 2 lake, as mapped; all 0 without a shoreline.
    vertical_error_m : float
        One standard deviation of the height. [m]
    error_range_m : float
        Distance over which neighbouring errors resemble one another. [m]
    """
    ground = at_sea_level(elevation, water_kind)
    flat = flat_water(ground, settings.smallest_water_km2)
    outlets = (water_kind > 0) | (flat.label > 0)
    return Ground(
        elevation=ground,
        water_kind=water_kind,
        flat=flat,
        gradient=gradient(ground),
        slope=slope_deg(ground),
        aspect=aspect_deg(ground),
        buildable=chance_buildable(ground, settings.buildable_limit_pct, vertical_error_m, error_range_m),
        rise=rise_m(ground, settings.rise_radius_m),
        sky_view=sky_view(ground, settings.sky_azimuths),
        hollows=hollows(ground, outlets),
    )

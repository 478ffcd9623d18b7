"""The cold of calm clear nights as a layer: what gathers on each cell, times the strength of the climate there."""

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.cold_strength import plot_strength_k
from sitescreen.climate.normals import plot_climate
from sitescreen.climate.zones import memberships, zone_shares
from sitescreen.grid import Field
from sitescreen.inputs import Inputs
from sitescreen.inputs.zone_map import zone_at
from sitescreen.judgement.profiles import ZoneProfile
from sitescreen.settings import Defaults
from sitescreen.terrain.shore_distance import nearest_shore

FloatArray = NDArray[np.float64]

NODES_M = 1000.0
"""The climate's strength is computed at places so far apart, and linear between: it bends slowly. [m]"""

SHARE, DEFICIT = "cold_share", "cold_deficit_k"
"""Names of the field that measuring gives and of the layer that it becomes."""


def with_cold_deficit(
    fields: Mapping[str, Field],
    inputs: Inputs,
    forced_zone: str | None,
    profiles: Mapping[str, ZoneProfile],
    settings: Defaults,
) -> dict[str, Field]:
    """The fields with the share of cold that gathers turned into how much colder than level ground it is. [K]

    Parameters
    ----------
    fields : mapping of name to Field
        With ``cold_share`` and ``elevation_m``, or those names with one more word for each UTM zone.
    inputs : Inputs
    forced_zone : str, optional
        The zone that the brief states for all ground.
    profiles : mapping of zone to ZoneProfile
    settings : Defaults

    Returns
    -------
    dict of name to Field
        As for a plot on each cell, save that the heat budget of single hollows, which hardly ever binds, is left out.
    """
    out: dict[str, Field] = {}
    for name, field in fields.items():
        if not name.startswith(SHARE):
            out[name] = field
            continue
        ending = name.removeprefix(SHARE)
        strength = _strength_k(fields["elevation_m" + ending], inputs, forced_zone, profiles, settings)
        deficit = np.minimum(strength * field.values, np.float32(settings.cold_layer.deficit_k))
        out[DEFICIT + ending] = Field(deficit, field.grid, "K", "colder than level ground on a calm clear night")
    return out


def _strength_k(
    elevation: Field,
    inputs: Inputs,
    forced_zone: str | None,
    profiles: Mapping[str, ZoneProfile],
    settings: Defaults,
) -> NDArray[np.float32]:
    """The climate's strength at each cell, from nodes. [K]"""
    from pyproj import Transformer
    from scipy.ndimage import distance_transform_edt

    grid = elevation.grid
    apart = max(1, round(NODES_M / grid.cell_size_m))
    rows, cols = (np.unique(np.r_[0:count:apart, count - 1]) for count in grid.shape)
    x, y = np.meshgrid(grid.x_centres_m()[cols], grid.y_centres_m()[rows])
    lon, lat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform(x.ravel(), y.ravel())
    height_m = elevation.values[np.ix_(rows, cols)].astype(np.float64).ravel()
    strength = _at(lon, lat, height_m, grid.crs, inputs, forced_zone, profiles, settings).reshape(x.shape)
    gap = np.isnan(strength)
    if gap.all():
        return np.full(grid.shape, np.nan, dtype=np.float32)
    if gap.any():
        nearest = distance_transform_edt(gap, return_distances=False, return_indices=True)
        strength = strength[tuple(nearest)]
    along = np.array([np.interp(np.arange(grid.cols), cols, row) for row in strength])
    place = np.interp(np.arange(grid.rows), rows, np.arange(float(len(rows))))
    below = np.minimum(place.astype(np.int64), max(len(rows) - 2, 0))
    part = (place - below)[:, None].astype(np.float32)
    along = along.astype(np.float32)
    return np.asarray(along[below] * (1 - part) + along[np.minimum(below + 1, len(rows) - 1)] * part)


def _at(
    lon: FloatArray,
    lat: FloatArray,
    height_m: FloatArray,
    crs: str,
    inputs: Inputs,
    forced_zone: str | None,
    profiles: Mapping[str, ZoneProfile],
    settings: Defaults,
) -> FloatArray:
    """Strength at places, by the same steps as that of plots. [K]"""
    climate = plot_climate(inputs.normals, lon, lat, height_m, settings.zones) if inputs.normals else None
    unknown = np.full(len(lon), np.nan)
    sea_km, lake_km, width_km = unknown, unknown, unknown
    if inputs.shore is not None and climate is None:
        near = nearest_shore(inputs.shore, lon, lat, crs, settings.breeze.lake_width_none_km)
        sea_km, lake_km, width_km = near.sea_distance_m / 1000.0, near.lake_distance_m / 1000.0, near.lake_width_km
    fits = memberships(height_m, sea_km, lake_km, width_km, climate, settings.zones)
    if forced_zone:
        stated = [forced_zone] * len(lon)
    else:
        stated = list(zone_at(inputs.zone_map, lon, lat)) if inputs.zone_map is not None else [""] * len(lon)
    return plot_strength_k(zone_shares(fits, stated, settings.zones, profiles), climate, settings.cold_air)

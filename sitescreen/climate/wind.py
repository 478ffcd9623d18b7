"""How windy the ground is compared with open level ground, sector by sector and over a rose: fields of whole blocks.

Hills speed the wind up by linear theory (:mod:`sitescreen.climate.hill_speed_up`); ground upwind shelters by its angle.
Neutral, moderate wind only: it says nothing of calm nights or of breezes.
"""

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate._wind_kernel import FLOW, POWER, TIME, add_sector, cover_sector, divide_blended
from sitescreen.climate.hill_speed_up import HillFields
from sitescreen.climate.roses import LEAST_AWAY_M, RoseSums, rose_sums, sector_bearings_deg
from sitescreen.climate.wind_cover import CoverFields, closure_of
from sitescreen.grid import Field, Grid
from sitescreen.inputs.wind import WindTable
from sitescreen.settings import WindSettings
from sitescreen.terrain.horizon import upwind_tangent
from sitescreen.terrain.threads import in_bands

FloatArray = NDArray[np.float64]


class Wanted(NamedTuple):
    """One field: a reading in a slot of the wind table."""

    name: str
    reading: str
    slot: str


_SUMS = {
    "ventilation": (FLOW, "flow", "mean wind over that of open level ground"),
    "ridge_exposure": (POWER, "power", "energy-weighted wind over that of open level ground"),
    "sheltered_fraction": (TIME, "time", "share of the wind kept off by upwind ground"),
}
"""Readings that are sums over the sectors of a cell: what is added, with which of the rose's weights, and its name."""

FIELD_READINGS = tuple(_SUMS)


def wind_fields(
    elevation: Field,
    rise: Field,
    hills: HillFields,
    cover: CoverFields | None,
    convergence_deg: float,
    table: WindTable,
    wanted: Sequence[Wanted],
    settings: WindSettings,
) -> dict[str, Field]:
    """Ventilation, ridge exposure and sheltered fraction of every cell, in the slots asked for.

    Parameters
    ----------
    elevation, rise : Field
        Ground, with the sea at its level and canopies' displacement added [m]; and the rise above the 1 km
        surroundings, which is known only where the ground around is: the hills' flow is not trusted beside unknown
        ground.
    hills : HillFields
        Of that ground.
    cover : CoverFields, or None
        Ground cover, where it is given.
    convergence_deg : float
        Bearing of grid north from true north. [°] One number a block: at 20° latitude it varies by 0.25° either way
        across a block of 30 m cells, and by 0.7° across one of 90 m: 0.0002 and 0.0006 in the mean on the demo
        region's ventilation; 3° would make 0.0024, and 0.008 or less in 95 cells of 100 (benchmarks/wind.py). Readings
        of plots do not have this error: see :func:`sitescreen.climate.sector_winds.sector_winds`.
    table : WindTable
        Winds at one or several places.
    wanted : sequence of Wanted
        Readings among :data:`FIELD_READINGS`.

    Returns
    -------
    dict of name to Field
        Speed over that of open level ground, F = min(1 + min(ΔS, 0), W)·(1 + max(ΔS, 0))·R in each sector: a hollow is
        not slowed twice, by its own flow and by its rim. ΔS is bent towards its caps, x → cap·tanh(x/cap). Shelter
        W = 1 − 0.7·smoothstep((tan Sx − 0.10)/0.30) of the largest upwind angle Sx (Winstral & Marks 2002, Hydrol.
        Process. 16:3585–3603); the closure is ours. W by canopies upwind where that is less, and R by roughness, are
        those of :func:`sitescreen.climate._wind_kernel.cover_upwind`; 1 without cover. Then ventilation
        = Σ p·U·F / Σ p·U, ridge exposure = (Σ p·U³·F³ / Σ p·U³)^⅓, so that strong winds count most, and sheltered
        fraction = 1 − Σ p·W / Σ p (high = sheltered). NaN where the ground upwind is unknown in any sector that the
        rose uses, and within 1 km of unknown ground.
    """
    grid = elevation.grid
    sums = np.zeros((len(wanted), *grid.shape), dtype=np.float32)
    closure = closure_of(settings)
    kinds = np.array([_SUMS[one.reading][0] for one in wanted], dtype=np.int64)
    weights = _weights(table, wanted, settings.sectors)
    place, blend = _places(table, grid)
    if not len(blend):
        weights = weights / weights.sum(axis=2, keepdims=True)
    ground, canopy, ln_roughness, how = CoverFields.arrays(cover, settings)
    left, rough = (np.empty(canopy.shape, dtype=np.float32) for _ in range(2))
    for sector, bearing in enumerate(sector_bearings_deg(settings.sectors)):
        if not weights[:, :, sector].any():
            continue
        azimuth = (bearing - convergence_deg) % 360.0
        east, north = math.sin(math.radians(azimuth)), math.cos(math.radians(azimuth))
        tangent = upwind_tangent(elevation, azimuth, settings.shelter_reach_m, settings.receptor_height_m)
        if cover is not None:
            in_bands(
                cover_sector, grid.rows, ground, canopy, ln_roughness, grid.cell_size_m, east, north, how, left, rough
            )
        in_bands(
            add_sector,
            grid.rows,
            tangent.values,
            *hills,
            left,
            rough,
            east,
            north,
            closure,
            kinds,
            np.ascontiguousarray(weights[:, :, sector]),
            place,
            blend,
            sums,
        )
    if len(blend):
        in_bands(divide_blended, grid.rows, blend, weights.sum(axis=2), sums)
    known = np.isfinite(rise.values)
    out = {}
    for one, values in zip(wanted, sums, strict=True):
        kind, _, what = _SUMS[one.reading]
        told = np.cbrt(values) if kind == POWER else values
        out[one.name] = Field(np.where(known, told, np.nan), grid, "1", f"{what}, {one.slot.replace('_', ' ')}")
    return out


def _weights(table: WindTable, wanted: Sequence[Wanted], sectors: int) -> FloatArray:
    """Weight of each sector, shape (places, wanted, sectors)."""

    def of(one: Wanted, number: int) -> FloatArray:
        sums: RoseSums = rose_sums(table.roses[one.slot, number], sectors)
        return np.asarray(getattr(sums, _SUMS[one.reading][1]))

    return np.array([[of(one, number) for one in wanted] for number in range(len(table.places))])


def _places(table: WindTable, grid: Grid) -> tuple[NDArray[np.uint8], FloatArray]:
    """Which place is nearest to each cell; or, for a blended table, where the places lie in rows and columns."""
    from pyproj import Transformer

    nothing = np.zeros((0, 3))
    nearest = np.zeros(grid.shape, dtype=np.uint8)
    if len(table.places) == 1:
        return nearest, nothing
    to_grid = Transformer.from_crs("EPSG:4326", grid.crs, always_xy=True)
    at = np.array([to_grid.transform(lon, lat) for lon, lat in table.places])
    if table.blended:
        step = grid.cell_size_m
        rows, cols = (grid.north_m - at[:, 1]) / step - 0.5, (at[:, 0] - grid.west_m) / step - 0.5
        return nearest, np.column_stack([rows, cols, np.full(len(at), (LEAST_AWAY_M / step) ** 2)])
    x = grid.x_centres_m()[None, :]
    y = grid.y_centres_m()[:, None]
    least = np.full(grid.shape, np.inf, dtype=np.float32)
    for number, (east, north) in enumerate(at):
        distance = np.hypot(x - east, y - north).astype(np.float32)
        closer = distance < least
        nearest[closer] = number
        least[closer] = distance[closer]
    return nearest, nothing

"""How windy the ground is compared with open level ground, in each of 16 sectors and over the year.

Hills speed the wind up by linear theory (:mod:`sitescreen.climate.hill_speed_up`); ground upwind shelters by its angle.
Neutral, moderate wind only: it says nothing of calm nights or of breezes. Ground cover is not looked at yet.
"""

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate._wind_kernel import add_sector
from sitescreen.climate.hill_speed_up import hill_fields
from sitescreen.grid import Field
from sitescreen.inputs.wind import Rose
from sitescreen.settings import WindSettings
from sitescreen.terrain.horizon import upwind_tangent
from sitescreen.terrain.threads import in_bands

SECTORS_DEG = np.arange(16) * 22.5
"""Centres of the wind sectors: the bearing the wind comes from, clockwise from true north. [°]"""

FloatArray = NDArray[np.float64]


class WindFields(NamedTuple):
    """The year's or a slot's wind summed over its sectors; shares of the speed over open level ground."""

    ventilation: Field
    ridge_exposure: Field
    sheltered_fraction: Field


def wind_fields(
    elevation: Field,
    rise: Field,
    convergence_deg: float,
    roses: Sequence[tuple[Rose, Rose]],
    place: NDArray[np.uint8],
    settings: WindSettings,
) -> WindFields:
    """Ventilation, ridge exposure and sheltered fraction of every cell.

    Parameters
    ----------
    elevation, rise : Field
        Ground, with the sea at its level [m]; and the rise above the 1 km surroundings, which is known only where the
        ground around is: the hills' flow is not trusted beside unknown ground.
    convergence_deg : float
        Bearing of grid north from true north. [°] One number a block: at 20° latitude it varies by
        0.25° either way across a block of 30 m cells, and by 0.7° across one of 90 m.
    roses : sequence of (ventilation rose, year rose)
        One pair for each place with a wind table: the slot in which people want air, and the whole year.
    place : uint8 array, shape (rows, cols)
        Which pair serves each cell.

    Returns
    -------
    WindFields
        Speed over that of open level ground, F = min(1 + min(ΔS, 0), W)·(1 + max(ΔS, 0)) in each sector: a hollow is
        not slowed twice, by its own flow and by its rim. ΔS is bent towards its caps, x → cap·tanh(x/cap). Shelter
        W = 1 − 0.7·smoothstep((tan Sx − 0.10)/0.30) of the largest upwind angle Sx (Winstral & Marks 2002, Hydrol.
        Process. 16:3585–3603); the closure is ours. Then ventilation = Σ p·U·F / Σ p·U in the first slot, ridge
        exposure = (Σ p·U³·F³ / Σ p·U³)^⅓ over the year, so that strong winds count most, and sheltered fraction
        = 1 − Σ p·W over the year (high = sheltered). NaN where the ground upwind is unknown in any sector that the rose
        uses, and within 1 km of unknown ground.
    """
    hills = hill_fields(elevation, settings)
    air, energy, kept_off = (np.zeros(elevation.grid.shape, dtype=np.float32) for _ in range(3))
    closure = (
        settings.shelter_from_tangent,
        settings.shelter_span_tangent,
        settings.shelter_most,
        settings.speed_up_least,
        settings.speed_up_most,
    )
    weights = np.array([sector_weights(ventilation, year) for ventilation, year in roses])  # (places, 3, sectors)
    for sector, bearing in enumerate(SECTORS_DEG):
        if not weights[:, :, sector].any():
            continue
        azimuth = (bearing - convergence_deg) % 360.0
        tangent = upwind_tangent(elevation, azimuth, settings.shelter_reach_m, settings.receptor_height_m)
        in_bands(
            add_sector,
            elevation.grid.rows,
            tangent.values,
            *hills,
            math.sin(math.radians(azimuth)),
            math.cos(math.radians(azimuth)),
            closure,
            np.ascontiguousarray(weights[:, :, sector]),
            place,
            air,
            energy,
            kept_off,
        )
    grid = elevation.grid
    known = np.isfinite(rise.values)
    return WindFields(
        Field(
            np.where(known, air, np.nan), grid, "1", "wind speed over that of open level ground, hot-season afternoon"
        ),
        Field(np.where(known, np.cbrt(energy), np.nan), grid, "1", "energy-weighted wind speed ratio, whole year"),
        Field(np.where(known, kept_off, np.nan), grid, "1", "share of the year's wind kept off by upwind ground"),
    )


def sector_weights(ventilation: Rose, year: Rose) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Weights of the 16 sectors for ventilation (p·U), energy (p·U³) and shelter (p), each summing to 1."""
    flow = _by_sector(ventilation, ventilation.share * ventilation.speed_m_s)
    power = _by_sector(year, year.share * year.speed_m_s**3)
    time = _by_sector(year, year.share)
    return flow / flow.sum(), power / power.sum(), time / time.sum()


def _by_sector(rose: Rose, weight: FloatArray) -> FloatArray:
    sector = np.round(rose.direction_deg / 22.5).astype(np.int64) % 16
    return np.asarray(np.bincount(sector, weights=weight, minlength=16), dtype=np.float64)

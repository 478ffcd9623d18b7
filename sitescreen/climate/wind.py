"""How windy the ground is compared with open level ground, in each of 16 sectors and over the year.

Hills speed the wind up by linear theory (:mod:`sitescreen.climate.hill_speed_up`); ground upwind shelters by its angle.
Neutral, moderate wind only: it says nothing of calm nights or of breezes. Ground cover is not looked at yet.
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.hill_speed_up import hill_fields
from sitescreen.grid import Field
from sitescreen.inputs.wind import Rose
from sitescreen.settings import WindSettings
from sitescreen.terrain.horizon import upwind_tangent

SECTORS_DEG = np.arange(16) * 22.5
"""Centres of the wind sectors: the bearing the wind comes from, clockwise from true north. [°]"""

FloatArray = NDArray[np.float64]


def soft_cap(speed_up: NDArray[np.float32], settings: WindSettings) -> NDArray[np.float32]:
    """ΔS bent towards its caps, x → cap·tanh(x/cap), so that linear theory cannot promise storms or dead calm."""
    cap = np.where(speed_up > 0, np.float32(settings.speed_up_most), np.float32(-settings.speed_up_least))
    return np.asarray(cap * np.tanh(speed_up / cap), dtype=np.float32)


def shelter_factor(tangent: NDArray[np.float32], settings: WindSettings) -> NDArray[np.float32]:
    """Speed left behind upwind ground, W = 1 − 0.7·smoothstep((tan Sx − 0.10)/0.30): our closure, no source.

    Parameters
    ----------
    tangent : array
        Tangent of the largest upwind angle Sx (Winstral & Marks 2002, Hydrol. Process. 16:3585–3603). NaN stays NaN.
    """
    t = np.clip((tangent - settings.shelter_from_tangent) / settings.shelter_span_tangent, 0.0, 1.0)
    return np.asarray(1.0 - settings.shelter_most * t * t * (3.0 - 2.0 * t), dtype=np.float32)


def speed_ratio(shelter: NDArray[np.float32], speed_up: NDArray[np.float32]) -> NDArray[np.float32]:
    """Wind speed over that of open level ground, F = min(1 + min(ΔS, 0), W)·(1 + max(ΔS, 0))."""
    slowed = np.minimum(1.0 + np.minimum(speed_up, 0.0), shelter)
    return np.asarray(slowed * (1.0 + np.maximum(speed_up, 0.0)), dtype=np.float32)


class WindFields(NamedTuple):
    """The year's or a slot's wind summed over its sectors; shares of the speed over open level ground."""

    ventilation: Field
    ridge_exposure: Field
    sheltered_fraction: Field


def energy_mean(share: FloatArray, speed_m_s: FloatArray, ratio: FloatArray) -> float:
    """(Σ p·U³·F³ / Σ p·U³)^⅓: the speed ratio that carries the wind's energy, so that strong winds count most."""
    weight = np.asarray(share) * np.asarray(speed_m_s) ** 3
    return float(np.cbrt(np.sum(weight * np.asarray(ratio) ** 3) / np.sum(weight)))


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
        Bearing of grid north from true north. [°] One number a block: it varies by under 0.3° across one.
    roses : sequence of (ventilation rose, year rose)
        One pair for each place with a wind table: the slot in which people want air, and the whole year.
    place : uint8 array, shape (rows, cols)
        Which pair serves each cell.

    Returns
    -------
    WindFields
        ventilation = Σ p·U·F / Σ p·U in the first slot; ridge exposure = (Σ p·U³·F³ / Σ p·U³)^⅓ over the year;
        sheltered fraction = 1 − Σ p·W over the year (high = sheltered). NaN where the ground upwind is unknown in any
        sector that the rose uses, and within 1 km of unknown ground.
    """
    hills = hill_fields(elevation, settings)
    air = np.zeros(elevation.grid.shape, dtype=np.float32)
    energy = np.zeros_like(air)
    open_share = np.zeros_like(air)
    weights = [_sector_weights(ventilation, year) for ventilation, year in roses]
    for sector, bearing in enumerate(SECTORS_DEG):
        used = np.array([[w[k][sector] for w in weights] for k in range(3)], dtype=np.float32)
        if not used.any():
            continue
        azimuth = (bearing - convergence_deg) % 360.0
        tangent = upwind_tangent(elevation, azimuth, settings.shelter_reach_m, settings.receptor_height_m)
        shelter = shelter_factor(tangent.values, settings)
        ratio = speed_ratio(shelter, soft_cap(hills.speed_up(azimuth), settings))
        by_cell = used[:, place] if len(roses) > 1 else used[:, :1, None]
        for total, weight, term in zip((air, energy, open_share), by_cell, (ratio, ratio**3, shelter), strict=True):
            # a sector without wind must not spread its unknown ground: 0 × NaN is NaN
            total += np.where(weight > 0, weight * term, np.float32(0.0))
    grid = elevation.grid
    known = np.isfinite(rise.values)
    return WindFields(
        Field(
            np.where(known, air, np.nan), grid, "1", "wind speed over that of open level ground, hot-season afternoon"
        ),
        Field(np.where(known, np.cbrt(energy), np.nan), grid, "1", "energy-weighted wind speed ratio, whole year"),
        Field(
            np.where(known, 1.0 - open_share, np.nan), grid, "1", "share of the year's wind kept off by upwind ground"
        ),
    )


def _sector_weights(ventilation: Rose, year: Rose) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Normalised weights of the 16 sectors for ventilation (p·U), energy (p·U³) and shelter (p)."""
    flow = _by_sector(ventilation, ventilation.share * ventilation.speed_m_s)
    power = _by_sector(year, year.share * year.speed_m_s**3)
    time = _by_sector(year, year.share)
    return flow / flow.sum(), power / power.sum(), time / time.sum()


def _by_sector(rose: Rose, weight: FloatArray) -> FloatArray:
    sector = np.round(rose.direction_deg / 22.5).astype(np.int64) % 16
    return np.asarray(np.bincount(sector, weights=weight, minlength=16), dtype=np.float64)

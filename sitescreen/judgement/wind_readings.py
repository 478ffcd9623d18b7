"""Readings of the wind: what plots' sectors and a rose come to. The same for a run, a redrawn rose or another slot."""

from collections.abc import Collection, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.roses import RoseSums, rose_sums, roses_at
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.inputs.wind import RAIN, Rose, WindTable
from sitescreen.judgement.profiles import ZoneProfile, wind_slots
from sitescreen.judgement.readings import Readings
from sitescreen.judgement.wind_slots import SLOT_OF, wind_column
from sitescreen.settings import WindSettings

FloatArray = NDArray[np.float64]

EDGE = "the terrain model ends within the upwind distance that shelter needs"
NO_RAIN = "the wind table has no rows for the rainy season"
NO_TABLE = "no wind table was given, so nobody knows where the wind of the rainy season comes from"


@dataclass(frozen=True)
class WindReadings:
    """The wind at plots compared with open level ground, under one rose; arrays of shape (n,).

    NaN where the ground upwind is unknown in a sector that the rose uses.

    Parameters
    ----------
    ventilation : array
        Σ p·U·F / Σ p·U: the mean wind. [1]
    ridge_exposure : array
        (Σ p·U³·F³ / Σ p·U³)^⅓: strong winds count most. [1]
    worst_sector_exposure : array
        Largest F among the sectors that bring a share of the wind's energy worth naming. [1]
    worst_sector_from_deg : array
        Where that wind comes from, clockwise from true north. [°]
    sheltered_fraction : array
        1 − Σ p·W / Σ p: high is sheltered. [1]
    slow_wind_share : array
        Share of the windy time in which the wind is below ``slow_ratio`` of that over open level ground. [1]
    """

    ventilation: FloatArray
    ridge_exposure: FloatArray
    worst_sector_exposure: FloatArray
    worst_sector_from_deg: FloatArray
    sheltered_fraction: FloatArray
    slow_wind_share: FloatArray


def wind_readings(winds: SectorWinds, rose: Rose | RoseSums, settings: WindSettings) -> WindReadings:
    """The readings of plots under a rose.

    Parameters
    ----------
    winds : SectorWinds, n plots
    rose : Rose, or RoseSums of arrays (sectors,) for one wind at all plots or (n, sectors) for each its own
    settings : WindSettings
        ``slow_ratio``, ``worst_energy_least``.

    Returns
    -------
    WindReadings

    Notes
    -----
    Ventilation and shelter are linear in the sectors, exposure a power mean; so a plot's ventilation is the mean of its
    cells', while its exposure is that of its mean wind. Calm counts in none of them. A sector without wind is skipped,
    so that unknown ground there does no harm.
    """
    sums = rose_sums(rose, len(winds.bearing_deg)) if isinstance(rose, Rose) else rose
    shape = winds.speed_ratio.shape
    time, flow, power = (np.broadcast_to(each, shape) for each in (sums.time, sums.flow, sums.power))
    ratio, left = winds.speed_ratio, winds.shelter

    def mean(weight: FloatArray, values: FloatArray) -> FloatArray:
        total, of = np.zeros(shape[0]), np.zeros(shape[0])
        # added sector by sector, so that a plot's sum cannot depend on how many plots stand beside it
        for sector in range(shape[1]):
            counts = weight[:, sector] > 0.0
            total += np.where(counts, weight[:, sector] * values[:, sector], 0.0)
            of += weight[:, sector]
        with np.errstate(invalid="ignore", divide="ignore"):
            return np.asarray(total / of)

    slow = np.where(np.isnan(ratio), np.nan, ratio < settings.slow_ratio)
    energy = np.zeros(shape[0])
    for sector in range(shape[1]):
        energy += power[:, sector]
    strong = power >= settings.worst_energy_least * energy[:, None]
    seen = ~(np.isnan(ratio) & strong).any(axis=1)
    highest = np.where(strong & ~np.isnan(ratio), ratio, -np.inf)
    worst = highest.argmax(axis=1)
    return WindReadings(
        ventilation=mean(flow, ratio),
        ridge_exposure=np.cbrt(mean(power, ratio**3)),
        worst_sector_exposure=np.where(seen, highest.max(axis=1), np.nan),
        worst_sector_from_deg=np.where(seen, winds.bearing_deg[worst], np.nan),
        sheltered_fraction=mean(time, 1.0 - left),
        slow_wind_share=mean(time, slow),
    )


def assumed_columns(table: WindTable, profiles: Mapping[str, ZoneProfile]) -> tuple[str, ...]:
    """The columns of the wind whose slot nobody gave: criteria that look at them keep half their weight."""
    wanted = {*SLOT_OF.items(), *wind_slots(profiles)}
    return tuple(sorted(wind_column(*one) for one in wanted if table.is_assumed(one[1])))


def with_wind(
    readings: Readings,
    winds: SectorWinds,
    table: WindTable,
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    steep_share: FloatArray,
    slots: Collection[tuple[str, str]],
    settings: WindSettings,
) -> Readings:
    """The readings with the wind's added.

    Parameters
    ----------
    readings : Readings, n rows
    winds : SectorWinds, of the same plots
    table : WindTable
    lon_deg, lat_deg : float64 arrays, shape (n,)
        [°], WGS 84.
    steep_share : float64 array, shape (n,)
        Part of each plot where the ground is too steep for the method.
    slots : collection of (reading, slot)
        Further slots that profiles ask for: a column each.
    settings : WindSettings
    """
    values, why = readings.values.copy(), readings.why_unknown.copy()
    wanted = [*((reading, slot) for reading, slot in SLOT_OF.items()), *sorted(slots)]
    by_slot = {
        slot: wind_readings(winds, roses_at(table, slot, lon_deg, lat_deg, settings.sectors), settings)
        for slot in dict.fromkeys(slot for _, slot in wanted)
    }
    for reading, slot in wanted:
        values[wind_column(reading, slot)] = getattr(by_slot[slot], reading)
    values["worst_sector_from_deg"] = by_slot[SLOT_OF["worst_sector_exposure"]].worst_sector_from_deg
    values["wind_outside_share"] = steep_share
    because = EDGE
    values["driving_rain"] = np.nan
    if table.has(RAIN):
        rain = wind_readings(winds, roses_at(table, RAIN, lon_deg, lat_deg, settings.sectors), settings)
        values["driving_rain"] = rain.ridge_exposure
    else:
        because = NO_TABLE if table.assumed else NO_RAIN
    columns = [wind_column(*one) for one in wanted]
    for column, reason in (*((one, EDGE) for one in (*columns, "worst_sector_from_deg")), ("driving_rain", because)):
        missing = np.isnan(values[column].to_numpy(dtype=np.float64))
        if missing.any():
            why[column] = np.where(missing, reason, "")
    return Readings(values, why)


__all__ = [
    "SLOT_OF",
    "RoseSums",
    "SectorWinds",
    "WindReadings",
    "assumed_columns",
    "rose_sums",
    "roses_at",
    "wind_readings",
    "with_wind",
]

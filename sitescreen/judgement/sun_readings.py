"""The readings of the sun: when it reaches a plot past the ground around it, and how strong."""

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.plot_sun import MonthlySun, PlotSkies
from sitescreen.climate.seasons import ASSUMED, FROM_NORMALS, PARTLY, is_weak
from sitescreen.climate.sun_path import DAYS_IN_MONTH
from sitescreen.inputs.sky import ClearSky, SunChoices
from sitescreen.judgement.readings import Readings
from sitescreen.notes import Note

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

SUN_COLUMNS = (
    "sun_cool_morning_h",
    "morning_sun_share",
    "sun_year_h",
    "west_load_kwh_m2",
    "cool_gain_kwh_m2",
    "sun_first_cool_h",
    "sun_last_cool_h",
)

MONTH_NAMES = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")

NO_GROUND = "the terrain model has no data under part of the plot"
NO_MORNING = "the table of clouds leaves no morning sun in the cool season"
NO_SUN = "the ground around hides the sun all day"


def with_sun(readings: Readings, suns: PlotSkies, sun: MonthlySun) -> Readings:
    """The readings with the sun's added.

    Parameters
    ----------
    readings : Readings, n rows
    suns : PlotSkies
    sun : MonthlySun

    Returns
    -------
    Readings
        With ``sun_cool_morning_h`` (hours of sun before it stands highest, a day of the cool season),
        ``morning_sun_share`` (the same against open level ground, so that neither clouds nor latitude count),
        ``sun_year_h`` (a year), ``west_load_kwh_m2`` (light on a west wall, an afternoon of the hot season),
        ``cool_gain_kwh_m2`` (light on the plot's ground, a day of the cool season), ``sun_first_cool_h`` and
        ``sun_last_cool_h`` (clock hours of the first and last sun, cool season), ``sun_first_by_month`` and
        ``sun_last_by_month`` (twelve clock times as text), ``cool_months``, ``hot_months`` (as text). Hours are of
        clear sky where no table of clouds was given, else of sun that clouds leave.
    """
    values, why = readings.values.copy(), readings.why_unknown.copy()
    seasons = suns.seasons
    values["sun_cool_morning_h"] = season_mean(sun.morning_hours, seasons.cool)
    open_h = season_mean(sun.open_morning_hours, seasons.cool)
    morning_h = values["sun_cool_morning_h"].to_numpy(dtype=np.float64)
    no_morning = open_h <= 0.0
    values["morning_sun_share"] = np.where(no_morning, np.nan, morning_h / np.where(no_morning, 1.0, open_h))
    values["sun_year_h"] = 365.0 * season_mean(sun.hours, np.ones_like(seasons.cool))
    values["west_load_kwh_m2"] = season_mean(sun.west_wall_kwh_m2, seasons.hot)
    values["cool_gain_kwh_m2"] = season_mean(sun.ground_kwh_m2, seasons.cool)
    values["sun_first_cool_h"] = season_mean(sun.first_h, seasons.cool)
    values["sun_last_cool_h"] = season_mean(sun.last_h, seasons.cool)
    values["sun_first_by_month"], values["sun_last_by_month"] = _clock_times(sun.first_h), _clock_times(sun.last_h)
    values["cool_months"], values["hot_months"] = _month_names(seasons.cool), _month_names(seasons.hot)
    no_sun = ~np.isnan(sun.hours).any(axis=1)
    for column in SUN_COLUMNS:
        missing = np.isnan(values[column].to_numpy(dtype=np.float64))
        if missing.any():
            told: Any = (
                np.where(no_sun, NO_SUN, NO_GROUND) if column.startswith(("sun_first", "sun_last")) else NO_GROUND
            )
            why[column] = np.where(missing, told, "")
    return Readings(values, why)


def season_mean(by_month: FloatArray, season: BoolArray) -> FloatArray:
    """The mean day of a season.

    Parameters
    ----------
    by_month : float64 array, shape (n, 12)
    season : bool array, shape (n, 12)
        The months that belong to it.

    Returns
    -------
    float64 array, shape (n,)
        Months weighted by their days; NaN where a month of the season is unknown.
    """
    total, days = np.zeros(len(by_month)), np.zeros(len(by_month))
    for month in range(12):  # in a fixed order, so that a plot's sum cannot depend on how many there are
        total += np.where(season[:, month], DAYS_IN_MONTH[month] * by_month[:, month], 0.0)
        days += season[:, month] * DAYS_IN_MONTH[month]
    return np.asarray(total / days)


def _clock_times(hours: FloatArray) -> NDArray[np.object_]:
    """Twelve clock times as one text, such as "06:41 06:48 …"; a dash where there is none."""
    every = np.array([f"{minute // 60:02d}:{minute % 60:02d}" for minute in range(24 * 60)] + ["–"], dtype=object)
    known = np.isfinite(hours)
    minute = np.where(known, np.round(np.where(known, hours, 0.0) * 60.0) % 1440, 1440).astype(np.int64)
    return np.array([" ".join(row) for row in every[minute]], dtype=object)


def _month_names(season: BoolArray) -> NDArray[np.object_]:
    """The months of a season as text, such as "Jun Jul Aug"; "all" for a whole year."""
    kinds, which = np.unique(season, axis=0, return_inverse=True)
    texts = ["all" if row.all() else " ".join(np.array(MONTH_NAMES)[row]) for row in kinds]
    return np.array(texts, dtype=object)[which.ravel()]


def sun_notes(
    suns: Sequence[PlotSkies], lat_deg: FloatArray, sky: ClearSky | None, choices: SunChoices
) -> tuple[Note, ...]:
    """What to say about clouds, clocks and seasons.

    Parameters
    ----------
    suns : sequence of PlotSkies
        Of all blocks.
    lat_deg : float64 array, shape (n,)
        Of all plots. [°]
    sky : ClearSky, optional
    choices : SunChoices
    """
    notes = []
    if sky is None:
        said = (
            "No table of clouds was given: hours of sun and the sun's load are those of a sky without clouds. They "
            "compare plots, and do not say how sunny the climate is."
        )
        notes.append(Note("assumed", "sky", said))
    offsets = sorted({path.utc_offset_h for one in suns for path in one.skies.paths})
    if choices.utc_offset_h is None and offsets:
        clocks = " or ".join(f"{offset:+g} h" for offset in offsets)
        said = (
            f"Clock times of the sun assume universal time {clocks}, the nearest whole hour of longitude. Where clocks "
            "show another time, state utc_offset_h under [sky]."
        )
        notes.append(Note("assumed", "sky", said))
    sources = {one.seasons.source for one in suns}
    if sources & {ASSUMED, PARTLY}:
        weak = " So near the equator that is no more than a guess." if is_weak(lat_deg).any() else ""
        said = (
            "No climate normals were given: a season that the brief does not state is taken to be the three months "
            f"with the least sun above the air (cool), or the most (hot).{weak}"
        )
        notes.append(Note("assumed", "climate", said))
    if FROM_NORMALS in sources:
        if choices.cool_months or choices.hot_months:
            said = "Seasons follow from the climate normals; cool_months and hot_months of the brief were not used."
            notes.append(Note("info", "climate", said))
        for which, months, word in (("is_too_cool", "coolest", "cool"), ("is_too_hot", "hottest", "hot")):
            mild = sum(int((~getattr(one.seasons, which)).sum()) for one in suns)
            if mild:
                said = (
                    f"At {mild} plot(s) no month is too {word} for comfort: the three {months} months stand for the "
                    f"{word} season there."
                )
                notes.append(Note("info", "climate", said))
    return tuple(notes)

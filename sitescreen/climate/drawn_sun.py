"""The sun over one plot, as it is drawn: skyline all round, the sun's arcs past it, and the year by hours."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.plot_sun import PlotSkies, monthly_sun
from sitescreen.climate.sun_path import Skies, lit
from sitescreen.settings import SunSettings

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

NIGHT, SHADED, SUNNY = 0, 1, 2
"""What an hour of the year is, on a clear day."""


@dataclass(frozen=True)
class PlotSun:
    """What the map draws of the sun over one plot. Bearings clockwise from true north, heights above the horizontal.

    Parameters
    ----------
    skyline_deg : float32 array, shape (72,)
        Height of the ground around, seen from just above the plot, towards 0°, 5° … 355°. [°] NaN where no ground is
        known. Values below 0 look down; the sun is then hidden by the level horizon.
    hour : float64 array, shape (steps,)
        Clock hour in the middle of each step of the day. [h]
    elevation_deg, azimuth_deg : float64 arrays, shape (12, steps)
        The sun's arc on the day that stands for each month, January first. [°] Below 0 at night. Shared by plots near
        to one another, and read-only.
    lit : bool array, shape (12, steps)
        Whether the sun stands above the skyline there; where it is up and not lit, the arc is shaded.
    first_h, last_h : float64 arrays, shape (12,)
        Clock hours of the first and the last sun. [h] NaN in a month without sun.
    hour_state : uint8 array, shape (12, 24)
        The strip of year by hour: :data:`NIGHT`, :data:`SHADED` or :data:`SUNNY` for most of the clock hour that begins
        at 0, 1 … 23.
    cool, hot : bool arrays, shape (12,)
        The months of the cool and the hot season.
    utc_offset_h : float
        What the clock is ahead of universal time. [h]
    clock_is_assumed : bool
        Whether that is only the nearest whole hour of longitude, to be said beside every clock time.
    """

    skyline_deg: NDArray[np.float32]
    hour: FloatArray
    elevation_deg: FloatArray
    azimuth_deg: FloatArray
    lit: BoolArray
    first_h: FloatArray
    last_h: FloatArray
    hour_state: NDArray[np.uint8]
    cool: BoolArray
    hot: BoolArray
    utc_offset_h: float
    clock_is_assumed: bool


def drawn_suns(
    parts: Sequence[tuple[Sequence[str], PlotSkies]],
    wanted: Sequence[str],
    settings: SunSettings,
    clock_is_assumed: bool,
) -> dict[str, PlotSun]:
    """The suns of the plots that are drawn.

    Parameters
    ----------
    parts : sequence of (plot ids, PlotSkies)
        One a block.
    wanted : sequence of str
        Plot ids; those without a sun, as their height is unknown, are left out.
    settings : SunSettings
    clock_is_assumed : bool
    """
    ask = set(wanted)
    out: dict[str, PlotSun] = {}
    for plots, suns in parts:
        rows = np.array(
            [row for row, plot in enumerate(plots) if plot in ask and suns.skies.which[row] >= 0], dtype=int
        )
        if not rows.size:
            continue
        some = _rows(suns, rows)
        sun = monthly_sun(some, settings)
        for at, row in enumerate(rows):
            path = some.skies.paths[some.skies.which[at]]
            seen = lit(path, some.skyline_deg[at])
            out[plots[row]] = PlotSun(
                some.skyline_deg[at],
                path.hour,
                path.elevation_deg,
                path.azimuth_deg,
                seen,
                sun.first_h[at],
                sun.last_h[at],
                hour_state(path.hour, path.elevation_deg > 0, seen),
                some.seasons.cool[at],
                some.seasons.hot[at],
                path.utc_offset_h,
                clock_is_assumed,
            )
    return {plot: out[plot] for plot in wanted if plot in out}


def hour_state(hour: FloatArray, is_up: BoolArray, seen: BoolArray) -> NDArray[np.uint8]:
    """What each clock hour mostly is: night, day in shade, or sun.

    Parameters
    ----------
    hour : float64 array, shape (steps,)
        [h]
    is_up, seen : bool arrays, shape (12, steps)
        Whether the sun is above the level horizon, and above the skyline.

    Returns
    -------
    uint8 array, shape (12, 24)
        Night where the sun is up in less than half of the hour's steps; of the others sunny where it is seen in at
        least half of those in which it is up.
    """
    of = np.floor(hour).astype(np.int64)
    state = np.full((12, 24), NIGHT, dtype=np.uint8)
    for one in range(24):
        up, sun = is_up[:, of == one].sum(axis=1), seen[:, of == one].sum(axis=1)
        is_day = 2 * up >= (of == one).sum()
        state[is_day & (up > 0), one] = SHADED
        state[is_day & (up > 0) & (2 * sun >= up), one] = SUNNY
    return state


def _rows(suns: PlotSkies, rows: NDArray[np.int64]) -> PlotSkies:
    """The suns of some plots."""
    seasons = suns.seasons
    return replace(
        suns,
        skyline_deg=suns.skyline_deg[rows],
        skies=Skies(suns.skies.paths, suns.skies.which[rows]),
        seasons=seasons._replace(
            cool=seasons.cool[rows],
            hot=seasons.hot[rows],
            is_too_cool=seasons.is_too_cool[rows],
            is_too_hot=seasons.is_too_hot[rows],
        ),
        sky_view=suns.sky_view[rows],
        normal=suns.normal[rows],
    )

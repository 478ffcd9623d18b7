"""The bearing of a building's long axis that costs least: sun on the long faces, and wind lost or let in, by zone."""

from collections.abc import Iterator, Mapping
from itertools import pairwise
from typing import NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.long_faces import face_load
from sitescreen.climate.plot_sun import PlotSkies, clear_of, morning_share
from sitescreen.climate.sun_path import SunPath
from sitescreen.climate.wall_pressure import BEARINGS_DEG, flow_from_bearing, flow_from_sectors
from sitescreen.settings import SitingSettings, ZoneSiting

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
Rows = NDArray[np.int64]

_MOST_AT_ONCE = 2048
"""Plots whose sun is held in memory together: about 10 MB an array."""


class SitingGround(NamedTuple):
    """What a long axis goes by, a row a plot.

    ``suns``: skylines, suns and seasons. ``breeze_from_deg`` (n,): bearing that the day's breeze comes from [°], NaN
    without. ``breeze_reach`` (n,): 0–1, NaN without. ``flow``: by slot of the wind table, (n, sectors): the wind that
    each sector brings, share of the time × speed over the plot's ground, in any unit; NaN where unknown.
    ``wind_assumed``: nobody gave a wind, so it decides nothing.
    """

    suns: PlotSkies
    breeze_from_deg: FloatArray
    breeze_reach: FloatArray
    flow: Mapping[str, FloatArray]
    wind_assumed: bool


class AxisCosts(NamedTuple):
    """The costs of every whole bearing of the axis, arrays of shape (n, 180) unless said otherwise.

    ``sun``, ``wind``: what each adds to the cost, weighted; their sum is what is made least. ``load_kwh_m2``: sun that
    counts against the bearing, on each long face, a mean day. ``gain_kwh_m2``: beam of cool-season mornings that is
    welcome there. ``air``: the wind that gets through, over one that meets the face square on; NaN where none is known.
    ``wind_from_deg`` (n,): main bearing of the wind of the leading zone [°], NaN where it is unknown
    or comes from all sides alike. ``by_breeze`` (n,): that wind is the breeze of sea or lake.
    """

    sun: FloatArray
    wind: FloatArray
    load_kwh_m2: FloatArray
    gain_kwh_m2: FloatArray
    air: FloatArray
    wind_from_deg: FloatArray
    by_breeze: BoolArray


class LongAxis(NamedTuple):
    """The best axis of each plot, arrays of shape (n,); NaN where it is unknown.

    ``bearing_deg``: 0–179 [°]. ``wind_incidence_deg``: angle between the wind and the normal of the long face that it
    meets, 0 = square on, 90 = along it [°]. ``from_all_sides``: why that angle is unknown although a wind is known.
    """

    bearing_deg: FloatArray
    wind_incidence_deg: FloatArray
    from_all_sides: BoolArray


def long_axis(ground: SitingGround, shares: pd.DataFrame, albedo: float, settings: SitingSettings) -> LongAxis:
    """The bearing of the long axis that costs least on each plot.

    Parameters
    ----------
    ground : SitingGround, n rows
    shares : DataFrame, n rows
        The share of each zone in each plot, as :class:`sitescreen.climate.zones.ZoneShares` has them.
    albedo : float
    settings : SitingSettings

    Returns
    -------
    LongAxis
        NaN for plots without a firm zone or without a sun (their height is unknown). Ties go to the bearing nearer
        east–west, then to the smaller.
    """
    count = len(ground.breeze_reach)
    out = LongAxis(np.full(count, np.nan), np.full(count, np.nan), np.zeros(count, dtype=np.bool_))
    for rows, costs in axis_costs(ground, shares, np.arange(count), albedo, settings):
        bearing = best_bearing(costs.sun + costs.wind, settings.tie_cost)
        out.bearing_deg[rows] = bearing
        out.wind_incidence_deg[rows] = incidence_deg(costs.wind_from_deg, bearing)
        out.from_all_sides[rows] = np.isfinite(costs.air[:, 0]) & np.isnan(costs.wind_from_deg)
    return out


def axis_costs(
    ground: SitingGround, shares: pd.DataFrame, rows: Rows, albedo: float, settings: SitingSettings
) -> Iterator[tuple[Rows, AxisCosts]]:
    """The costs of all bearings on some plots, a few at a time.

    Parameters
    ----------
    ground, shares, albedo, settings
        As for :func:`long_axis`.
    rows : int64 array
        The plots wanted.

    Yields
    ------
    rows : int64 array
        Some of those wanted; plots without a zone or a sun never come.
    costs : AxisCosts
    """
    share = shares.to_numpy(dtype=np.float64)
    can = rows[(share[rows].sum(axis=1) > 0) & (ground.suns.skies.which[rows] >= 0)]
    by_sky = can[np.argsort(ground.suns.skies.which[can], kind="stable")]
    which = ground.suns.skies.which[by_sky]
    edges = [*np.flatnonzero(np.diff(which, prepend=-1)).tolist(), len(by_sky)]
    for first, last in pairwise(edges):
        for start in range(first, last, _MOST_AT_ONCE):
            some = by_sky[start : min(start + _MOST_AT_ONCE, last)]
            path = ground.suns.skies.paths[int(which[first])]
            yield some, _costs(ground, shares.columns.tolist(), share[some], some, path, albedo, settings)


def best_bearing(cost: FloatArray, tie: float) -> FloatArray:
    """The bearing of least cost in each row; of those within ``tie`` of it the nearest to 90°, then the smaller. [°]"""
    by_preference = np.lexsort((BEARINGS_DEG, np.abs(BEARINGS_DEG - 90)))
    within = cost[:, by_preference] <= cost.min(axis=1)[:, None] + tie
    return np.asarray(BEARINGS_DEG[by_preference[within.argmax(axis=1)]], dtype=np.float64)


def incidence_deg(wind_from_deg: FloatArray, bearing_deg: FloatArray) -> FloatArray:
    """Angle between a wind and the normal of the long face that it meets. [°] 0 = square on, 90 = along the face."""
    return np.asarray(np.abs((wind_from_deg - bearing_deg) % 180.0 - 90.0))


def _costs(
    ground: SitingGround,
    zones: list[str],
    share: FloatArray,
    rows: Rows,
    path: SunPath,
    albedo: float,
    settings: SitingSettings,
) -> AxisCosts:
    """The costs on plots under one sun, zone by zone, blended by the zones' shares."""
    sun, wind, load, gain = (np.zeros((len(rows), BEARINGS_DEG.size)) for _ in range(4))
    air = np.full((len(rows), BEARINGS_DEG.size), np.nan)
    wind_from = np.full(len(rows), np.nan)
    by_breeze = np.zeros(len(rows), dtype=np.bool_)
    leading = share.argmax(axis=1)
    for column, zone in enumerate(zones):
        inside = share[:, column] > 0.0
        if not inside.any():
            continue
        here = np.arange(len(rows))[inside]
        wants = settings.zones.get(zone, settings.own_zone)
        part = share[here, column][:, None]
        against, welcome = _sun(ground, rows[here], path, albedo, wants)
        sun[here] += part * wants.weights.sun * _between_extremes(against - wants.sun.welcome_morning * welcome)
        load[here] += part * against
        gain[here] += part * welcome
        blow = _blow(ground, rows[here], wants, settings)
        lost = blow.air if wants.air.kind == "unwanted" else 1.0 - blow.air
        wind[here] += part * wants.weights.wind * np.where(np.isnan(lost), 0.0, lost)
        leads = leading[here] == column
        air[here[leads]] = blow.air[leads]
        wind_from[here[leads]] = blow.from_deg[leads]
        by_breeze[here[leads]] = blow.is_breeze[leads]
    return AxisCosts(sun, wind, load, gain, air, wind_from, by_breeze)


def _sun(
    ground: SitingGround, rows: Rows, path: SunPath, albedo: float, wants: ZoneSiting
) -> tuple[FloatArray, FloatArray]:
    """Sun against a bearing, and welcome sun, on each long face. [kWh/m² a day] Both (rows, 180)."""
    suns = ground.suns
    hot, cool = suns.seasons.hot[rows], suns.seasons.cool[rows]
    skyline, view = suns.skyline_deg[rows], np.where(np.isnan(suns.sky_view[rows]), 1.0, suns.sky_view[rows])
    months = np.where(hot, wants.sun.hot, np.where(cool, wants.sun.cool, wants.sun.between))
    load = face_load(path, skyline, view, months, clear_of(path, suns.clear_share), albedo)
    against = load.beam_kwh_m2 + load.sky_kwh_m2[:, None]
    if wants.sun.welcome_morning == 0.0:
        return against, np.zeros_like(against)
    clear_mornings = morning_share(path) * (1.0 if suns.clear_share is None else suns.clear_share[:, :1])
    mornings = face_load(path, skyline, view, cool.astype(np.float64), clear_mornings, albedo)
    return against, mornings.beam_kwh_m2


def _between_extremes(values: FloatArray) -> FloatArray:
    """Each row from 0 at its least to 1 at its most; 0 where all are alike."""
    least, most = values.min(axis=1)[:, None], values.max(axis=1)[:, None]
    span = most - least
    # a difference in the last digits is none
    differ = span > 1e-9 * np.maximum(np.abs(most), np.abs(least))
    return np.asarray(np.divide(values - least, span, out=np.zeros_like(values), where=differ))


class _Blow(NamedTuple):
    """The wind of a zone: through flow by bearing (n, 180), main bearing (n,), whether it is the breeze (n,)."""

    air: FloatArray
    from_deg: FloatArray
    is_breeze: BoolArray


def _blow(ground: SitingGround, rows: Rows, wants: ZoneSiting, settings: SitingSettings) -> _Blow:
    """The wind that a zone asks about: its breeze where there is one, else that of its slot."""
    bearing = ground.breeze_from_deg[rows]
    is_breeze = (ground.breeze_reach[rows] >= settings.breeze_reach_least) & np.isfinite(bearing)
    is_breeze &= wants.air.kind == "breeze"
    air, from_deg = np.full((len(rows), BEARINGS_DEG.size), np.nan), np.full(len(rows), np.nan)
    if not ground.wind_assumed:
        flow = ground.flow[wants.air.slot][rows]
        total = _sum_of_sectors(flow)
        known = np.isfinite(total) & (total > 0.0)
        part = flow[known] / total[known][:, None]
        through = flow_from_sectors(part.shape[1])
        air[known] = sum(part[:, sector, None] * by_axis for sector, by_axis in enumerate(through))
        from_deg[known] = main_bearing(part, settings.wind_along_line_least)
    # a breeze is known to a degree at best
    whole = np.rint(bearing[is_breeze]).astype(np.int64)
    air[is_breeze] = flow_from_bearing()[(BEARINGS_DEG[None, :] - whole[:, None]) % 180]
    from_deg[is_breeze] = bearing[is_breeze]
    return _Blow(air, from_deg, is_breeze)


def main_bearing(part: FloatArray, along_line_least: float) -> FloatArray:
    """The bearing that winds mainly come from.

    Parameters
    ----------
    part : float64 array, shape (n, sectors)
        Share of each sector from north on, clockwise; summing to 1.
    along_line_least : float
        How far winds must keep to one line, 0–1.

    Returns
    -------
    float64 array, shape (n,)
        [°] The mean line of the winds, from its stronger end: a house with openings on both long faces takes winds from
        either end alike, so winds that turn round with the season do not cancel. NaN where they keep to no line.
    """
    sectors = part.shape[1]
    centre = np.radians(np.arange(sectors) * (360.0 / sectors))
    east, north = _sum_of_sectors(part * np.sin(2 * centre)), _sum_of_sectors(part * np.cos(2 * centre))
    line = 0.5 * np.arctan2(east, north)
    end = sum(part[:, sector] * np.cos(centre[sector] - line) for sector in range(sectors))
    bearing = np.degrees(np.where(end < 0.0, line + np.pi, line)) % 360.0
    return np.where(np.hypot(east, north) < along_line_least, np.nan, bearing)


def _sum_of_sectors(values: FloatArray) -> FloatArray:
    return np.asarray(np.cumsum(values, axis=1)[:, -1], dtype=np.float64)

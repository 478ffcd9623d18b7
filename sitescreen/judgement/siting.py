"""Siting hints of single plots: the long axis with what turning it costs, the contour, row spacing and eaves."""

import math
from collections.abc import Sequence
from dataclasses import asdict, dataclass
from typing import Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.row_spacing import farthest_reach
from sitescreen.climate.seasons import ASSUMED
from sitescreen.climate.sun_path import lit
from sitescreen.judgement.long_axis import AxisCosts, SitingGround, axis_costs, best_bearing, incidence_deg
from sitescreen.judgement.siting_words import sentences
from sitescreen.settings import SitingSettings

FloatArray = NDArray[np.float64]

TURNS_DEG = (10, 20, 30)
"""How far the axis is turned, either way, to see what that costs. [°]"""

COST_STEP_DEG = 5
"""The curve of costs is kept at bearings so far apart. [°]"""

_AT_BEST_DEG = 5.0
"""An axis this near to the best bearing of sun or wind alone serves it: our choice, no source. [°]"""


class Turn(NamedTuple):
    """What turning the axis by ``turn_deg`` costs. [%]

    ``smaller_pct``, ``larger_pct``: cost when turned that far to a smaller or a larger bearing, of what the worst
    bearing would cost. The others hold for the worst place within the turn either way: ``sun_pct`` more unwanted sun on
    the long walls, ``morning_pct`` less of the welcome morning sun, ``air_pct`` change of the wind that gets through,
    negative where it is wanted, positive where it is not, None where no wind is known.
    """

    turn_deg: int
    smaller_pct: float
    larger_pct: float
    sun_pct: float
    morning_pct: float
    air_pct: float | None


class Eave(NamedTuple):
    """How far the eave of the wall that faces ``face_deg`` must stand out [m]; None beyond a reasonable size."""

    face_deg: float
    projection_m: float | None


@dataclass(frozen=True)
class PlotSiting:
    """The siting hint of one plot.

    Parameters
    ----------
    axis_deg : int
        Bearing of the long axis, 0–179. [°]
    decided_by : str
        "sun", "wind" or "both".
    sun_axis_deg, wind_axis_deg : float or None
        Bearing that each would have alone; None where all bearings are alike to it. [°]
    wind : str
        "sea breeze", "lake breeze", "wind", or "" where none is known.
    wind_wanted : bool
        Whether the zone wants it in.
    wind_from_deg, wind_incidence_deg : float or None
        Where it mainly comes from, and its angle to the normal of the long wall, 0 = square on. [°]
    cost_pct : tuple of float
        Cost of the bearings 0, 5 … 175°, from 0 at the best to 100 at the worst. [%]
    turns : tuple of Turn
    contour_deg : int or None
        Bearing of the contour where the ground is steep. [°]
    contour_cost_pct : float or None
        As ``cost_pct``, of that bearing.
    rows_for : str
        "air", "sun" or "shade": what the spacing of rows serves.
    row_gap_heights, row_gap_m : float or None
        Clear gap between rows, in heights of the eaves and in metres; None where there is none to name.
    eaves : tuple of Eave
        Of both long walls; none in zones that want all the sun they get.
    says : tuple of str
        All that in plain sentences.
    """

    axis_deg: int
    decided_by: str
    sun_axis_deg: float | None
    wind_axis_deg: float | None
    wind: str
    wind_wanted: bool
    wind_from_deg: float | None
    wind_incidence_deg: float | None
    cost_pct: tuple[float, ...]
    turns: tuple[Turn, ...]
    contour_deg: int | None
    contour_cost_pct: float | None
    rows_for: str
    row_gap_heights: float | None
    row_gap_m: float | None
    eaves: tuple[Eave, ...]
    says: tuple[str, ...] = ()

    def for_page(self) -> dict[str, Any]:
        """The hint as plain data."""
        return asdict(self) | {
            "turns": [one._asdict() for one in self.turns],
            "eaves": [one._asdict() for one in self.eaves],
        }


def plot_sitings(
    ground: SitingGround,
    shares: pd.DataFrame,
    values: pd.DataFrame,
    rows: NDArray[np.int64],
    albedo: float,
    settings: SitingSettings,
) -> dict[str, PlotSiting]:
    """The siting hints of some plots.

    Parameters
    ----------
    ground, shares
        As for :func:`sitescreen.judgement.long_axis.long_axis`.
    values : DataFrame, n rows, indexed by plot
        Readings: ``slope_deg``, ``aspect_deg``, ``shore_kind``.
    rows : int64 array
        The plots wanted.
    albedo : float
    settings : SitingSettings

    Returns
    -------
    dict of plot to PlotSiting
        Without plots whose axis is unknown.
    """
    out: dict[str, PlotSiting] = {}
    zones = shares.columns.to_numpy(dtype=object)
    seasons_assumed = ground.suns.seasons.source == ASSUMED
    for some, costs in axis_costs(ground, shares, rows, albedo, settings):
        axis = best_bearing(costs.sun + costs.wind, settings.tie_cost)
        alone = best_alone(costs, settings.tie_cost)
        decided = decided_by(axis, alone)
        leading = zones[shares.to_numpy(dtype=np.float64)[some].argmax(axis=1)]
        slope, aspect = (values[name].to_numpy(dtype=np.float64)[some] for name in ("slope_deg", "aspect_deg"))
        cool_reach, hot_reach = _reaches(ground, some, axis, slope, aspect, settings)
        for k, row in enumerate(some):
            wants = settings.zones.get(leading[k], settings.own_zone)
            is_unwanted = wants.air.kind == "unwanted"
            cost = _cost_pct(costs.sun[k] + costs.wind[k], int(axis[k]))
            contour = _contour(slope[k], aspect[k], settings)
            gap = _gap(wants.rows, float(cool_reach[k].max()), settings)
            hint = PlotSiting(
                axis_deg=int(axis[k]),
                decided_by=decided[k],
                sun_axis_deg=_or_none(alone.sun_deg[k]),
                wind_axis_deg=_or_none(alone.wind_deg[k]),
                wind=_wind(costs, k, str(values["shore_kind"].iat[row])),
                wind_wanted=not is_unwanted,
                wind_from_deg=_or_none(costs.wind_from_deg[k]),
                wind_incidence_deg=_or_none(incidence_deg(costs.wind_from_deg[k : k + 1], axis[k : k + 1])[0]),
                cost_pct=tuple(np.round(cost[::COST_STEP_DEG], 1).tolist()),
                turns=tuple(
                    _turn(costs, k, cost, int(axis[k]), turn, wants.air.kind == "unwanted") for turn in TURNS_DEG
                ),
                contour_deg=contour,
                contour_cost_pct=None if contour is None else round(float(cost[contour]), 1),
                rows_for=wants.rows,
                row_gap_heights=gap,
                row_gap_m=None if gap is None else round(gap * settings.eaves_height_m, 1),
                eaves=_eaves(axis[k], hot_reach[k], settings) if wants.eaves else (),
            )
            slope_pct = 100.0 * math.tan(math.radians(slope[k])) if contour is not None else 0.0
            says = sentences(hint, slope_pct, ground.wind_assumed, seasons_assumed, settings)
            out[str(values.index[row])] = PlotSiting(**(vars(hint) | {"says": says}))
    return out


class BestAlone(NamedTuple):
    """The bearing that each would have alone, arrays of shape (n,). [°] NaN where all bearings are alike to it."""

    sun_deg: FloatArray
    wind_deg: FloatArray


def best_alone(costs: AxisCosts, tie: float) -> BestAlone:
    """The bearings that sun and wind would have without one another; of those within ``tie`` the nearest to 90°."""
    return BestAlone(
        *(np.where(np.ptp(part, axis=1) > tie, best_bearing(part, tie), np.nan) for part in (costs.sun, costs.wind))
    )


def decided_by(axis_deg: FloatArray, alone: BestAlone) -> list[str]:
    """Which of the two the axis serves: that whose own best bearing is nearer to it.

    Returns
    -------
    list of "sun", "wind" or "both"
        "both" where it is equally near to either, or within 5° of both. Where no wind is known, or all bearings are
        alike to it, the sun decides; and the other way round.
    """
    turned = (np.abs(best - axis_deg) for best in alone)
    sun, wind = (np.nan_to_num(np.minimum(away, 180.0 - away), nan=np.inf) for away in turned)
    both = (sun == wind) & np.isfinite(sun) | (sun <= _AT_BEST_DEG) & (wind <= _AT_BEST_DEG)
    return [str(who) for who in np.where(both, "both", np.where(wind < sun, "wind", "sun"))]


def _cost_pct(cost: FloatArray, best: int) -> FloatArray:
    """Costs from 0 at the chosen bearing to 100 at the worst; all 0 where none is worse. Shape (180,)."""
    above = np.maximum(cost - cost[best], 0.0)
    most = float(above.max())
    return np.asarray(above / most * 100.0 if most > 0.0 else above)


def _turn(costs: AxisCosts, k: int, cost: FloatArray, best: int, turn: int, unwanted: bool) -> Turn:
    within = (best + np.arange(-turn, turn + 1)) % 180

    def change_pct(values: FloatArray, worst: Any) -> float:
        here = float(values[best])
        return round(100.0 * (float(worst(values[within])) / here - 1.0), 1) if here > 0.0 else 0.0

    air = costs.air[k]
    return Turn(
        turn,
        round(float(cost[(best - turn) % 180]), 1),
        round(float(cost[(best + turn) % 180]), 1),
        change_pct(costs.load_kwh_m2[k], np.max),
        0.0 - change_pct(costs.gain_kwh_m2[k], np.min),
        None if np.isnan(air).any() else change_pct(air, np.max if unwanted else np.min),
    )


def _contour(slope_deg: float, aspect_deg: float, settings: SitingSettings) -> int | None:
    """Bearing of level lines where the ground is steep. [°]"""
    if not 100.0 * math.tan(math.radians(slope_deg)) > settings.contour_from_pct or math.isnan(aspect_deg):
        return None
    return round(aspect_deg + 90.0) % 180


def _wind(costs: AxisCosts, k: int, shore_kind: str) -> str:
    if np.isnan(costs.air[k, 0]):
        return ""
    return f"{shore_kind} breeze" if costs.by_breeze[k] else "wind"


def _reaches(
    ground: SitingGround,
    rows: NDArray[np.int64],
    axis_deg: FloatArray,
    slope_deg: FloatArray,
    aspect_deg: FloatArray,
    settings: SitingSettings,
) -> tuple[FloatArray, FloatArray]:
    """Reach of shadows across both long walls: of rows in cool months on this slope, of eaves in hot ones. (n, 2)"""
    suns = ground.suns
    path = suns.skies.paths[int(suns.skies.which[rows[0]])]
    begin_h, end_h = settings.sun_hours
    in_hours = (path.hour >= begin_h) & (path.hour <= end_h)
    shines = lit(path, suns.skyline_deg[rows]) & in_hours
    slope = np.where(np.isnan(aspect_deg) | np.isnan(slope_deg), 0.0, slope_deg)
    height, azimuth = path.elevation_deg.ravel(), path.azimuth_deg.ravel()
    cool, hot = (
        (shines & months[rows][:, :, None]).reshape(len(rows), -1) for months in (suns.seasons.cool, suns.seasons.hot)
    )
    faces = [(axis_deg + turn) % 360.0 for turn in (90.0, 270.0)]
    return (
        np.stack([farthest_reach(height, azimuth, cool, face, slope, aspect_deg) for face in faces], axis=1),
        np.stack([farthest_reach(height, azimuth, hot, face) for face in faces], axis=1),
    )


def _gap(rows_for: str, cool_reach: float, settings: SitingSettings) -> float | None:
    if rows_for == "air":
        return settings.air_gap_heights
    if rows_for == "sun" and 0.0 < cool_reach <= settings.gap_most_heights:
        return round(cool_reach, 2)
    return None


def _eaves(axis_deg: float, hot_reach: FloatArray, settings: SitingSettings) -> tuple[Eave, ...]:
    faces = ((axis_deg + turn) % 360.0 for turn in (90.0, 270.0))
    needed = (settings.shaded_wall_m * float(reach) for reach in hot_reach)
    return tuple(
        Eave(float(face), round(metres, 2) if metres <= settings.eave_most_m else None)
        for face, metres in sorted(zip(faces, needed, strict=True))
    )


def _or_none(value: float) -> float | None:
    return None if math.isnan(value) else round(float(value), 1)


__all__: Sequence[str] = ["BestAlone", "Eave", "PlotSiting", "Turn", "best_alone", "decided_by", "plot_sitings"]

"""The overall mark of every plot, its limits, and its rank."""

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.zones import ZoneShares
from sitescreen.errors import ConfigError
from sitescreen.judgement.cautions import Caution, CautionRule, cautions
from sitescreen.judgement.derived import with_derived
from sitescreen.judgement.marks import mark_limits, marks
from sitescreen.judgement.profiles import ZoneProfile
from sitescreen.settings import JudgementSettings

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class ZoneMarks:
    """The plots that have a share in one zone, marked by its profile. Arrays of shape (m,), in the order of ``rows``.

    Parameters
    ----------
    rows : int64 array
        Which plots.
    weights : mapping
        Weight of each criterion in this run; halved where its input is assumed.
    marks, lowest, highest : DataFrame, shape (m, criteria)
        ``mark_<criterion>``; the second and third with unknown readings at their worst and best.
    overall, low, high : float64 arrays
        Weighted means: with unknown marks halfway between their limits, at their lowest, at their highest.
    known_weight_share : float64 array
        Part of the weight whose marks are known, 0–1.
    """

    rows: NDArray[np.int64]
    weights: Mapping[str, float]
    marks: pd.DataFrame
    lowest: pd.DataFrame
    highest: pd.DataFrame
    overall: FloatArray
    low: FloatArray
    high: FloatArray
    known_weight_share: FloatArray


@dataclass(frozen=True)
class Judged:
    """The judgement on every plot.

    Parameters
    ----------
    table : DataFrame, one row a plot in the order of the readings
        rank (Int64, missing where set aside), overall_mark, mark_low, mark_high, zone, zone_share, rank_in_zone,
        cautions, set_aside (reason, or ""), weakest; zone_2, zone_2_share, mark_in_zone, mark_in_zone_2 where zones
        share the plot; zone_provisional, zone_missing; known_weight_share; mark_<criterion> of the leading zone.
    by_zone : mapping of zone to ZoneMarks
    cautions : mapping of plot to its cautions
    facts : DataFrame
        The readings with the derived ones and what is known of the zone, which cautions and reasons speak of.
    halved : frozenset of str
        Criteria, readings or questions whose input is assumed.
    """

    table: pd.DataFrame
    by_zone: Mapping[str, ZoneMarks]
    cautions: Mapping[str, tuple[Caution, ...]]
    facts: pd.DataFrame
    halved: frozenset[str]


def weighted_mean(values: pd.DataFrame, weights: Mapping[str, float]) -> tuple[FloatArray, FloatArray]:
    """Σ w·m / Σ w over the marks that are known, and the part of the weight that is.

    Parameters
    ----------
    values : DataFrame, shape (n, criteria)
        ``mark_<criterion>``; NaN where unknown.
    weights : mapping of criterion to weight

    Returns
    -------
    mean : float64 array, shape (n,)
        NaN where no mark is known.
    known : float64 array, shape (n,)
        0–1.
    """
    total = np.zeros(len(values))
    weight_sum = np.zeros(len(values))
    # added criterion by criterion, so that a plot's mean cannot depend on how many plots stand beside it
    for name, weight in weights.items():
        one = values[f"mark_{name}"].to_numpy(dtype=np.float64)
        is_known = ~np.isnan(one)
        total += np.where(is_known, weight * np.nan_to_num(one), 0.0)
        weight_sum += np.where(is_known, weight, 0.0)
    with np.errstate(invalid="ignore", divide="ignore"):
        return total / weight_sum, weight_sum / sum(weights.values())


def zone_marks(
    readings: pd.DataFrame, rows: NDArray[np.int64], profile: ZoneProfile, halved: Collection[str], factor: float
) -> ZoneMarks:
    """Mark some of the plots by one zone's profile.

    Parameters
    ----------
    readings : DataFrame
        Of all plots, with the derived readings.
    rows : int64 array, shape (m,)
        Which of them.
    profile : ZoneProfile
    halved : collection of str
        Criteria, readings or questions whose input is assumed.
    factor : float
        Part of its weight that such a criterion keeps.
    """
    here = readings.iloc[rows]
    weights = {one.name: one.weight * (factor if one.is_among(halved) else 1.0) for one in profile.criteria}
    known = marks(here, profile)
    lowest, highest = mark_limits(here, profile)
    known_mean, share = weighted_mean(known, weights)
    low, _ = weighted_mean(lowest, weights)
    high, _ = weighted_mean(highest, weights)
    # a gap stands halfway, so that the mark always lies between its limits; without any known mark there is none
    overall = np.where(np.isnan(known_mean), np.nan, np.where(share < 1.0, 0.5 * (low + high), known_mean))
    return ZoneMarks(rows, weights, known, lowest, highest, overall, low, high, share)


def judge(
    readings: pd.DataFrame,
    zones: ZoneShares,
    profiles: Mapping[str, ZoneProfile],
    rules: Sequence[CautionRule],
    settings: JudgementSettings,
    halved: Collection[str] = (),
) -> Judged:
    """Mark, caution and rank plots.

    Parameters
    ----------
    readings : DataFrame, n rows, indexed by plot
        The readings; NaN or "" where unknown. Beside them, for the cautions: ``share_in_water``, ``water_disagrees``,
        ``cells``, and ``outcome`` ("" or why the plot cannot be judged).
    zones : ZoneShares
        Of the same plots.
    profiles : mapping of zone to ZoneProfile
    rules : sequence of CautionRule
    settings : JudgementSettings
    halved : collection of str
        Criteria, readings or questions whose input is assumed: they keep half their weight.

    Returns
    -------
    Judged

    Raises
    ------
    ConfigError
        If a plot lies in a zone that has no profile.

    Notes
    -----
    Overall mark = Σ w·m / Σ w, unknown marks halfway between their limits, blended over the zones that share the plot.
    The rank uses the low mark, in which every unknown reading stands at the worst its curve allows: a gap can cost a
    rank, never win one. Where the zone itself is undecided, the low mark is that of the zone that suits the plot least.
    Marks depend on no other plot, so the order of two plots never depends on a third.
    Plots with equal low marks share a rank.
    """
    told = with_derived(readings)
    by_zone: dict[str, ZoneMarks] = {}
    for zone in zones.shares.columns:
        rows = np.flatnonzero(zones.shares[zone].to_numpy() > 0.0).astype(np.int64)
        if not len(rows):
            continue
        if zone not in profiles:
            raise ConfigError(
                f"plot {readings.index[rows[0]]} lies in the zone {zone!r}, which has no profile",
                f"a profile for it is needed; there are {', '.join(profiles)}",
                "Add one to your folder of profiles",
            )
        by_zone[zone] = zone_marks(told, rows, profiles[zone], halved, settings.assumed_weight_factor)
    table = blended(by_zone, zones, len(readings))
    table.index = readings.index
    titles = {zone: profile.title.lower() for zone, profile in profiles.items()} | {"": ""}
    told = told.assign(
        known_weight_share=table["known_weight_share"],
        zone_provisional=zones.provisional.to_numpy(),
        zone_missing=zones.missing.to_numpy(dtype=object),
        zone_title=table["zone"].map(titles),
        zone_2_title=table["zone_2"].map(titles),
    )
    outcome = _words(readings, "outcome")
    measured = outcome == ""
    raised = cautions(told, zones.zone, rules, measured)
    table["cautions"] = [_in_one_cell(raised.get(str(plot), ())) for plot in readings.index]
    table["set_aside"] = _set_aside(outcome, zones, raised)
    _rank(table, settings)
    table["weakest"] = _weakest(by_zone, zones, profiles, len(readings))
    table["zone_provisional"] = zones.provisional.to_numpy()
    table["zone_missing"] = zones.missing.to_numpy(dtype=object)
    return Judged(_with_marks(table, by_zone, zones, profiles), by_zone, raised, told, frozenset(halved))


def blended(by_zone: Mapping[str, ZoneMarks], zones: ZoneShares, count: int) -> pd.DataFrame:
    """Overall, low and high marks over the zones that share each plot, and the marks of the two leading zones."""
    overall, low, high, known, overall_share = (np.zeros(count) for _ in range(5))
    low_any, high_any = np.full(count, np.inf), np.full(count, -np.inf)
    for zone, one in by_zone.items():
        share = zones.shares[zone].to_numpy(dtype=np.float64)[one.rows]
        has_mark = ~np.isnan(one.overall)
        overall[one.rows] += np.where(has_mark, share * np.nan_to_num(one.overall), 0.0)
        overall_share[one.rows] += np.where(has_mark, share, 0.0)
        low[one.rows] += share * one.low
        high[one.rows] += share * one.high
        known[one.rows] += share * one.known_weight_share
        low_any[one.rows] = np.minimum(low_any[one.rows], one.low)
        high_any[one.rows] = np.maximum(high_any[one.rows], one.high)
    provisional = zones.provisional.to_numpy(dtype=np.bool_)
    has_zone = zones.zone.to_numpy(dtype=object) != ""
    with np.errstate(invalid="ignore", divide="ignore"):
        overall = overall / overall_share
    shares = zones.shares.to_numpy(dtype=np.float64)
    second = np.argsort(-shares, axis=1, kind="stable")[:, 1] if shares.shape[1] > 1 else np.zeros(count, dtype=int)
    second_share = shares[np.arange(count), second]
    names = np.array(zones.shares.columns, dtype=object)
    is_shared = second_share > 0.0
    return pd.DataFrame(
        {
            "overall_mark": overall,
            "mark_low": np.where(has_zone, np.where(provisional, low_any, low), np.nan),
            "mark_high": np.where(has_zone, np.where(provisional, high_any, high), np.nan),
            "zone": zones.zone.to_numpy(dtype=object),
            "zone_share": zones.zone_share.to_numpy(dtype=np.float64),
            "zone_2": np.where(is_shared, names[second], ""),
            "zone_2_share": np.where(is_shared, second_share, np.nan),
            "mark_in_zone": _mark_in(zones.zone.to_numpy(dtype=object), by_zone, count),
            "mark_in_zone_2": _mark_in(np.where(is_shared, names[second], ""), by_zone, count),
            "known_weight_share": np.where(has_zone, known, np.nan),
        }
    )


def _mark_in(zone: NDArray[np.object_], by_zone: Mapping[str, ZoneMarks], count: int) -> FloatArray:
    out = np.full(count, np.nan)
    for name, one in by_zone.items():
        here = zone[one.rows] == name
        out[one.rows[here]] = one.overall[here]
    return out


def _words(readings: pd.DataFrame, column: str) -> NDArray[np.object_]:
    if column not in readings:
        return np.full(len(readings), "", dtype=object)
    return np.array([word if isinstance(word, str) else "" for word in readings[column]], dtype=object)


def _in_one_cell(alerts: Sequence[Caution]) -> str:
    return "; ".join(f"{alert.level}: {alert.text}" for alert in alerts)


def _set_aside(outcome: NDArray[np.object_], zones: ZoneShares, raised: Mapping[str, tuple[Caution, ...]]) -> list[str]:
    """Why each plot has no rank, "" where it has one."""
    reasons: list[str] = []
    rows = zip(zones.zone.index, outcome, zones.zone, zones.outside, zones.missing, strict=True)
    for plot, told, zone, outside, missing in rows:
        stops = [alert.text for alert in raised.get(str(plot), ()) if alert.level == "stop"]
        if told:
            reasons.append(told)
        elif stops:
            reasons.append("; ".join(stops))
        elif outside:
            reasons.append("outside the six climate zones: none fits, so it has no firm zone")
        elif not zone:
            reasons.append(f"its climate zone is unknown: {missing} is missing")
        else:
            reasons.append("")
    return reasons


def _rank(table: pd.DataFrame, settings: JudgementSettings) -> None:
    """Ranks by the low mark; marks that differ by less than the tie are equal."""
    ranked = table["set_aside"] == ""
    steps = np.rint(table["mark_low"].where(ranked) / settings.mark_tie)
    table["rank"] = (-steps).rank(method="min").astype("Int64")
    table["rank_in_zone"] = (-steps).groupby(table["zone"]).rank(method="min").astype("Int64")


def _weakest(
    by_zone: Mapping[str, ZoneMarks], zones: ZoneShares, profiles: Mapping[str, ZoneProfile], count: int
) -> NDArray[np.object_]:
    """Title and mark of the lowest known mark in the leading zone; "" where none is known."""
    out = np.full(count, "", dtype=object)
    leading = zones.zone.to_numpy(dtype=object)
    for zone, one in by_zone.items():
        titles = [criterion.title for criterion in profiles[zone].criteria]
        values = np.where(one.marks.isna(), np.inf, one.marks.to_numpy(dtype=np.float64))
        lowest = values.argmin(axis=1)
        smallest = values.min(axis=1)
        for k in np.flatnonzero((leading[one.rows] == zone) & np.isfinite(smallest)):
            out[one.rows[k]] = f"{titles[lowest[k]]} ({smallest[k]:.0f})"
    return out


def _with_marks(
    table: pd.DataFrame, by_zone: Mapping[str, ZoneMarks], zones: ZoneShares, profiles: Mapping[str, ZoneProfile]
) -> pd.DataFrame:
    """The table in its order of columns, with each criterion's mark in the plot's leading zone."""
    leading = zones.zone.to_numpy(dtype=object)
    columns = {
        f"mark_{one.name}": np.full(len(table), np.nan) for profile in profiles.values() for one in profile.criteria
    }
    for zone, one in by_zone.items():
        here = leading[one.rows] == zone
        for name in one.marks:
            columns[name][one.rows[here]] = one.marks[name].to_numpy(dtype=np.float64)[here]
    first = [
        "rank",
        "overall_mark",
        "mark_low",
        "mark_high",
        "zone",
        "zone_share",
        "rank_in_zone",
        "cautions",
        "set_aside",
    ]
    rest = ["weakest", *(name for name in table.columns if name not in {*first, "weakest"})]
    return pd.concat([table[first + rest], pd.DataFrame(columns, index=table.index)], axis=1)

"""Marks in each draw of the data: readings drawn anew, marked as the run marks its own."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.zones import ZoneShares
from sitescreen.judgement.cautions import CautionRule
from sitescreen.judgement.derived import DERIVED_READINGS, with_derived
from sitescreen.judgement.draws import ReadingDraws
from sitescreen.judgement.marks import limits_of
from sitescreen.judgement.overall import Judged
from sitescreen.judgement.profiles import Criterion, ZoneProfile

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class DrawnMarks:
    """The lowest marks of some plots in each draw, as far as they vary.

    Parameters
    ----------
    rows : int64 array, shape (m,)
        Which plots, rising.
    count : int
        Draws; 0 if the data do not vary.
    by_zone : mapping of zone to criterion to float64 array, shape (count, k)
        ``k``: those of the plots that have a share in the zone, in the order of ``rows``. A criterion that is not
        there keeps the run's mark in every draw.
    stopped : bool array, shape (count, m)
        Draws in which a plot would be set aside.
    """

    rows: NDArray[np.int64]
    count: int
    by_zone: Mapping[str, Mapping[str, FloatArray]]
    stopped: NDArray[np.bool_]


def drawn_marks(
    judged: Judged,
    zones: ZoneShares,
    profiles: Mapping[str, ZoneProfile],
    rules: Sequence[CautionRule],
    draws: ReadingDraws,
    rows: NDArray[np.int64],
) -> DrawnMarks:
    """Mark plots in every draw.

    Parameters
    ----------
    judged : Judged
    zones : ZoneShares
        Of the same plots.
    profiles : mapping of zone to ZoneProfile
    rules : sequence of CautionRule
        Those with a stop set plots aside, draw by draw.
    draws : ReadingDraws
        Of the same plots.
    rows : int64 array, shape (m,)
        Which of them.

    Notes
    -----
    Nothing is added to a mark. A reading that a draw could not have counts as it does in the run: at its worst.
    """
    rows = np.sort(rows)
    if not draws.count:
        return DrawnMarks(rows, 0, {}, np.zeros((0, len(rows)), dtype=np.bool_))
    by_zone: dict[str, dict[str, FloatArray]] = {}
    for zone, one in judged.by_zone.items():
        here = one.rows[np.isin(one.rows, rows)]
        vary = [criterion for criterion in profiles[zone].criteria if _looks_at(criterion).intersection(draws.values)]
        if not len(here) or not vary:
            continue
        needed = set().union(*(_looks_at(criterion) for criterion in vary))
        table = with_derived(_drawn_table(judged.facts, draws, here, needed))
        by_zone[zone] = {
            criterion.name: np.ascontiguousarray(limits_of(table, criterion)[0].reshape(len(here), draws.count).T)
            for criterion in vary
        }
    return DrawnMarks(rows, draws.count, by_zone, stopped(judged, zones, rules, draws, rows))


def _looks_at(criterion: Criterion) -> set[str]:
    """The readings that a criterion's mark hangs on."""
    return {criterion.column, *DERIVED_READINGS.get(criterion.reading, ())}


def _drawn_table(facts: pd.DataFrame, draws: ReadingDraws, rows: NDArray[np.int64], needed: set[str]) -> pd.DataFrame:
    """Readings of some plots in every draw: plot by plot, draw by draw within it."""
    columns: dict[str, Any] = {}
    for name in sorted(needed):
        if name in facts:
            run = facts[name].to_numpy()
            columns[name] = draws.of(name, run)[rows].ravel()
    return pd.DataFrame(columns, index=pd.RangeIndex(len(rows) * draws.count))


def stopped(
    judged: Judged, zones: ZoneShares, rules: Sequence[CautionRule], draws: ReadingDraws, rows: NDArray[np.int64]
) -> NDArray[np.bool_]:
    """In which draws a stop sets plots aside.

    Parameters
    ----------
    judged : Judged
    zones : ZoneShares
    rules : sequence of CautionRule
    draws : ReadingDraws
    rows : int64 array, shape (m,)
        Which plots.

    Returns
    -------
    bool array, shape (draws, m)
    """
    out = np.zeros((draws.count, len(rows)), dtype=np.bool_)
    leading = zones.zone.to_numpy(dtype=object)[rows]
    for rule in rules:
        if "stop" not in (rule.level, rule.unknown_level):
            continue
        needed = {condition.reading for condition in rule.when}
        varies = bool(needed.intersection(draws.values))
        table = _drawn_table(judged.facts, draws, rows, needed) if varies else judged.facts.iloc[rows]
        true, undecided = rule.raised(table, np.repeat(leading, draws.count) if varies else leading)
        stops = (true & (rule.level == "stop")) | (undecided & (rule.unknown_level == "stop"))
        out |= stops.reshape(len(rows), draws.count).T if varies else stops[None, :]
    return out

"""What would change the answer: the smallest change of one weight that puts another plot first."""

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.zones import ZoneShares
from sitescreen.judgement.overall import Judged
from sitescreen.judgement.profiles import ZoneProfile
from sitescreen.notes import Note

FloatArray = NDArray[np.float64]

STEP = 1e-7
"""How far beyond a crossing of two marks, in the criterion's share of the mark, the other must lead."""


@dataclass(frozen=True)
class Turn:
    """A change of one weight, beyond which another plot is first.

    Parameters
    ----------
    among : str
        "all", or the zone among whose plots the first is meant.
    first, then_first : str
        Plots.
    profile, criterion : str
        Whose weight.
    title : str
        The criterion in words.
    share_now, share_then : float
        The criterion's part in the mark of its zone, 0–1.
    weight_now, weight_then : float
        In the profile's own terms.
    change_pct : float
        Of the weight. [%]
    spread_pct : float
        By how much experts would disagree about it. [± %]
    """

    among: str
    first: str
    then_first: str
    profile: str
    criterion: str
    title: str
    share_now: float
    share_then: float
    weight_now: float
    weight_then: float
    change_pct: float
    spread_pct: float

    @property
    def in_dispute(self) -> bool:
        """Whether the change lies within what experts would disagree about."""
        return abs(self.change_pct) <= self.spread_pct

    def sentence(self) -> str:
        """In plain words."""
        within = "within" if self.in_dispute else "beyond"
        more = "more" if self.change_pct > 0.0 else "less"
        return (
            f"The smallest change of one weight that takes the first place from plot {self.first}: “{self.title}” in "
            f"the profile {self.profile} at {100 * self.share_then:.1f} % of the mark instead of "
            f"{100 * self.share_now:.1f} % ({abs(self.change_pct):.0f} % {more}); then plot {self.then_first} would be "
            f"first. That is {within} the ± {self.spread_pct:g} % by which experts may differ about it."
        )


class Sway(NamedTuple):
    """What a search for such a change found among some of the plots; no turn where nothing would change the first."""

    among: str
    first: tuple[str, ...]
    turn: Turn | None

    def sentence(self) -> str:
        """In plain words."""
        if len(self.first) > 1:
            return f"The plots {', '.join(self.first)} share the first place, so any change may part them."
        if self.turn is None:
            return f"No change of a single weight would put another plot before plot {self.first[0]}."
        return self.turn.sentence()

    def for_record(self) -> dict[str, Any]:
        """What ``record.json`` keeps of it."""
        turn = {} if self.turn is None else asdict(self.turn) | {"in_dispute": self.turn.in_dispute}
        return {"among": self.among, "first": list(self.first), "says": self.sentence()} | {"turn": turn or None}


def sways(judged: Judged, zones: ZoneShares, profiles: Mapping[str, ZoneProfile]) -> tuple[Sway, ...]:
    """What would change the first place among all ranked plots, and among those of each zone that has several.

    Parameters
    ----------
    judged : Judged
    zones : ZoneShares
        Of the same plots.
    profiles : mapping of zone to ZoneProfile
        Those that the plots were judged by.

    Returns
    -------
    tuple of Sway
        All plots first; none where fewer than two are ranked.
    """
    table = judged.table
    ranked = table["rank"].notna().to_numpy()
    found = [_sway("all", np.flatnonzero(ranked), table["rank"], judged, zones, profiles)] if ranked.sum() > 1 else []
    leading = table["zone"].to_numpy(dtype=object)
    for zone in judged.by_zone:
        here = np.flatnonzero(ranked & (leading == zone))
        if 1 < len(here) < ranked.sum():
            found.append(_sway(zone, here, table["rank_in_zone"], judged, zones, profiles))
    return tuple(found)


def sway_notes(found: tuple[Sway, ...]) -> tuple[Note, ...]:
    """The one about all plots, for everybody to read."""
    return tuple(Note("info", "judgement", one.sentence()) for one in found[:1])


def _sway(
    among: str,
    rows: NDArray[np.int64],
    rank: pd.Series,
    judged: Judged,
    zones: ZoneShares,
    profiles: Mapping[str, ZoneProfile],
) -> Sway:
    """The smallest change among some of the ranked plots.

    Notes
    -----
    In the share x = w/Σw that one criterion has in its zone's mark, the marks of that zone are straight lines:
    (1 − x)·(mean of the other criteria) + x·(its own mark). So is a blended mark, and two of them cross at
    x₀ + (M_A − M_B)/(slope_B − slope_A). A plot whose zone is undecided has the least of its zones' marks: a line that
    is cut off at a level. The weight follows as w = x/(1 − x) · (the other weights).
    """
    ranks = rank.to_numpy(dtype=np.float64, na_value=np.nan)[rows]
    names = judged.table.index.to_numpy()
    first = rows[ranks == np.nanmin(ranks)]
    if len(first) > 1:
        return Sway(among, tuple(str(names[k]) for k in first), None)
    leader = int(np.flatnonzero(rows == first[0])[0])
    best: Turn | None = None
    for zone, one in judged.by_zone.items():
        total = sum(one.weights.values())
        for name, weight in one.weights.items():
            others = total - weight
            if others <= 0.0:
                continue
            lines = _lines(zone, name, rows, judged, zones)
            now = weight / total
            for x, challenger in _crossings(lines, leader, now):
                change_pct = 100.0 * (x / (1.0 - x) * others / weight - 1.0)
                if best is not None and abs(change_pct) >= abs(best.change_pct):
                    continue
                criterion = profiles[zone].by_name[name]
                best = Turn(
                    among, str(names[first[0]]), str(names[rows[challenger]]), zone, name, criterion.title, now, x,
                    criterion.weight, criterion.weight * (1.0 + change_pct / 100.0), change_pct,
                    criterion.weight_spread_pct,
                )  # fmt: skip
    return Sway(among, (str(names[first[0]]),), best)


class _Lines(NamedTuple):
    """Marks of plots as functions of the share x of one criterion: the lesser of at_zero + slope·x and a level."""

    at_zero: FloatArray
    slope: FloatArray
    level: FloatArray

    def at(self, x: FloatArray, plots: Any = slice(None)) -> FloatArray:
        return np.asarray(np.minimum(self.at_zero[plots] + self.slope[plots] * x, self.level[plots]))


def _lines(zone: str, name: str, rows: NDArray[np.int64], judged: Judged, zones: ZoneShares) -> _Lines:
    count = len(judged.table)
    one = judged.by_zone[zone]
    total = sum(one.weights.values())
    share = zones.shares[zone].to_numpy(dtype=np.float64)[rows]
    own, mean = np.zeros(count), np.zeros(count)
    own[one.rows] = one.lowest[f"mark_{name}"].to_numpy(dtype=np.float64)
    mean[one.rows] = one.low
    own, mean = own[rows], mean[rows]
    others = (total * mean - one.weights[name] * own) / (total - one.weights[name])
    level = np.full(count, np.inf)
    for other_zone, other in judged.by_zone.items():
        if other_zone != zone:
            level[other.rows] = np.minimum(level[other.rows], other.low)
    open_zone = zones.provisional.to_numpy(dtype=np.bool_)[rows]
    mark = judged.table["mark_low"].to_numpy(dtype=np.float64)[rows]
    in_zone = share > 0.0
    # the part of a blended mark that this zone has; of an undecided plot the whole line, if it may be in this zone
    part = np.where(open_zone, np.where(in_zone, 1.0, 0.0), share)
    rest = np.where(open_zone, np.where(in_zone, 0.0, mark), mark - share * mean)
    return _Lines(
        rest + part * others, part * (own - others), np.where(open_zone & in_zone, level[rows], np.inf)
    )  # fmt: skip


def _crossings(lines: _Lines, leader: int, now: float) -> list[tuple[float, int]]:
    """The nearest share on either side at which a plot draws level with the leader, and that plot."""
    lead = _Lines(*(part[leader : leader + 1] for part in lines))
    with np.errstate(divide="ignore", invalid="ignore"):
        candidates = (
            (lead.at_zero - lines.at_zero) / (lines.slope - lead.slope),
            (lead.level - lines.at_zero) / lines.slope,  # the leader at its level
            (lines.level - lead.at_zero) / lead.slope,  # the other at its level
        )
    found: list[tuple[float, int]] = []
    for side in (-1.0, 1.0):
        best, plot = np.inf, -1
        for x in candidates:
            fits = np.isfinite(x) & (side * (x - now) >= 0.0) & (x > STEP) & (x < 1.0 - STEP)
            beyond = np.where(fits, x, now) + side * STEP
            fits &= lines.at(beyond) > lead.at(beyond)
            fits[leader] = False
            distance = np.where(fits, side * (x - now), np.inf)
            k = int(np.argmin(distance))
            if distance[k] < best:
                best, plot = float(distance[k]), k
        if plot >= 0:
            found.append((now + side * best, plot))
    return found

"""How certain a rank is, as far as the weights go: the same plots ranked again under many sets of weights."""

import hashlib
import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.zones import ZoneShares
from sitescreen.judgement.other_weights import ZoneWeights, low_marks
from sitescreen.judgement.overall import Judged
from sitescreen.judgement.profiles import ZoneProfile
from sitescreen.notes import Note
from sitescreen.settings import JudgementSettings

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

COLUMNS = (
    "rank_low",
    "rank_high",
    "chance_first",
    "chance_top_quarter",
    "chance_shortlist",
    "chance_first_in_zone",
    "chance_first_any_weights",
    "chance_beats_next",
    "group",
)


@dataclass(frozen=True)
class Certainty:
    """What the trials say.

    Parameters
    ----------
    table : DataFrame, indexed by plot
        ``rank_low`` and ``rank_high`` (best and worst rank of the 5–95 % range), ``chance_first``,
        ``chance_top_quarter``, ``chance_shortlist`` (among the first k), ``chance_first_in_zone``,
        ``chance_first_any_weights`` (if nothing were known of the weights), ``chance_beats_next`` (the plot next in
        rank), ``group`` (plots that cannot be told apart from the first of their group). Missing where a plot has no
        rank or took no part.
    trials : int
    drawn, ranked : int
        Plots that took part, and plots that have a rank.
    """

    table: pd.DataFrame
    trials: int
    drawn: int
    ranked: int

    def for_record(self) -> dict[str, Any]:
        """What ``record.json`` keeps of it."""
        return {
            "trials": self.trials,
            "varied": "weights only, each evenly within the ± % of its profile",
            "plots_in_trials": self.drawn,
            "plots_ranked": self.ranked,
        }

    def notes(self) -> tuple[Note, ...]:
        """What was varied, and what was not."""
        if not self.drawn:
            return ()
        text = (
            f"Rank ranges and chances come from {self.trials:,} trials, each with every weight drawn evenly within the "
            "± % of its profile. They tell how far the ranking hangs on the weights and on nothing else: the terrain "
            "model's error and the wind are not in them yet, and unknown readings stand at their worst throughout."
        )
        notes = [Note("info", "judgement", text)]
        if self.drawn < self.ranked:
            notes.append(
                Note(
                    "warning",
                    "judgement",
                    f"Of {self.ranked:,} ranked plots only the {self.drawn:,} with the highest possible marks took "
                    "part in the trials; the others kept their place against them, and their chances are left empty.",
                )
            )
        return tuple(notes)


def uniform(seed: int, about: str, count: int) -> FloatArray:
    """Even numbers in (0, 1), the same for the same seed and word whatever else is drawn.

    Parameters
    ----------
    seed : int
    about : str
        What is drawn, such as a criterion's name: the key of a counter-based generator (Philox).
    count : int

    Returns
    -------
    float64 array, shape (count,)
    """
    key = int.from_bytes(hashlib.sha256(f"{seed}/{about}".encode()).digest()[:16], "big")
    # the generator's raw words, since how numpy makes floats of them might change
    words = np.random.Philox(key=key).random_raw(count)
    return np.asarray(((words >> np.uint64(12)).astype(np.float64) + 0.5) * 2.0**-52)


def drawn_weights(judged: Judged, profiles: Mapping[str, ZoneProfile], seed: int, trials: int) -> ZoneWeights:
    """One set of weights for all plots and zones: each drawn evenly within its spread.

    A criterion that several zones have moves alike in all of them, by each zone's own spread.
    """
    steps = {name: 2.0 * uniform(seed, f"weight/{name}", trials) - 1.0 for name in _criteria(judged)}
    return {
        zone: {
            name: weight * (1.0 + profiles[zone].by_name[name].weight_spread_pct / 100.0 * steps[name])
            for name, weight in one.weights.items()
        }
        for zone, one in judged.by_zone.items()
    }


def any_weights(judged: Judged, seed: int, trials: int) -> ZoneWeights:
    """Weights of which nothing is known: in every zone all that sum to 1 are equally likely.

    Notes
    -----
    Exponential numbers divided by their sum are even on the simplex (Dirichlet 1, …, 1), as stochastic multicriteria
    acceptability analysis takes them: Lahdelma, Hokkanen & Salminen 1998, Eur. J. Oper. Res. 106:137–143.
    """
    sizes = {name: -np.log(uniform(seed, f"any weight/{name}", trials)) for name in _criteria(judged)}
    return {zone: {name: sizes[name] for name in one.weights} for zone, one in judged.by_zone.items()}


def _criteria(judged: Judged) -> Iterable[str]:
    return dict.fromkeys(name for one in judged.by_zone.values() for name in one.weights)


def ranks_of(steps: FloatArray) -> NDArray[np.int32]:
    """The rank of each plot in each trial; plots with equal marks share the better rank.

    Parameters
    ----------
    steps : float64 array, shape (trials, m)
        Marks; high is good.

    Returns
    -------
    int32 array, shape (trials, m)
        1 is best.
    """
    ranks = np.empty(steps.shape, dtype=np.int32)
    for trial, row in enumerate(steps):
        ranks[trial] = 1 + len(row) - np.searchsorted(np.sort(row), row, side="right")
    return ranks


def certainty(
    judged: Judged,
    zones: ZoneShares,
    profiles: Mapping[str, ZoneProfile],
    seed: int,
    shortlist: int,
    settings: JudgementSettings,
) -> Certainty:
    """Rank the plots again under other weights.

    Parameters
    ----------
    judged : Judged
    zones : ZoneShares
        Of the same plots.
    profiles : mapping of zone to ZoneProfile
        With the spread of each weight.
    seed : int
    shortlist : int
        How many plots the client wants: k.
    settings : JudgementSettings

    Returns
    -------
    Certainty

    Notes
    -----
    A trial ranks by the same low marks as the run does, so ignorance wins in none of them. Above ``trials_plots_most``
    ranked plots only the max(10 k, 200) with the highest ``mark_high`` are drawn; the others keep the place against
    them that they have in the run. (Left at their marks while the drawn ones move, they would win trials in which
    all marks fall.)
    Plots that share the first place are both first.
    """
    table = judged.table
    ranked = np.flatnonzero(table["rank"].notna().to_numpy())
    drawn = _drawn(table, ranked, shortlist, settings)
    empty = pd.DataFrame({name: np.full(len(table), np.nan) for name in COLUMNS}, index=table.index)
    if not len(drawn):
        return Certainty(empty, settings.trials, 0, len(ranked))
    by_rank = drawn[np.argsort(table["rank"].to_numpy(dtype=np.float64)[drawn], kind="stable")]
    zone = table["zone"].to_numpy(dtype=object)
    ahead, ahead_in_zone = _ahead(_steps(table["mark_low"].to_numpy(np.float64), settings), zone, by_rank, ranked)
    free = _steps(low_marks(judged, zones, by_rank, any_weights(judged, seed, settings.trials)), settings)
    first_any = _first(free, ahead)
    del free  # with 5,000 plots 80 MB
    steps = _steps(low_marks(judged, zones, by_rank, drawn_weights(judged, profiles, seed, settings.trials)), settings)
    ranks = ranks_of(steps)
    ranks += ahead.astype(np.int32)
    told: dict[str, Any] = {
        "chance_first": (ranks == 1).mean(axis=0),
        "chance_top_quarter": (ranks <= math.ceil(len(ranked) / 4)).mean(axis=0),
        "chance_shortlist": (ranks <= shortlist).mean(axis=0),
        "chance_first_in_zone": _first_in_zone(steps, zone[by_rank], ahead_in_zone),
        "chance_first_any_weights": first_any,
        "chance_beats_next": np.append(beats(steps[:, :-1], steps[:, 1:]), np.nan),
        "group": groups(steps, settings.told_apart),
    }
    ranks.sort(axis=0)
    told["rank_low"] = ranks[math.ceil(0.05 * settings.trials) - 1]
    told["rank_high"] = ranks[math.ceil(0.95 * settings.trials) - 1]
    for name, values in told.items():
        empty.iloc[by_rank, empty.columns.get_loc(name)] = values
    return Certainty(empty, settings.trials, len(drawn), len(ranked))


def _drawn(table: pd.DataFrame, ranked: IntArray, shortlist: int, settings: JudgementSettings) -> IntArray:
    """Which of the ranked plots take part in the trials."""
    if len(ranked) <= settings.trials_plots_most:
        return ranked
    best = np.argsort(-table["mark_high"].to_numpy(dtype=np.float64)[ranked], kind="stable")
    return np.sort(ranked[best[: max(10 * shortlist, settings.trials_plots_least)]])


def _steps(marks: FloatArray, settings: JudgementSettings) -> FloatArray:
    """Marks in steps of the tie, as the ranks take them."""
    marks = marks / settings.mark_tie
    return np.asarray(np.rint(marks, out=marks))


def _ahead(steps: FloatArray, zone: Any, drawn: IntArray, ranked: IntArray) -> tuple[IntArray, IntArray]:
    """How many plots that take no part stand ahead of each that does, in all and in its zone."""
    left = np.setdiff1d(ranked, drawn)
    in_all = len(left) - np.searchsorted(np.sort(steps[left]), steps[drawn], side="right")
    in_zone = np.zeros(len(drawn), dtype=np.int64)
    for name in dict.fromkeys(zone[drawn]):
        here, others = zone[drawn] == name, np.sort(steps[left[zone[left] == name]])
        in_zone[here] = len(others) - np.searchsorted(others, steps[drawn[here]], side="right")
    return in_all, in_zone


def _first(steps: FloatArray, ahead: IntArray) -> FloatArray:
    """How often each plot has the best mark, if nothing that takes no part is ahead of it."""
    return np.where(ahead == 0, (steps >= steps.max(axis=1, keepdims=True)).mean(axis=0), 0.0)


def _first_in_zone(steps: FloatArray, zone: Any, ahead: IntArray) -> FloatArray:
    out = np.full(steps.shape[1], np.nan)
    for name in dict.fromkeys(zone):
        here = zone == name
        out[here] = _first(steps[:, here], ahead[here])
    return out


def beats(first: FloatArray, second: FloatArray) -> FloatArray:
    """How often the first has the higher mark; equal marks count half. Arrays of shape (trials, m) give (m,)."""
    return np.asarray((first > second).mean(axis=0) + 0.5 * (first == second).mean(axis=0))


def groups(steps: FloatArray, told_apart: float) -> IntArray:
    """Numbers, from 1, of groups of plots that cannot be told apart.

    Parameters
    ----------
    steps : float64 array, shape (trials, m)
        Marks of plots in the order of their ranks.
    told_apart : float
        A group ends before the first plot that its best plot beats at least this often.
    """
    numbers = np.ones(steps.shape[1], dtype=np.int64)
    head = 0
    for plot in range(1, steps.shape[1]):
        if beats(steps[:, head], steps[:, plot]) >= told_apart:
            head = plot
            numbers[plot:] += 1
    return numbers

"""How certain a rank is: the same plots ranked again under other weights and under other draws of the data."""

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.zones import ZoneShares
from sitescreen.judgement.cautions import CautionRule
from sitescreen.judgement.drawn_marks import drawn_marks, stopped
from sitescreen.judgement.draws import NO_DRAWS, ReadingDraws
from sitescreen.judgement.other_weights import ZoneWeights, low_marks, run_weights
from sitescreen.judgement.overall import Judged
from sitescreen.judgement.profiles import ZoneProfile
from sitescreen.judgement.uniform import uniform
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
    "chance_set_aside",
    "rank_low_weights",
    "rank_high_weights",
    "rank_low_data",
    "rank_high_data",
    "drawn_mark_low",
    "drawn_mark_high",
)


class Varied(NamedTuple):
    """One thing that the data's draws vary: in a word or two, and in full."""

    short: str
    in_full: str


TERRAIN, WIND = "the terrain's error", "the wind"
"""What the data's draws can vary, in short; whatever is not among them is said to be left out."""


@dataclass(frozen=True)
class Certainty:
    """What the trials say.

    Parameters
    ----------
    table : DataFrame, indexed by plot
        ``rank_low`` and ``rank_high`` (best and worst rank of the 5–95 % range), ``chance_first``,
        ``chance_top_quarter``, ``chance_shortlist`` (among the first k), ``chance_first_in_zone``,
        ``chance_first_any_weights`` (if nothing were known of the weights), ``chance_beats_next`` (the plot next in
        rank), ``group`` (plots that cannot be told apart from the first of their group), ``chance_set_aside`` (also of
        plots that are, where their ground was drawn);
        the range of ranks if the weights alone vary, or the data alone; ``drawn_mark_low`` and
        ``drawn_mark_high``, the 5–95 % range of the mark that ranks go by. Missing where a plot has no rank or took no
        part.
    trials : int
    draws : int
        Of the data; 0 if the weights alone vary.
    varied : tuple of Varied
        What the data's draws vary.
    drawn, ranked : int
        Plots that took part, and plots that have a rank.
    rank : Series of float, indexed by plot
        The ranks of the run itself; NaN where there is none.
    """

    table: pd.DataFrame
    trials: int
    draws: int
    varied: tuple[Varied, ...]
    drawn: int
    ranked: int
    rank: pd.Series

    def for_record(self) -> dict[str, Any]:
        """What ``record.json`` keeps of it."""
        return {
            "trials": self.trials,
            "data_draws": self.draws,
            "varied": ["weights, each evenly within the ± % of its profile", *(one.in_full for one in self.varied)],
            "varies": listed(["the weights", *(one.short for one in self.varied)])
            if self.varied
            else "the weights only",
            "left_out": listed([one for one in (TERRAIN, WIND) if one not in {two.short for two in self.varied}]),
            "plots_in_trials": self.drawn,
            "plots_ranked": self.ranked,
            "ranks_spanned_on_average": {
                what: self._mean_span(suffix)
                for what, suffix in (("together", ""), ("weights_alone", "_weights"), ("data_alone", "_data"))
            },
        }

    @property
    def outside(self) -> tuple[str, ...]:
        """Plots whose rank in the run lies outside the range of their ranks under the data's draws."""
        low, high = self.table["rank_low_data"], self.table["rank_high_data"]
        return tuple(str(plot) for plot in self.table.index[(self.rank < low) | (self.rank > high)])

    def _mean_span(self, suffix: str) -> float | None:
        """Mean number of ranks from the best to the worst of the range."""
        span = (self.table[f"rank_high{suffix}"] - self.table[f"rank_low{suffix}"]).dropna()
        return round(float(span.mean()) + 1.0, 2) if len(span) else None

    def notes(self) -> tuple[Note, ...]:
        """What was varied, and what was not."""
        if not self.drawn:
            return ()
        text = (
            f"Rank ranges and chances come from {self.trials:,} trials, each with every weight drawn evenly within the "
            "± % of its profile"
        )
        if self.draws:
            in_full = "; ".join(one.in_full for one in self.varied)
            text += (
                f" and with one of {self.draws:,} draws of the data, the same for all plots: {in_full}. "
                "Unknown readings stand at their worst throughout."
            )
            spans = [self._mean_span(suffix) for suffix in ("_weights", "_data", "")]
            if None not in spans:
                text += (
                    f" On average a plot's range spans {spans[0]:.1f} ranks if the weights alone vary, {spans[1]:.1f} "
                    f"if the data alone do, and {spans[2]:.1f} together."
                )
        else:
            text += (
                ". They tell how far the ranking hangs on the weights and on nothing else: the terrain model's error "
                "and the wind's are not in them, and unknown readings stand at their worst throughout."
            )
        notes = [Note("info", "judgement", text)]
        if self.outside:
            notes.append(
                Note(
                    "info",
                    "judgement",
                    f"Plots whose own rank lies outside their range: {listed(self.outside)}. The terrain model's noise "
                    "makes their ground read otherwise than it most likely is; look at them on site before ruling them "
                    "in or out.",
                )
            )
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


def listed(words: Sequence[str]) -> str:
    """Words as a sentence lists them: "a, b and c"; "" for none."""
    return " and ".join([", ".join(words[:-1]), words[-1]] if len(words) > 1 else words)


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
    draws: ReadingDraws = NO_DRAWS,
    rules: Sequence[CautionRule] = (),
    varied: tuple[Varied, ...] = (),
) -> Certainty:
    """Rank the plots again under other weights and other draws of the data.

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
    draws : ReadingDraws
        One set for all plots; without any the weights alone vary.
    rules : sequence of CautionRule
        Those of the run: a stop sets a plot aside in the draws in which it is raised.
    varied : tuple of Varied
        What the draws vary.

    Returns
    -------
    Certainty

    Notes
    -----
    Each draw of the data serves the same number of sets of weights: trial t takes draw t mod count. No noise is ever
    added to a mark; readings are drawn and marked anew, so data without error spread nothing.
    A trial ranks by the same low marks as the run does, so ignorance wins in none of them. Above ``trials_plots_most``
    ranked plots only the max(10 k, 200) with the highest ``mark_high`` are drawn; the others keep the place against
    them that they have in the run. (Left at their marks while the drawn ones move, they would win trials in which
    all marks fall.)
    Plots that share the first place are both first.
    """
    varied = varied if draws.count else ()
    table = judged.table
    rank = table["rank"].astype("Float64").astype(np.float64)
    ranked = np.flatnonzero(table["rank"].notna().to_numpy())
    drawn = take_part(judged, shortlist, settings)
    found = pd.DataFrame({name: np.full(len(table), np.nan) for name in COLUMNS}, index=table.index)

    def enter(rows: IntArray, told: Mapping[str, Any]) -> None:
        for name, values in told.items():
            found.iloc[rows, found.columns.get_loc(name)] = values

    if draws.count:
        measured = drawn if len(drawn) < len(ranked) else np.flatnonzero(_told_by_draws(judged, rules, draws))
        enter(measured, {"chance_set_aside": stopped(judged, zones, rules, draws, measured).mean(axis=0)})
    if not len(drawn):
        return Certainty(found, settings.trials, draws.count, varied, 0, len(ranked), rank)
    by_rank = drawn[np.argsort(table["rank"].to_numpy(dtype=np.float64)[drawn], kind="stable")]
    zone = table["zone"].to_numpy(dtype=object)
    ahead, ahead_in_zone = _ahead(_steps(table["mark_low"].to_numpy(np.float64), settings), zone, by_rank, ranked)
    free = _steps(low_marks(judged, zones, by_rank, any_weights(judged, seed, settings.trials)), settings)
    enter(by_rank, {"chance_first_any_weights": _first(free, ahead)})
    del free  # with 5,000 plots 80 MB
    weights = drawn_weights(judged, profiles, seed, settings.trials)
    data = drawn_marks(judged, zones, profiles, rules, draws, by_rank) if draws.count else None
    if data is not None:
        for suffix, marks in (
            ("_weights", low_marks(judged, zones, by_rank, weights)),
            ("_data", low_marks(judged, zones, by_rank, run_weights(judged, data.count), data, np.arange(data.count))),
        ):
            low, high = _middle(ranks_of(_steps(marks, settings)) + ahead.astype(np.int32))
            enter(by_rank, {f"rank_low{suffix}": low, f"rank_high{suffix}": high})
    draw = np.arange(settings.trials) % data.count if data is not None else None
    marks = low_marks(judged, zones, by_rank, weights, data, draw)
    if data is not None:
        low, high = _middle(marks)
        enter(by_rank, {"drawn_mark_low": _no_infinity(low), "drawn_mark_high": _no_infinity(high)})
    steps = _steps(marks, settings)
    in_it = np.isfinite(steps)
    ranks = ranks_of(steps)
    ranks += ahead.astype(np.int32)
    enter(
        by_rank,
        {
            "chance_first": ((ranks == 1) & in_it).mean(axis=0),
            "chance_top_quarter": ((ranks <= math.ceil(len(ranked) / 4)) & in_it).mean(axis=0),
            "chance_shortlist": ((ranks <= shortlist) & in_it).mean(axis=0),
            "chance_first_in_zone": _first_in_zone(steps, zone[by_rank], ahead_in_zone),
            "chance_beats_next": np.append(beats(steps[:, :-1], steps[:, 1:]), np.nan),
            "group": groups(steps, settings.told_apart),
        },
    )
    low, high = _middle(ranks)
    enter(by_rank, {"rank_low": low, "rank_high": high})
    return Certainty(found, settings.trials, draws.count, varied, len(drawn), len(ranked), rank)


def _told_by_draws(judged: Judged, rules: Sequence[CautionRule], draws: ReadingDraws) -> NDArray[np.bool_]:
    """Ranked plots, and those set aside whose ground was drawn all the same: of others the draws tell nothing."""
    has_zone = np.asarray(judged.table["zone"].to_numpy(dtype=object) != "", dtype=np.bool_)
    looked_at = {one.reading for rule in rules if rule.level == "stop" for one in rule.when}
    drawn = np.zeros(len(has_zone), dtype=np.bool_)
    for name in looked_at.intersection(draws.values):
        values = draws.values[name]
        drawn |= ((values != "") if values.dtype == object else ~np.isnan(values)).any(axis=1)
    if "outcome" in judged.facts:
        has_zone &= np.asarray(judged.facts["outcome"].to_numpy(dtype=object) == "", dtype=np.bool_)
    return np.asarray(judged.table["rank"].notna().to_numpy(dtype=np.bool_) | (has_zone & drawn))


def _middle(values: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
    """The 5–95 % range of each column: two of its own values. Arrays of shape (trials, m) give (m,) twice."""
    ordered = np.sort(values, axis=0)
    count = len(ordered)
    return ordered[math.ceil(0.05 * count) - 1], ordered[math.ceil(0.95 * count) - 1]


def _no_infinity(values: FloatArray) -> FloatArray:
    """Marks, with none where more than every twentieth trial sets the plot aside."""
    return np.where(np.isfinite(values), values, np.nan)


def take_part(judged: Judged, shortlist: int, settings: JudgementSettings) -> IntArray:
    """Which of the ranked plots take part in the trials, rising: all, or of very many those with the best chances."""
    ranked = np.flatnonzero(judged.table["rank"].notna().to_numpy())
    if len(ranked) <= settings.trials_plots_most:
        return ranked
    best = np.argsort(-judged.table["mark_high"].to_numpy(dtype=np.float64)[ranked], kind="stable")
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
    is_best = (steps >= steps.max(axis=1, keepdims=True)) & np.isfinite(steps)
    return np.where(ahead == 0, is_best.mean(axis=0), 0.0)


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

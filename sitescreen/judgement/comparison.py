"""Two rankings side by side: who moved, how alike they are, who came onto the shortlist and who left it, and why."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

STANDING = ("rank", "overall_mark", "mark_low", "lon", "lat")
"""Numbers that a standing holds beside ``name``, ``zone``, ``set_aside`` and the marks."""

SAME_MARK = 0.5
"""A change of less than half a point of the mark is read as none: our choice, no source."""


def standing(rows: Sequence[Mapping[str, Any]]) -> pd.DataFrame:
    """The part of a ranking that a comparison looks at.

    Parameters
    ----------
    rows : sequence of mapping
        Rows of a ranking, as text or as numbers; "" or None where unknown.

    Returns
    -------
    DataFrame, indexed by plot
        ``name``, ``zone``, ``set_aside`` as text; ``rank``, ``overall_mark``, ``mark_low``, ``lon``, ``lat`` and every
        ``mark_<criterion>`` as float64.
    """
    table = pd.DataFrame(list(rows)).astype(object)
    index = pd.Index([str(plot) for plot in table["plot"]] if len(table) else [], name="plot")
    marks = [name for name in table.columns if str(name).startswith("mark_") and name not in STANDING]
    out: dict[str, Any] = {
        name: [str(word or "") for word in table[name]] if name in table else ""
        for name in ("name", "zone", "set_aside")
    }
    for name in (*STANDING, *marks):
        out[name] = pd.to_numeric(table[name], errors="coerce").to_numpy(np.float64) if name in table else np.nan
    return pd.DataFrame(out, index=index)


@dataclass(frozen=True)
class Comparison:
    """What moved from one ranking to another.

    Parameters
    ----------
    moves : DataFrame, indexed by plot
        Plots of either run: ``rank_before``, ``rank_after``, ``mark_before``, ``mark_after`` (what the rank goes by);
        NaN where there is none. In the order of the second run.
    common : int
        Plots that both runs rank.
    tau_b, rho : float
        Agreement of the ranks of those plots, −1 to 1: Kendall's τ_b, which allows for ties, and Spearman's ρ.
        NaN where fewer than two are common or one of the runs ranks them all alike.
    shortlist : int
        The first k looked at.
    kept, entered, left : tuple of str
        Plots among the first k of both, of the second only, of the first only.
    """

    moves: pd.DataFrame
    common: int
    tau_b: float
    rho: float
    shortlist: int
    kept: tuple[str, ...]
    entered: tuple[str, ...]
    left: tuple[str, ...]

    @property
    def mean_change(self) -> float:
        """Mean size of the change of the marks that ranks go by. [points] NaN without a common plot."""
        change = np.abs(self.moves["mark_after"] - self.moves["mark_before"])
        return float(change.mean())

    @property
    def most_changed(self) -> tuple[str, float] | None:
        """The plot whose mark changed most, and by how much; None where none did."""
        change = (self.moves["mark_after"] - self.moves["mark_before"]).dropna()
        if not len(change) or not float(np.abs(change).max()) > 0.0:
            return None
        plot = str(np.abs(change).idxmax())
        return plot, float(change[plot])


def agreement(first: ArrayLike, second: ArrayLike) -> tuple[float, float]:
    """How alike two orders of the same plots are.

    Parameters
    ----------
    first, second : arrays, shape (n,)
        Ranks; equal ranks are ties.

    Returns
    -------
    tau_b, rho : float
        Kendall's τ_b (Kendall 1945, Biometrika 33:239–251) and Spearman's ρ, −1 to 1; NaN where they have no meaning.
    """
    from scipy.stats import kendalltau, spearmanr

    one, two = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    if len(one) < 2 or np.ptp(one) == 0.0 or np.ptp(two) == 0.0:
        return np.nan, np.nan
    return float(kendalltau(one, two, variant="b").statistic), float(spearmanr(one, two).statistic)


def compare(before: pd.DataFrame, after: pd.DataFrame, shortlist: int) -> Comparison:
    """Compare two standings.

    Parameters
    ----------
    before, after : DataFrame
        From :func:`standing`.
    shortlist : int
        How many of the first places to look at: k. Plots that share the last of them all count.
    """
    plots = [*after.index, *(plot for plot in before.index if plot not in after.index)]
    moves = pd.DataFrame(
        {
            "rank_before": before["rank"].reindex(plots),
            "rank_after": after["rank"].reindex(plots),
            "mark_before": before["mark_low"].reindex(plots),
            "mark_after": after["mark_low"].reindex(plots),
        }
    )
    both = moves.dropna(subset=["rank_before", "rank_after"])
    tau_b, rho = agreement(both["rank_before"].to_numpy(), both["rank_after"].to_numpy())
    first = moves["rank_before"] <= shortlist
    then = moves["rank_after"] <= shortlist
    kept, entered, left = (tuple(moves.index[which]) for which in (first & then, then & ~first, first & ~then))
    return Comparison(moves, len(both), tau_b, rho, shortlist, kept, entered, left)


def why_moved(
    plot: str,
    before: pd.DataFrame,
    after: pd.DataFrame,
    profiles_before: Mapping[str, Any],
    profiles_after: Mapping[str, Any],
) -> str:
    """Why a plot stands elsewhere in the second run, in a clause.

    Parameters
    ----------
    plot : str
    before, after : DataFrame
        From :func:`standing`.
    profiles_before, profiles_after : mapping of zone to profile
        As the records keep them.

    Notes
    -----
    The criterion named is the one whose part in the mark, weight × mark over all weights, changed most in the direction
    of the mark; an unknown mark counts as the worst of its curve.
    """
    if plot not in before.index:
        return "it is not among the plots of the first run"
    if plot not in after.index:
        return "it is not among the plots of the second run"
    then, now = before.loc[plot], after.loc[plot]
    if then["set_aside"] and not now["set_aside"]:
        return f"the first run set it aside: {then['set_aside']}"
    if now["set_aside"]:
        return f"the second run sets it aside: {now['set_aside']}"
    change = float(now["mark_low"] - then["mark_low"])
    marks = f"its mark went from {then['mark_low']:.1f} to {now['mark_low']:.1f}"
    if abs(change) < SAME_MARK:
        return f"{marks}; others moved past it" if now["rank"] > then["rank"] else f"{marks}; others fell behind it"
    if then["zone"] != now["zone"]:
        return f"{marks}, judged as {now['zone']} instead of {then['zone']}"
    parts_then = _parts(then, profiles_before.get(then["zone"], {}))
    parts_now = _parts(now, profiles_after.get(now["zone"], {}))
    gains = {
        name: np.sign(change) * (parts_now.get(name, 0.0) - parts_then.get(name, 0.0))
        for name in {**parts_then, **parts_now}
    }
    if not gains or max(gains.values()) <= 0.0:
        return marks
    name = max(gains, key=lambda one: gains[one])
    return f"{marks}, chiefly by “{_title(name, profiles_after, profiles_before)}” ({_marks_of(name, then, now)})"


def _parts(row: Any, profile: Mapping[str, Any]) -> dict[str, float]:
    """What each criterion of a recorded profile gives to the mark, in points."""
    criteria = profile.get("criteria", [])
    total = sum(one["weight"] for one in criteria)
    out = {}
    for one in criteria:
        mark = row.get(f"mark_{one['name']}", np.nan)
        worst = min(point[1] for point in one["curve"])
        out[one["name"]] = one["weight"] / total * (worst if np.isnan(mark) else float(mark))
    return out


def _title(name: str, *profiles: Mapping[str, Any]) -> str:
    criteria = (one for many in profiles for profile in many.values() for one in profile.get("criteria", []))
    return str(next((one["title"] for one in criteria if one["name"] == name), name))


def _marks_of(name: str, then: Any, now: Any) -> str:
    said = [
        "unknown" if np.isnan(value) else f"{value:.0f}"
        for value in (float(row.get(f"mark_{name}", np.nan)) for row in (then, now))
    ]
    return "its weight" if said[0] == said[1] else f"mark {said[0]} to {said[1]}"

"""How sure the order is, in plain words: read off the table's chances, and off the record what they vary."""

import math
from collections import defaultdict
from collections.abc import Iterable, Mapping
from typing import TYPE_CHECKING, Any

from sitescreen.settings import load_defaults

if TYPE_CHECKING:
    import pandas as pd

FIRM, FAIRLY_FIRM, LIKELY = 0.95, 0.80, 0.50
"""What the first place is called, by its chance: our choice, no source. Below 0.8 two plots count as alike too."""

_TEENS = range(11, 14)


def ordinal(rank: int) -> str:
    """1st, 2nd, 3rd, 4th, 11th, 21st …"""
    ending = "th" if rank % 100 in _TEENS else {1: "st", 2: "nd", 3: "rd"}.get(rank % 10, "th")
    return f"{rank}{ending}"


def alike(table: "pd.DataFrame") -> list[str]:
    """For each row the ranks that cannot be told apart, its own among them, as in "3rd to 6th"; "" where it can be."""
    if "group" not in table:
        return [""] * len(table)
    ranks: dict[int, list[int]] = defaultdict(list)
    known = table["rank"].notna() & table["group"].notna()
    for group, rank in zip(table.loc[known, "group"], table.loc[known, "rank"], strict=True):
        ranks[int(group)].append(int(rank))
    words = {group: _ranks(held) for group, held in ranks.items() if len(held) > 1}
    return [words.get(int(group), "") if has else "" for group, has in zip(table["group"], known.tolist(), strict=True)]


def _ranks(held: Iterable[int]) -> str:
    ranks = sorted(set(held))
    if len(ranks) == 1:
        return f"all {ordinal(ranks[0])}"
    if len(ranks) == 2:
        return f"{ordinal(ranks[0])} and {ordinal(ranks[1])}"
    if ranks[-1] - ranks[0] == len(ranks) - 1:
        return f"{ordinal(ranks[0])} to {ordinal(ranks[-1])}"
    return ", ".join(map(ordinal, ranks[:-1])) + f" and {ordinal(ranks[-1])}"


def of_trials(chance: float) -> str:
    """A chance as a count of trials; never rounded up to all of them, nor down to none."""
    if chance >= 1.0:
        return "in every trial"
    if chance <= 0.0:
        return "in no trial"
    counted = math.floor(100 * chance + 0.5)
    if counted == 0:
        return "in fewer than 1 of 100 trials"
    return f"in {counted} of 100 trials" if counted < 100 else "in more than 99 of 100 trials"


def varies(record: Mapping[str, Any]) -> str:
    """What the trials vary, as in "the weights and the wind"."""
    return str(record.get("certainty", {}).get("varies", "the weights only"))


def _left_out(record: Mapping[str, Any]) -> str:
    """What the trials leave out, in a sentence; "" where nothing is."""
    words = str(record.get("certainty", {}).get("left_out", "the terrain's error and the wind"))
    return f" {words[:1].upper()}{words[1:]} {'are' if ' and ' in words else 'is'} not in this." if words else ""


def sureness(table: "pd.DataFrame", shortlist: int, record: Mapping[str, Any]) -> str:
    """One or two sentences on how firm the first place and the shortlist are; "" where nothing was tried.

    Parameters
    ----------
    table : DataFrame
        The ranking, best first, with ``chance_first`` and ``group``.
    shortlist : int
        Ties are named up to this rank.
    record : mapping
        Of the run: what its trials vary.
    """
    ranked = table[table["rank"].notna()]
    if len(ranked) < 2 or "chance_first" not in ranked or ranked["chance_first"].isna().iloc[0]:
        return ""
    leaders = ranked[ranked["rank"] == ranked["rank"].iloc[0]]
    so_far = f"as far as {varies(record).removesuffix(' only')} go"
    chance = float(leaders["chance_first"].iloc[0])
    trials = of_trials(chance)
    if len(leaders) > 1:
        head = f"The first place is shared by {len(leaders)} plots"
    elif chance >= FIRM:
        head = f"First place is firm {so_far} (first {trials})"
    elif chance >= FAIRLY_FIRM:
        head = f"First place is fairly firm {so_far} (first {trials})"
    elif chance >= LIKELY:
        head = f"First place is likely but not firm, even {so_far} (first {trials})"
    else:
        head = f"First place is open: the trials change it easily (this plot is first only {trials})"
    near = ranked[ranked["rank"] <= shortlist]
    ties = list(dict.fromkeys(words for words in alike(ranked)[: len(near)] if words))
    told = f"; {ties[0]} cannot be told apart" if ties else ""
    told += "".join(f", nor can {more}" for more in ties[1:])
    return f"{head}{told}.{_left_out(record)}"


def above_breeze(table: "pd.DataFrame") -> list[bool]:
    """Whether a plot itself lies above the top of the breeze, so that none of it arrives."""
    if not {"shore_kind", "breeze_screen", "elevation_m"} <= set(table.columns):
        return [False] * len(table)
    breeze = load_defaults().breeze
    over_sea = (table["shore_kind"] == "sea") & (table["elevation_m"] >= breeze.sea_depth_m)
    screened = table["breeze_screen"] >= 0.995
    if "over_water_m" in table:
        over_lake = (table["shore_kind"] == "lake") & (table["over_water_m"] >= breeze.lake_depth_m)
        return [bool(one) for one in (over_sea | over_lake) & screened]
    return [bool(one) for one in over_sea & screened]

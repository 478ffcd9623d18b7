"""The answer in one sentence, and the words that say how far to trust it."""

import re
from typing import TYPE_CHECKING, Any

from sitescreen.deliverables.columns import BY_NAME
from sitescreen.deliverables.table import value_of, whole_mark

if TYPE_CHECKING:
    import pandas as pd

    from sitescreen.screening import Screening

CAUTION = "This is a screening, not a survey: local codes and licensed practice decide."

ON_SITE = (
    "Walk the plots on the shortlist, in the afternoon and before sunrise: is the air as this page says?",
    "Ask neighbours about flooding, frost and the worst wind.",
    "Have levels, soil, drainage, access and title checked before buying.",
)


_TURNS = re.compile("[\u0590-\u08ff\u200f\u202a-\u202e\u2066-\u2069\ufb1d-\ufdff\ufe70-\ufefc]")


def answer(table: "pd.DataFrame") -> str:
    """The result in one plain sentence.

    Parameters
    ----------
    table : DataFrame
        The ranking, best first.
    """
    ranked = table[table["rank"].notna()]
    aside = len(table) - len(ranked)
    plots = f"{len(table)} plots" if len(table) != 1 else "one plot"
    if ranked.empty:
        return f"Of {plots}, none could be ranked: each is set aside, with its reason below."
    leaders = ranked[ranked["rank"] == ranked["rank"].iloc[0]]
    mark = f"{whole_mark(leaders['overall_mark'].iloc[0])} of 100"
    if len(leaders) == 1:
        head = f"Of {plots}, {_called(leaders.iloc[0])} comes first, with {mark}"
    else:
        names = _list([_called(row) for _, row in leaders.head(3).iterrows()])
        head = f"Of {plots}, {names} share the first place, with {mark}"
    nearest = [_called(row) for _, row in ranked.iloc[len(leaders) : len(leaders) + 2].iterrows()]
    then = f"; then {_list(nearest)}" if nearest else ""
    shelf = {0: "", 1: " One is set aside."}.get(aside, f" {aside} are set aside.")
    return f"{head}{then}.{shelf}"


def _called(row: Any) -> str:
    name, plot = value_of(BY_NAME["name"], row.get("name")), str(row["plot"])
    return f"{isolated(str(name))} (plot\u00a0{isolated(plot)})" if name else f"plot\u00a0{isolated(plot)}"


def isolated(text: str) -> str:
    """Text that runs from right to left, or turns what stands around it, kept to itself (Unicode's FSI and PDI)."""
    return f"\u2068{text}\u2069" if _TURNS.search(text) else text


def _list(words: list[str]) -> str:
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"


def trust(screening: "Screening") -> list[dict[str, Any]]:
    """The blocks of “How far to trust this”: a heading and its lines each; blocks with nothing to say are left out."""

    def noted(level: str) -> list[str]:
        return [counted(note.text) for note in screening.notes if note.level == level]

    blocks = [
        ("How sure the order is", _on_the_order(screening)),
        ("Assumed, because nobody gave it", noted("assumed")),
        ("Noticed in the inputs", noted("warning")),
        ("Not measured in this version", [_line(text) for text in screening.not_measured]),
        ("Not checked: silence here does not mean safe", [_line(text) for text in screening.not_checked]),
        ("To check on site", list(ON_SITE)),
    ]
    return [{"heading": heading, "lines": lines} for heading, lines in blocks if lines]


def _on_the_order(screening: "Screening") -> list[str]:
    """What the trials varied, and the smallest change of a weight that takes the first place from its plot."""
    lines = [note.text for note in screening.notes if note.level == "info" and note.where == "judgement"]
    for one in screening.record.get("what_would_change") or ():
        if one.get("among") == "all" and one["says"] not in lines:
            lines.append(one["says"])
    for zone, profile in screening.profiles.items():
        title = f"“{profile.title}”"
        lines = [title.join(re.split(rf"\b{re.escape(zone)}\b", line)) for line in lines]
    return lines


def counted(text: str) -> str:
    """“1 lake(s)” as one lake and “3 lake(s)” as three, “1 plots” as one plot."""
    text = re.sub(r"\b1 ([\w ]+?)\(s\)", r"1 \1", text)
    text = re.sub(r"(\d ?[\w ]*?)\(s\)", r"\1s", text)
    return re.sub(r"(?<![\d.,])\b1 plots\b", "1 plot", text)


def _line(text: str) -> str:
    return text[:1].upper() + text[1:]

"""The parts of the page that need no script: the table, the shelf, and the plots drawn over the relief."""

import html
from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from sitescreen.deliverables.classes import RAMP, class_of
from sitescreen.deliverables.columns import BY_NAME
from sitescreen.deliverables.sheet import Sheet
from sitescreen.deliverables.sureness import ordinal
from sitescreen.deliverables.table import mark_words, value_of

if TYPE_CHECKING:
    import pandas as pd

    from sitescreen.screening import Screening

MOST_ROWS = 300
HALF = 7  # of a plot's sign, in pixels of the sheet


def ranking_rows(screening: "Screening") -> str:
    """Rows of the ranked plots, escaped; the best :data:`MOST_ROWS`."""
    table = screening.table
    ranked = table[table["rank"].notna()]
    rows = [_ranking_row(row, screening) for _, row in ranked.head(MOST_ROWS).iterrows()]
    if len(ranked) > MOST_ROWS:
        rows.append(f'<tr><td colspan="6">{len(ranked) - MOST_ROWS} more are in ranking.csv.</td></tr>')
    return "\n".join(rows)


def _ranking_row(row: Any, screening: "Screening") -> str:
    reasons = screening.reasons.get(row["plot"])
    zone = screening.profiles.get(row["zone"])
    cells = [
        f"{int(row['rank'])}",
        _called(row),
        zone.title if zone else str(row["zone"]),
        mark_words(row["overall_mark"], row["mark_low"]),
        next(iter(reasons.for_), "") if reasons else "",
        next(iter(reasons.against), "") if reasons else "",
    ]
    return "<tr>" + "".join(f"<td>{html.escape(cell)}</td>" for cell in cells) + "</tr>"


def shelf_rows(table: "pd.DataFrame") -> str:
    """The plots set aside, escaped, each with its reason."""
    aside = table[table["rank"].isna()].head(MOST_ROWS)
    return "\n".join(
        f"<li><b>{html.escape(_called(row))}</b> {html.escape(str(row.get('set_aside') or ''))}</li>"
        for _, row in aside.iterrows()
    )


def _called(row: Any) -> str:
    name = value_of(BY_NAME["name"], row.get("name"))
    return f"{row['plot']} · {name}" if name else str(row["plot"])


def trust_blocks(blocks: Sequence[Mapping[str, Any]]) -> str:
    """“How far to trust this”, escaped."""
    return "\n".join(
        f"<div><h3>{html.escape(block['heading'])}</h3><ul>"
        + "".join(f"<li>{html.escape(line)}</li>" for line in block["lines"])
        + "</ul></div>"
        for block in blocks
    )


def plot_signs(table: "pd.DataFrame", sheet: Sheet, shortlist: int) -> str:
    """Signs of the plots on the static picture: squares in their class, dashed where set aside, the shortlist numbered.

    Nothing that a user wrote is in them.
    """
    return "".join(_signs(table, sheet, shortlist))


def _signs(table: "pd.DataFrame", sheet: Sheet, shortlist: int) -> Iterator[str]:
    places = sheet.pixels(table["lon"].to_numpy(dtype=np.float64), table["lat"].to_numpy(dtype=np.float64))
    classes = class_of(table["overall_mark"].to_numpy(dtype=np.float32))
    ranks = [value_of(BY_NAME["rank"], rank) for rank in table["rank"].tolist()]
    inside = (
        np.isfinite(places).all(axis=1) & (places >= 0).all(axis=1) & (places <= [sheet.cols, sheet.rows]).all(axis=1)
    )
    for i in np.flatnonzero(inside)[::-1][-MOST_ROWS:]:
        x, y = places[i]
        box = f'x="{x - HALF:.1f}" y="{y - HALF:.1f}" width="{2 * HALF}" height="{2 * HALF}"'
        rank = ranks[i]
        if rank is None:
            yield f'<rect {box} fill="none" stroke="#2b2a27" stroke-width="2" stroke-dasharray="3 3"/>'
            continue
        fill = "#faf7f0" if np.isnan(classes[i]) else RAMP[int(classes[i])]
        yield f'<rect {box} fill="{fill}" stroke="#2b2a27" stroke-width="2"/>'
        if int(rank) <= shortlist:
            yield f'<text x="{x + 2 * HALF:.1f}" y="{y + HALF:.1f}">{ordinal(int(rank))}</text>'

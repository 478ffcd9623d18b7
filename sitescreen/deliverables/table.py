"""``ranking.csv``: one row a plot, the same bytes for the same run."""

import csv
import math
from collections.abc import Iterator, Sequence
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from sitescreen.deliverables.columns import Column
from sitescreen.inputs.results import STARTS_A_FORMULA

if TYPE_CHECKING:
    import pandas as pd

BEARING = "° from true north"
"""The unit of columns that hold bearings."""


def value_of(column: Column, value: Any) -> str | int | float | None:
    """One value as the files hold it: text, a whole number, or a number rounded to the column's decimals.

    Parameters
    ----------
    column : Column
    value : any
        NaN, NA, None and empty text are unknown.

    Returns
    -------
    str, int, float or None
        None where unknown. Never −0.0.
    """
    if value is None or value is _na() or (isinstance(value, float) and math.isnan(value)):
        return None
    if isinstance(value, bool | np.bool_):
        return int(value) if column.kind == "whole" else "yes" if value else "no"
    if column.kind == "text":
        return str(value) or None
    if not math.isfinite(value):
        return None
    if column.kind == "whole":
        whole: int = round(value)
        return whole
    rounded = round(float(value), column.decimals) + 0.0  # + 0.0 turns −0.0 into 0.0
    return rounded % 360.0 if column.unit == BEARING else rounded  # 359.7° is north, not 360


def whole_mark(mark: float) -> str:
    """A mark as people read it, without decimals; halves go up, as they do in the page's scripts."""
    return str(math.floor(round(float(mark), 1) + 0.5))


def mark_words(mark: float, low: float) -> str:
    """A mark as people read it, with the one that ranks go by where that is lower by 1 or more: "89 (at worst 66)"."""
    at_worst = f" (at worst {whole_mark(low)})" if round(mark, 1) - round(low, 1) >= 1.0 else ""
    return whole_mark(mark) + at_worst


@cache
def _na() -> Any:
    import pandas as pd

    return pd.NA


def safe_text(text: str) -> str:
    r"""Text that no spreadsheet takes for a formula: an apostrophe goes before what looks like one.

    A carriage return becomes ``\n``: unquoted it would end the row in some readers.
    """
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    return f"'{text}" if text.startswith(STARTS_A_FORMULA) else text


def cell(column: Column, value: Any) -> str:
    """One cell of the CSV: fixed decimals, empty where unknown, text made safe."""
    known = value_of(column, value)
    if known is None:
        return ""
    return safe_text(known) if isinstance(known, str) else f"{known:.{column.decimals}f}"


def rows_of(table: "pd.DataFrame", columns: Sequence[Column]) -> Iterator[list[Any]]:
    """The rows of a table in the order of the columns; None for a column that the table lacks."""
    blank = [None] * len(table)
    series = [table[column.name].tolist() if column.name in table else blank for column in columns]
    for row in zip(*series, strict=True):
        yield list(row)


def write_csv(table: "pd.DataFrame", columns: Sequence[Column], path: Path) -> None:
    r"""Write the ranking as UTF-8 with ``\n`` line ends.

    Parameters
    ----------
    table : DataFrame
        One row a plot, already in order.
    columns : sequence of Column
    path : Path
    """
    with path.open("w", encoding="utf-8", errors="backslashreplace", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow([column.name for column in columns])
        for row in rows_of(table, columns):
            writer.writerow([cell(column, value) for column, value in zip(columns, row, strict=True)])

"""``ranking.xlsx``: the ranking for people, with units, number formats and a sheet that explains each column."""

import re
import zipfile
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sitescreen.deliverables.columns import Column
from sitescreen.deliverables.table import rows_of, value_of

if TYPE_CHECKING:
    import pandas as pd

MOST_PLOTS = 20_000
"""Above this a workbook is too slow to open; ``ranking.csv`` has everything."""

LONGEST_CELL = 32_767  # the format's own limit
HEAD_ROWS = 2  # names and units

HIDDEN = "Empty in this run, so the column is hidden."
_EMPTY_SPEAKS = {"rank", "name", "cautions", "set_aside"}  # none ranked, named, cautioned, set aside

_UNPRINTABLE = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")  # XML cannot hold these
_EPOCH = (1980, 1, 1, 0, 0, 0)  # the earliest moment a zip file can name
_MOMENT = re.compile(rb"(<dcterms:(?:created|modified)[^>]*>)[^<]*")


def write_workbook(table: "pd.DataFrame", columns: Sequence[Column], path: Path) -> None:
    """Write the ranking as a workbook; the same table gives the same bytes.

    Parameters
    ----------
    table : DataFrame
        One row a plot, already in order; :data:`MOST_PLOTS` at most.
    columns : sequence of Column
    path : Path
    """
    from openpyxl import Workbook
    from openpyxl.cell import WriteOnlyCell
    from openpyxl.styles import Alignment, Font
    from openpyxl.utils import get_column_letter

    book = Workbook(write_only=True)
    ranking = book.create_sheet("Ranking")
    ranking.freeze_panes = "D3"  # below names and units, right of rank, plot and name
    # from the row of units down, so that sorting leaves it where it is
    ranking.auto_filter.ref = f"A{HEAD_ROWS}:{get_column_letter(len(columns))}{HEAD_ROWS + len(table)}"
    empty = _empty(table, columns)
    for i, column in enumerate(columns, start=1):
        ranking.column_dimensions[get_column_letter(i)].width = _width(column)
        ranking.column_dimensions[get_column_letter(i)].hidden = column.name in empty

    def made(sheet: Any, text: str, font: Font) -> Any:
        made_cell = WriteOnlyCell(sheet)
        _set_text(made_cell, text)
        made_cell.font = font
        return made_cell

    bold, italic, grey = Font(bold=True), Font(italic=True, color="666666"), Font(color="999999")
    ranking.append([made(ranking, column.name, grey if column.name in empty else bold) for column in columns])
    ranking.append([made(ranking, column.unit, italic) for column in columns])
    # one cell a column serves all rows: each row is written out before the next is filled in
    ready = [WriteOnlyCell(ranking) for _ in columns]
    for made_cell, column in zip(ready, columns, strict=True):
        if column.kind != "text":
            made_cell.number_format = _number_format(column)
    for row in rows_of(table, columns):
        cells: list[Any] = []
        for made_cell, column, value in zip(ready, columns, row, strict=True):
            known = value_of(column, value)
            if isinstance(known, str):
                _set_text(made_cell, known)
            elif known is not None:
                made_cell.value = known
            cells.append(None if known is None else made_cell)
        ranking.append(cells)

    meaning = book.create_sheet("Columns")
    meaning.freeze_panes = "A2"
    for letter, width in zip("ABCD", (26, 22, 30, 100), strict=True):
        meaning.column_dimensions[letter].width = width
    meaning.append([made(meaning, head, bold) for head in ("column", "unit", "in words", "what it means")])
    for column in columns:
        says, font = (f"{HIDDEN} {column.says}", grey) if column.name in empty else (column.says, Font())
        row = [made(meaning, text, font) for text in (column.name, column.unit, column.title, says)]
        row[-1].alignment = Alignment(wrap_text=True, vertical="top")
        meaning.append(row)

    book.save(path)
    _without_the_clock(path)


def _empty(table: "pd.DataFrame", columns: Sequence[Column]) -> set[str]:
    """The columns without a single value, but those where emptiness says something."""
    return {
        column.name
        for column in columns
        if column.name not in _EMPTY_SPEAKS
        and (column.name not in table or all(value_of(column, value) is None for value in table[column.name].tolist()))
    }


def _set_text(made_cell: Any, text: str) -> None:
    """Text stays text, whatever it begins with."""
    clean = _UNPRINTABLE.sub("�", text)
    made_cell.value = clean if len(clean) <= LONGEST_CELL else clean[: LONGEST_CELL - 1] + "…"
    made_cell.data_type = "s"  # openpyxl takes a leading "=" for a formula and "#N/A" for an error


def _number_format(column: Column) -> str:
    return "0" if column.decimals == 0 else "0." + "0" * column.decimals


def _width(column: Column) -> int:
    if column.name in ("name", "cautions", "set_aside"):
        return 36
    return max(10, len(column.name) + 3)


def _without_the_clock(path: Path) -> None:
    """Write the archive again with its moments fixed, so that the same table gives the same bytes."""
    with zipfile.ZipFile(path) as archive:
        parts = [(info.filename, archive.read(info)) for info in archive.infolist()]
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts:
            if name == "docProps/core.xml":
                content = _MOMENT.sub(rb"\g<1>1980-01-01T00:00:00Z", content)
            entry = zipfile.ZipInfo(name, _EPOCH)
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = 0o600 << 16
            archive.writestr(entry, content)

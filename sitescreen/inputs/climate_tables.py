"""Small tables of figures, as CSV: read strictly, since a number that is dropped or misread would falsify a climate."""

import csv
import difflib
import io
import math
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from sitescreen.errors import InputError


@dataclass(frozen=True)
class Row:
    """One line of a table.

    Parameters
    ----------
    file : str
        The table's name, for messages.
    line : int
        Number of the line in the file, the heading being 1.
    cells : dict
        Text by column, stripped.
    """

    file: str
    line: int
    cells: dict[str, str]

    def text(self, column: str) -> str:
        """The cell's text, "" where the table has no such column."""
        return self.cells.get(column, "")

    def number(self, column: str, low: float, high: float) -> float:
        """The cell's number, which may have a decimal comma.

        Raises
        ------
        InputError
            If it is none, or lies outside ``low`` to ``high``.
        """
        text = self.text(column)
        try:
            value = float(text.replace(",", ".").replace("−", "-"))
        except ValueError:
            value = math.nan
        if not low <= value <= high:
            raise self.refuse(
                f"{column} is “{text}”", f"a number from {low:g} to {high:g} is needed", "Correct that cell"
            )
        return value

    def word(self, column: str, allowed: Iterable[str]) -> str:
        """The cell's word, in lower case.

        Raises
        ------
        InputError
            If it is not one of those allowed.
        """
        text = self.text(column).casefold()
        if text not in allowed:
            raise self.refuse(
                f"{column} is “{self.text(column)}”", f"one of {', '.join(allowed)} is needed", "Correct that cell"
            )
        return text

    def refuse(self, given: str, needed: str, way_out: str) -> InputError:
        """The error for this line, to be raised."""
        return InputError(f"line {self.line} of {self.file}: {given}", needed, way_out)


def read_rows(path: Path, needed: tuple[str, ...], optional: tuple[str, ...], called: str) -> list[Row]:
    """The lines of a table with a heading.

    Parameters
    ----------
    path : Path
        Text in UTF-8 (or UTF-16 with its mark), parted by commas, semicolons or tabs. Columns may stand in any order;
        blank lines and columns of other names are left out.
    needed, optional : tuple of str
        Column names, whatever their case in the file.
    called : str
        What messages call the table, such as "wind table".

    Raises
    ------
    InputError
        If it cannot be read, lacks a needed column or has no lines.
    """
    name = f"the {called} {path.name}"
    rows = [(line, cells) for line, cells in _cells(path, name) if any(cell.strip() for cell in cells)]
    if len(rows) < 2:
        raise InputError(
            f"{name} has no rows", f"a heading and rows below it are needed ({', '.join(needed)})", "Fill the table"
        )
    heading = [cell.strip().casefold() for cell in rows[0][1]]
    missing = [column for column in needed if column not in heading]
    if missing:
        near = difflib.get_close_matches(missing[0], heading, n=1, cutoff=0.5)
        raise InputError(
            f"{name} has no column {', '.join(missing)}",
            f"the columns {', '.join(needed)} are needed",
            f"Rename “{near[0]}” if that is it" if near else "Add it to the heading",
        )
    twice = sorted({column for column in (*needed, *optional) if heading.count(column) > 1})
    if twice:
        raise InputError(
            f"{name} has the column {twice[0]} more than once", "each column once is needed", "Remove the other"
        )
    wanted = {column: heading.index(column) for column in (*needed, *optional) if column in heading}
    out = []
    for line, cells in rows[1:]:
        if len(cells) > len(heading) and any(cell.strip() for cell in cells[len(heading) :]):
            raise InputError(
                f"line {line} of {name} has {len(cells)} values under {len(heading)} headings",
                "one value a heading is needed",
                "Where numbers have a decimal comma, part the columns by semicolons",
            )
        found = {column: cells[at].strip() if at < len(cells) else "" for column, at in wanted.items()}
        out.append(Row(name, line, found))
    return out


def _cells(path: Path, name: str) -> list[tuple[int, list[str]]]:
    """Numbered lines, each parted into cells."""
    try:
        raw = path.read_bytes()
    except OSError as error:
        raise InputError(
            f"{name} cannot be read ({error.strerror})", "a readable CSV file is needed", "Check the path in the brief"
        ) from error
    try:
        text = raw.decode("utf-16" if raw.startswith((b"\xff\xfe", b"\xfe\xff")) else "utf-8-sig")
        heading = next((line for line in text.splitlines() if line.strip()), "")
        separator = max(",;\t", key=lambda mark: (heading.count(mark), mark == ","))
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=separator, strict=True)
        return [(reader.line_num, cells) for cells in reader]
    except (UnicodeDecodeError, csv.Error) as error:
        raise InputError(
            f"{name} is not plain text in columns ({error})",
            "a CSV file in UTF-8 is needed",
            "Save it again as CSV, UTF-8",
        ) from error

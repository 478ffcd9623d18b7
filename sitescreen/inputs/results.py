"""The results of an earlier run, read back from its folder."""

import csv
import json
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sitescreen.errors import InputError

STARTS_A_FORMULA = ("=", "+", "-", "@", "\t", "\n")
"""A spreadsheet may run a cell that begins with one of these; tables are written with an apostrophe before it."""


@dataclass(frozen=True)
class Result:
    """What one run wrote: its record, and its ranking with every cell as text, without those apostrophes."""

    folder: Path
    record: dict[str, Any]
    rows: tuple[dict[str, str], ...]


def read_result(folder: Path) -> Result:
    """Read ``record.json`` and ``ranking.csv`` of a run.

    Parameters
    ----------
    folder : Path
        The folder that the run wrote.

    Raises
    ------
    InputError
        If it holds no results that can be read.
    """
    return Result(folder, _record(folder), _rows(folder))


def does_not_hold_together(folder: Path, error: Exception) -> InputError:
    """The refusal of a record and a ranking that lack what a run of this version writes."""
    return InputError(
        f"the results in {folder} do not hold together ({error})",
        "ranking.csv and record.json of one run of this version are needed",
        "Run “sitescreen rank” again",
    )


def _record(folder: Path) -> dict[str, Any]:
    path = folder / "record.json"
    try:
        content = json.loads(path.read_text(encoding="utf-8"))
        if isinstance(content, dict):
            return content
        said = "it is no record"
    except OSError as error:
        said = str(error.strerror)
    except ValueError as error:
        said = str(error)
    raise InputError(
        f"{path} cannot be read ({said})",
        "a folder that “sitescreen rank” wrote is needed",
        "Name the folder of the results, such as demo_region/out",
    )


def _rows(folder: Path) -> tuple[dict[str, str], ...]:
    path = folder / "ranking.csv"
    try:
        with path.open(encoding="utf-8", newline="") as file:
            rows = tuple(
                {column: _as_given(value or "") for column, value in row.items() if column is not None}
                for row in csv.DictReader(file)
            )
        if any(not {"plot", "name"} <= set(row) for row in rows):
            raise KeyError("plot")
    except (OSError, UnicodeDecodeError, csv.Error, KeyError) as error:
        raise InputError(
            f"{path} cannot be read as a ranking ({error})",
            "the table that “sitescreen rank” wrote is needed",
            "Run it again, or name another folder",
        ) from error
    return rows


def _as_given(text: str) -> str:
    return text[1:] if text.startswith("'") and text[1:].startswith(STARTS_A_FORMULA) else text

"""The ranking as a workbook."""

import time
from pathlib import Path
from typing import Any

import openpyxl
import pytest

from sitescreen.deliverables.columns import CONTRACT, columns_of
from sitescreen.deliverables.workbook import write_workbook


def written(screening: Any, path: Path) -> Path:
    write_workbook(screening.table, columns_of(screening.table, screening.profiles), path)
    return path


def test_head_units_and_numbers(screening: Any, tmp_path: Path) -> None:
    book = openpyxl.load_workbook(written(screening, tmp_path / "a.xlsx"))
    sheet = book["Ranking"]
    names = [c.value for c in sheet[1]]
    units = [c.value for c in sheet[2]]
    assert sheet.freeze_panes == "D3"
    assert sheet.auto_filter.ref.startswith("A2:")  # sorting leaves the units in place
    assert units[names.index("elevation_m")] == "m"
    assert sheet.max_row == 2 + len(screening.table)
    mark = sheet.cell(3, 1 + names.index("overall_mark"))
    assert mark.value == round(screening.table["overall_mark"][0], 1)
    assert mark.number_format == "0.0"
    assert sheet.cell(3, 1).value == 1


def test_each_column_has_its_line_of_explanation(screening: Any, tmp_path: Path) -> None:
    book = openpyxl.load_workbook(written(screening, tmp_path / "a.xlsx"))
    explained = [row[0].value for row in book["Columns"].iter_rows(min_row=2)]
    assert explained == [c.value for c in book["Ranking"][1]]


@pytest.mark.parametrize(
    "text", ["=1+1", "+1", "@x", "#N/A", '=HYPERLINK("x")', "a\x00b\x0bc", "\ud800 alone", "x" * 40_000]
)
def test_hostile_names_are_plain_text(invent: Any, text: str, tmp_path: Path) -> None:
    book = openpyxl.load_workbook(written(invent(names=(text, "b")), tmp_path / "a.xlsx"))
    cells = [row[2] for row in book["Ranking"].iter_rows(min_row=3)]
    hostile = next(c for c in cells if c.value != "b")
    assert hostile.data_type == "s"
    assert hostile.value[:1] == text[:1].replace("\ud800", "�")


def test_same_table_gives_the_same_bytes_at_another_hour(screening: Any, tmp_path: Path) -> None:
    one = written(screening, tmp_path / "a.xlsx").read_bytes()
    time.sleep(2.1)  # zip files count in steps of two seconds
    assert written(screening, tmp_path / "b.xlsx").read_bytes() == one


def test_columns_without_a_value_keep_their_place_but_are_hidden(screening: Any, tmp_path: Path) -> None:
    book = openpyxl.load_workbook(written(screening, tmp_path / "a.xlsx"))
    sheet = book["Ranking"]
    names = [c.value for c in sheet[1]]
    assert names[: len(CONTRACT)] == [column.name for column in CONTRACT]
    hidden = {
        names[i] for i in range(len(names)) if sheet.column_dimensions[openpyxl.utils.get_column_letter(i + 1)].hidden
    }
    empty = {name for i, name in enumerate(names) if all(row[i].value is None for row in sheet.iter_rows(min_row=3))}
    assert "sun_year_h" in hidden
    assert "slope_deg" not in hidden
    assert hidden == empty - {"cautions"}  # no caution at all is worth knowing
    says = {row[0].value: row[3].value for row in book["Columns"].iter_rows(min_row=2)}
    assert says["sun_year_h"].startswith("Empty in this run")

"""Small tables: read whatever a spreadsheet writes, refused where a number would be guessed."""

from pathlib import Path

import pytest

from sitescreen.errors import InputError
from sitescreen.inputs.climate_tables import Row, read_rows

TEXT = "place,value,more\nhere,1.5,x\n\nthere,-2,y\n"


def rows(folder: Path, content: str | bytes, needed: tuple[str, ...] = ("place", "value")) -> list[Row]:
    path = folder / "t.csv"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return read_rows(path, needed, ("extra",), "table")


@pytest.mark.parametrize(
    "content",
    [
        TEXT,
        TEXT.replace("\n", "\r\n"),
        TEXT.replace(",", ";"),
        TEXT.replace(",", "\t"),
        "place;value\nhere;1,5\n\nthere;-2\n",
        b"\xef\xbb\xbf" + TEXT.encode(),
        TEXT.encode("utf-16"),
        TEXT.replace("place,value", " Place ,VALUE"),
        "value,place\n1.5,here\n-2,there\n",
        TEXT.replace("-2", "−2"),
    ],
)
def test_all_usual_ways_of_writing_a_table_read_alike(tmp_path: Path, content: str | bytes) -> None:
    found = [(row.text("place"), row.number("value", -10, 10)) for row in rows(tmp_path, content)]
    assert found == [("here", 1.5), ("there", -2.0)]


def test_lines_are_counted_as_in_the_file(tmp_path: Path) -> None:
    here, there = rows(tmp_path, TEXT)
    assert (here.line, there.line) == (2, 4)
    with pytest.raises(InputError, match=r"line 4 of the table t\.csv: value is “-2”; a number from 0 to 5 is needed"):
        there.number("value", 0, 5)


@pytest.mark.parametrize("bad", ["", "x", "1.5.2", "nan", "inf", "1 000", "3 m/s"])
def test_what_is_no_number_is_refused(tmp_path: Path, bad: str) -> None:
    (row,) = rows(tmp_path, f"place,value\nhere,{bad}\n")
    with pytest.raises(InputError, match="line 2"):
        row.number("value", -1e9, 1e9)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("", "has no rows"),
        ("place,value\n", "has no rows"),
        ("place,valeu\nhere,1\n", "has no column value.*Rename “valeu” if that is it"),
        ("a,b\nhere,1\n", "has no column place, value"),
        ("place,value,value\nhere,1,2\n", "has the column value more than once"),
        ("place,value\nhere,1,5\n", "line 2 of the table t.csv has 3 values under 2 headings.*semicolons"),
        (b"place,value\nh\xe9re,1\n", "is not plain text in columns"),
        (b"PK\x03\x04\x00\xff\xfe\x00", "is not plain text in columns"),
        ('place,value\n"here,1\n', "is not plain text in columns"),
    ],
)
def test_a_table_that_cannot_be_trusted_is_refused(tmp_path: Path, content: str | bytes, message: str) -> None:
    with pytest.raises(InputError, match=message):
        rows(tmp_path, content)


def test_a_missing_table_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"the table gone\.csv cannot be read \(No such file"):
        read_rows(tmp_path / "gone.csv", ("a",), (), "table")

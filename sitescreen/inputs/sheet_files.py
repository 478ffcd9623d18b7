"""Plots from a sheet: CSV or XLSX with longitude and latitude, eastings and northings, or well-known text."""

import csv
import io
import re
from pathlib import Path
from typing import Any, NamedTuple

import geopandas as gpd
import numpy as np
import pandas as pd
import shapely
from numpy.typing import NDArray

from sitescreen.errors import InputError
from sitescreen.inputs.coordinates import Parsed, angles_deg, plain_numbers
from sitescreen.notes import Note

SHEET_ENDINGS = (".csv", ".tsv", ".txt", ".xlsx")

_LONGITUDE = ("lon", "long", "longitude", "lng", "londeg", "longdeg", "longitudedeg", "lonwgs84", "longitudewgs84")
_LATITUDE = ("lat", "latitude", "latdeg", "latitudedeg", "latwgs84", "latitudewgs84")
_EAST = ("x", "e", "east", "easting", "eastings", "xcoord", "xm", "eastm", "eastingm", "xutm", "utmx", "utme")
_NORTH = ("y", "n", "north", "northing", "northings", "ycoord", "ym", "northm", "northingm", "yutm", "utmy", "utmn")
_TEXT = ("wkt", "geometry", "geom", "thegeom", "wktgeom", "wktgeometry", "shape")

csv.field_size_limit(2**31 - 1)  # an outline with many corners is one long cell


class Sheet(NamedTuple):
    """A sheet as rows: ``table`` with geometry in the sheet's own numbers, and a problem a row, "" where it was read.

    ``degrees`` is True where the geometry came from longitude and latitude, or from text within ±180.
    """

    table: Any
    problems: NDArray[np.object_]
    degrees: bool
    notes: tuple[Note, ...]


def read_sheet(file: Path, has_crs: bool) -> Sheet:
    """Every row of a sheet, in its order, blank lines left out.

    Parameters
    ----------
    file : Path
        ``.csv``, ``.tsv``, ``.txt`` or ``.xlsx``. Separator (comma, semicolon, tab, bar) and encoding are found out.
    has_crs : bool
        Whether the brief names the coordinate system: eastings and northings are read only then.

    Raises
    ------
    InputError
        If the file is missing or empty, or has no columns with coordinates.
    """
    if not file.is_file():
        raise InputError(
            f"the plots file {file} does not exist",
            "a file that is there is needed",
            "Correct the name under [plots] in the brief, or copy the file to that place",
        )
    notes: list[Note] = []
    rows = _xlsx_rows(file, notes) if file.suffix.lower() == ".xlsx" else _csv_rows(file, notes)
    rows = [row for row in rows if any(cell.strip() for cell in row)]
    if len(rows) < 2:
        raise InputError(
            f"the plots file {file.name} has {'a heading but no rows' if rows else 'nothing in it'}",
            "a heading and at least one row are needed",
            "Check that the right sheet was saved",
        )
    headings = _unique([cell.strip() for cell in rows[0]])
    width = len(headings)
    problems = np.full(len(rows) - 1, "", dtype=object)
    for index, row in enumerate(rows[1:]):
        if len(row) > width and any(cell.strip() for cell in row[width:]):
            problems[index] = (
                f"its row has {len(row)} values under {width} headings, so it cannot be told which is which; "
                "write values that hold the separator in quotes"
            )
    if (problems != "").all():
        raise InputError(
            f"every row of {file.name} has more values than there are headings",
            "one value a heading is needed",
            "Where numbers have a decimal comma, separate the columns by semicolons or write the numbers in quotes",
        )
    cells = {
        name: np.array([row[at] if at < len(row) else "" for row in rows[1:]], dtype=object)
        for at, name in enumerate(headings)
    }
    geometry, found, degrees = _geometry(cells, file, has_crs)
    problems = np.where(problems == "", found, problems)
    geometry[problems != ""] = None
    own = pd.DataFrame(cells, dtype=object)
    table = gpd.GeoDataFrame(own.rename(columns={"geometry": "geometry (text)"}), geometry=geometry)
    return Sheet(table, problems, degrees, tuple(notes))


def _csv_rows(file: Path, notes: list[Note]) -> list[list[str]]:
    raw = file.read_bytes()
    if raw.startswith((b"\xff\xfe", b"\xfe\xff")):
        text = raw.decode("utf-16", errors="replace")
    else:
        try:
            text = raw.decode("utf-8-sig")
        except UnicodeDecodeError:
            text = raw.decode("cp1252", errors="replace")
            notes.append(
                Note("info", "plots", f"{file.name} is not UTF-8; it was read as Windows-1252. Check accented names.")
            )
    text = text.replace("\x00", "")
    first = next((line for line in text.splitlines() if line.strip()), "")
    if first.lower().startswith("sep=") and len(first) == 5:  # a hint that spreadsheets write and read
        text = text[text.index(first) + len(first) :].lstrip("\r\n")
        separator = first[4]
    else:
        bare = re.sub(r'"[^"]*"', "", first)
        separator = max(";\t|,", key=lambda mark: (bare.count(mark), mark == ","))
    try:
        return list(csv.reader(io.StringIO(text, newline=""), delimiter=separator))
    except csv.Error as error:
        raise InputError(
            f"the plots file {file.name} cannot be read as CSV ({error})",
            "rows of values parted by commas, semicolons or tabs are needed",
            "Save it again as CSV, UTF-8",
        ) from error


def _xlsx_rows(file: Path, notes: list[Note]) -> list[list[str]]:
    import zipfile

    import openpyxl
    from openpyxl.utils.exceptions import InvalidFileException

    try:
        book = openpyxl.load_workbook(file, read_only=True, data_only=True)
    except (InvalidFileException, zipfile.BadZipFile, KeyError, ValueError, OSError) as error:
        raise InputError(
            f"the plots file {file.name} cannot be opened as a workbook",
            "an .xlsx workbook is needed",
            "Save it again as .xlsx or as CSV",
        ) from error
    try:
        sheet = book.worksheets[0]
        if len(book.worksheets) > 1:
            notes.append(Note("info", "plots", f"{file.name}: the first of its sheets, “{sheet.title}”, was read."))
        return [[_cell_text(value) for value in row] for row in sheet.iter_rows(values_only=True)]
    finally:
        book.close()


def _cell_text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, float) and value.is_integer():
        return str(int(value))
    return repr(value) if isinstance(value, float) else str(value)


def _unique(headings: list[str]) -> list[str]:
    """Headings made different from one another: a second “note” becomes “note (2)”, an empty one “column 4”."""
    out: list[str] = []
    for at, heading in enumerate(headings):
        name = heading or f"column {at + 1}"
        number = 2
        base = name
        while name in out:
            name = f"{base} ({number})"
            number += 1
        out.append(name)
    return out


def _one(headings: list[str], words: tuple[str, ...], file: Path) -> str | None:
    found = [name for name in headings if re.sub(r"[^a-z0-9]", "", name.casefold()) in words]
    if len(found) > 1:
        raise InputError(
            f"{file.name} has several columns for one coordinate: {', '.join(f'“{name}”' for name in found)}",
            "one column each for longitude and latitude is needed",
            "Rename or remove the others",
        )
    return found[0] if found else None


def _geometry(
    cells: dict[str, NDArray[np.object_]], file: Path, has_crs: bool
) -> tuple[NDArray[np.object_], NDArray[np.object_], bool]:
    """Geometry, problems and whether the numbers are degrees."""
    headings = list(cells)
    text = _one(headings, _TEXT, file)
    if text is not None:
        geometry, problems = _from_text(cells[text])
        bounds = shapely.total_bounds(geometry)
        degrees = bool(np.isnan(bounds).any() or (np.abs(bounds) <= 180.0).all())
        return geometry, problems, degrees
    lon, lat = _one(headings, _LONGITUDE, file), _one(headings, _LATITUDE, file)
    if lon is not None and lat is not None:
        return *_points(angles_deg(cells[lon], "lon"), angles_deg(cells[lat], "lat")), True
    east, north = _one(headings, _EAST, file), _one(headings, _NORTH, file)
    if east is not None and north is not None:
        if not has_crs:
            raise InputError(
                f"{file.name} gives its coordinates as “{east}” and “{north}” and cannot say in which system",
                "the coordinate system is needed",
                'Name it in the brief, for instance [plots] crs = "EPSG:32737", or use the headings lon and lat '
                "for degrees on WGS 84",
            )
        return *_points(plain_numbers(cells[east], east), plain_numbers(cells[north], north)), False
    raise InputError(
        f"{file.name} has the columns {', '.join(f'“{name}”' for name in headings[:12])}",
        "columns for the coordinates are needed: lon and lat, or wkt, or x and y with [plots] crs in the brief",
        "Rename the columns that hold the coordinates",
    )


def _points(x: Parsed, y: Parsed) -> tuple[NDArray[np.object_], NDArray[np.object_]]:
    problems: NDArray[np.object_] = np.where(x.problems != "", x.problems, y.problems)
    geometry: NDArray[np.object_] = np.full(len(problems), None, dtype=object)
    fine = problems == ""
    geometry[fine] = shapely.points(x.values[fine], y.values[fine])
    return geometry, problems


def _from_text(texts: NDArray[np.object_]) -> tuple[NDArray[np.object_], NDArray[np.object_]]:
    problems = np.full(len(texts), "", dtype=object)
    blank = np.array([not text.strip() for text in texts], dtype=bool)
    bare = np.array([re.sub(r"^\s*SRID=\d+;", "", text) for text in texts], dtype=object)
    geometry: NDArray[np.object_] = np.array(shapely.from_wkt(bare, on_invalid="ignore"), dtype=object)
    missing = shapely.is_missing(geometry)
    for row in np.flatnonzero(missing):
        shown = str(texts[row]).strip()
        problems[row] = "its geometry is empty" if blank[row] else f"its geometry “{shown[:40]}” cannot be read"
    return geometry, problems


__all__ = ["SHEET_ENDINGS", "Sheet", "read_sheet"]

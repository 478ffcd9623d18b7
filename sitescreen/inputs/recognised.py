"""What each file of a folder seems to be: terrain, shore, plots, a table; a guess with its grounds, never more."""

import csv
import io
import warnings
from collections.abc import Collection, Mapping
from pathlib import Path
from typing import Any, Literal, NamedTuple

from sitescreen.errors import InputError
from sitescreen.inputs.shore_kinds import kind_of

Role = Literal[
    "terrain", "canopy", "cover", "shore", "plots", "zones", "wind", "normals", "sky", "hazard", "context", ""
]

RASTERS = (".tif", ".tiff", ".vrt", ".img", ".asc", ".hgt", ".dem", ".bil")
VECTORS = (".gpkg", ".geojson", ".json", ".shp", ".fgb", ".kml", ".kmz", ".gpx")
SHEETS = (".csv", ".tsv", ".xlsx")

_CLASSES_MOST = 40
"""A raster of whole numbers with no more different ones is a map of classes. Common practice, no source."""
_ROWS_LOOKED_AT = 2000
_M_A_DEGREE = 111_000.0

# parts of file names, the more telling roles first
_NAMED: tuple[tuple[Role, str], ...] = (
    ("hazard", "flood landslide slide protected reserve park contamin pollut tenure hazard buffer"),
    ("plots", "plot plots site sites parcel parcels candidate candidates lot lots"),
    ("zones", "zone zones climatezone"),
    ("shore", "shore shoreline coast coastline sea ocean lake lakes water waters island islands"),
    (
        "context",
        "road roads street streets track tracks path paths river rivers stream streams place places town towns",
    ),
)
_WIND, _NORMALS, _SKY = {"direction_deg", "share"}, {"month", "t_max_c", "t_min_c"}, {"month", "clear_share"}
_COORDINATES = ({"lon", "lat"}, {"longitude", "latitude"}, {"lng", "lat"}, {"x", "y"}, {"easting", "northing"}, {"wkt"})


class Found(NamedTuple):
    """One file and what it seems to be; ``role`` "" where it cannot be told or is of no use here.

    ``column`` is the one that holds the kinds of a shore or the zones of plots, or the one word for the whole file.
    ``classes`` are those of a map of ground cover; ``step_m`` is the width of a raster's cells, roughly.
    """

    file: Path
    role: Role
    why: str
    column: str = ""
    classes: tuple[int, ...] = ()
    name_column: str = ""
    step_m: float = 0.0


def recognise(folder: Path, zones: Collection[str]) -> tuple[Found, ...]:
    """Look at every file of a folder, its headings and a part of its content.

    Parameters
    ----------
    folder : Path
    zones : collection of str
        Names of the climate zones, to know a column that holds them.

    Returns
    -------
    tuple of Found
        By name of file. Files of no kind that sitescreen reads are left out.

    Raises
    ------
    InputError
        If there is no such folder.
    """
    if not folder.is_dir():
        raise InputError(f"there is no folder {folder}", "a folder with terrain and plots is needed", "Check its name")
    found = []
    for file in sorted(folder.iterdir()):
        ending = file.suffix.lower()
        if ending in RASTERS:
            found.append(_raster(file))
        elif ending in SHEETS:
            found.append(_sheet(file))
        elif ending in VECTORS:
            found.append(_vector(file, zones))
    return tuple(found)


def _raster(file: Path) -> Found:
    import numpy as np
    import rasterio

    try:
        with warnings.catch_warnings(), rasterio.open(file) as source:
            warnings.simplefilter("ignore")  # what is missing is said when the file is read for good
            bands, kind = source.count, source.dtypes[0]
            degrees = source.crs.is_geographic if source.crs else abs(source.transform.a) < 0.1
            step_m = abs(source.transform.a) * (_M_A_DEGREE if degrees else 1.0)
            shape = (1, min(source.height, 500), min(source.width, 500))
            sample = source.read([1], out_shape=shape, masked=True).compressed()
    except rasterio.errors.RasterioError as error:
        return Found(file, "", f"it cannot be read as a raster ({str(error).splitlines()[0][:120]})")
    words = _words(file)
    if bands >= 3:
        return Found(file, "", f"it has {bands} bands, so it is a picture and no model of heights")
    if words & {"canopy", "chm", "treeheight"}:
        return Found(file, "canopy", "its name speaks of tree heights")
    values = np.unique(sample)
    whole = kind.startswith(("int", "uint")) and len(values) <= _CLASSES_MOST
    if words & {"cover", "landcover", "landuse", "lulc", "class", "classes"} or (whole and kind in ("uint8", "int8")):
        return Found(file, "cover", f"it holds {len(values)} different whole numbers", classes=tuple(map(int, values)))
    return Found(file, "terrain", "it is a raster of heights, by its one band of numbers", step_m=step_m)


def _sheet(file: Path) -> Found:
    heading = _heading(file)
    if heading >= _WIND:
        return Found(file, "wind", "its headings are those of a wind table")
    if heading >= _NORMALS:
        return Found(file, "normals", "its headings are those of monthly climate normals")
    if heading >= _SKY:
        return Found(file, "sky", "its headings are those of a table of clear sky")
    if any(heading >= pair for pair in _COORDINATES):
        return Found(file, "plots", "it has columns of coordinates")
    return Found(file, "", "its headings are none that sitescreen knows")


def _heading(file: Path) -> set[str]:
    """The words of a sheet's first row, in small letters."""
    if file.suffix.lower() == ".xlsx":
        from sitescreen.inputs.sheet_files import read_sheet

        try:
            return {str(name).strip().casefold() for name in read_sheet(file, has_crs=True).table.columns}
        except InputError:
            return set()
    with file.open(encoding="utf-8-sig", errors="replace") as text:
        first = text.readline(100_000)
    separator = max(";\t|,", key=first.count)
    cells = next(csv.reader(io.StringIO(first), delimiter=separator), [])
    return {cell.strip().casefold() for cell in cells}


def _vector(file: Path, zones: Collection[str]) -> Found:
    import pyogrio

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            layers = [name for name, kind in pyogrio.list_layers(file) if kind is not None]
            if len(layers) > 1 and file.suffix.lower() == ".gpkg":
                listed = ", ".join(str(name) for name in layers[:6])
                return Found(file, "", f"it has {len(layers)} layers ({listed}); save each as a file of its own")
            shape = str(pyogrio.read_info(file).get("geometry_type") or "")
            table = pyogrio.read_dataframe(file, read_geometry=False, max_features=_ROWS_LOOKED_AT)
    except (pyogrio.errors.DataSourceError, pyogrio.errors.DataLayerError, OSError, ValueError) as error:
        return Found(file, "", f"it cannot be read as a map layer ({str(error).splitlines()[0][:120]})")
    texts = {str(name): _texts(table[name]) for name in table.columns}
    return _by_content(file, shape, texts, {zone.casefold() for zone in zones})


def _texts(values: Any) -> list[str]:
    return [str(value).strip() for value in values.tolist() if isinstance(value, str) and value.strip()]


def _by_content(file: Path, shape: str, texts: Mapping[str, list[str]], zones: set[str]) -> Found:
    """The role of a map layer by its columns' words, its name, and the kind of its shapes, in this order."""
    name = next((column for column in texts if column.casefold() in ("name", "label")), "")
    words, lines, areas = _words(file), "Line" in shape, "Polygon" in shape
    zoned = next((column for column, said in texts.items() if said and {one.casefold() for one in said} <= zones), "")
    kinds = next((column for column, said in texts.items() if said and all(kind_of(one) for one in said)), "")
    named: Role = next((role for role, parts in _NAMED if words & set(parts.split())), "")
    if kinds and not zoned and named in ("", "shore"):
        return Found(file, "shore", f"its column “{kinds}” says sea, lake or land", kinds)
    if zoned:
        role: Role = "plots" if named == "plots" or not areas else "zones"
        return Found(file, role, f"its column “{zoned}” names climate zones", zoned, name_column=name)
    if named == "shore":
        kind = next((kind for word in sorted(words) if (kind := kind_of(word))), "")
        return Found(file, "shore", f"its name says “{file.stem}”", kind)
    if named and not (named == "plots" and lines):
        return Found(file, named, f"its name says “{file.stem}”", name_column=name)
    if lines:
        return Found(file, "context", "it holds lines", name_column=name)
    return Found(
        file, "plots", f"it holds {'polygons' if areas else 'points'} and no name says otherwise", name_column=name
    )


def _words(file: Path) -> set[str]:
    """The words of a file's name."""
    return set("".join(sign if sign.isalpha() else " " for sign in file.stem.casefold()).split())


__all__ = ["Found", "Role", "recognise"]

"""Opening a vector file of any kind, with errors that a planner can act on."""

import difflib
import warnings
from pathlib import Path
from typing import Any, NamedTuple

import geopandas as gpd
import pandas as pd
import pyogrio
from pyogrio.errors import DataLayerError, DataSourceError

from sitescreen.errors import InputError
from sitescreen.notes import Note


class VectorFile(NamedTuple):
    """Rows of a file in its own coordinate system (``table.crs`` None where it names none), and what was noticed."""

    table: Any
    notes: tuple[Note, ...]


def read_vector(file: Path, where: str) -> VectorFile:
    """Every row of a vector file, in its order.

    Parameters
    ----------
    file : Path
        Any format that GDAL reads.
    where : str
        "plots" or "shore": the part of the brief it was named in.

    Returns
    -------
    VectorFile
        A geometry that the file holds in broken form (a ring of two points) is None in the table.

    Raises
    ------
    InputError
        If the file is missing, is no vector file, has several layers to choose from, or has no rows.
    """
    layers = _layers(file, where)
    notes: list[Note] = []
    tables = [_read_layer(file, layer, where) for layer in layers]
    table = tables[0] if len(tables) == 1 else _joined(tables)
    if file.suffix.lower() in (".gpx", ".kml", ".kmz"):  # their drivers add a column for everything a file might say
        table = table.drop(columns=[name for name in table.columns if name != "geometry" and table[name].isna().all()])
    if sum(len(part) > 0 for part in tables) > 1:
        notes.append(Note("info", where, f"{file.name}: its layers {_listed(layers)} were read one after the other."))
    if len(table) == 0:
        raise InputError(
            f"the {where} file {file.name} has no rows",
            "at least one is needed",
            f"Check that the right layer was saved, and name its file under [{where}] in the brief",
        )
    return VectorFile(table, tuple(notes))


def _layers(file: Path, where: str) -> list[str]:
    """The layers that hold geometry, in the file's order."""
    if not file.exists():
        raise InputError(
            f"the {where} file {file} does not exist",
            "a file that is there is needed",
            f"Correct the name under [{where}] in the brief, or copy the file to that place",
        )
    is_shapefile = file.suffix.lower() == ".shp" and file.stat().st_size >= 100  # its header's length
    if is_shapefile and not any(file.with_suffix(end).exists() for end in (".shx", ".SHX")):
        raise InputError(
            f"the {where} file {file.name} lacks its index {file.stem}.shx",
            "a shapefile is several files of one name",
            "Copy the .shx, .dbf and .prj along with it",
        )
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # remarks such as an odd version of GPX; what cannot be read still raises
            listed = [(str(name), kind) for name, kind in pyogrio.list_layers(file)]
    except (DataSourceError, DataLayerError, OSError, UnicodeDecodeError) as error:
        raise InputError(
            f"the {where} file {file.name} cannot be read as a map layer ({_short(error)})",
            "GeoPackage, GeoJSON, Shapefile, FlatGeobuf, KML or GPX is needed"
            + (", or CSV and XLSX with coordinates" if where == "plots" else ""),
            "Save it again in one of these formats",
        ) from error
    spatial = [name for name, kind in listed if kind is not None]
    if file.suffix.lower() == ".gpx":
        return [name for name in spatial if name in ("waypoints", "tracks", "routes")]
    if not spatial:
        raise InputError(
            f"the {where} file {file.name} has no layer with geometry",
            "points or polygons are needed",
            "Save the layer with its geometry",
        )
    if len(spatial) > 1 and file.suffix.lower() not in (".kml", ".kmz"):
        raise InputError(
            f"the {where} file {file.name} has {len(spatial)} layers: {_listed(spatial)}",
            f"a file with the one layer of the {where} is needed",
            f"Save that layer as a file of its own and name it under [{where}] in the brief",
        )
    return spatial


def _read_layer(file: Path, layer: str, where: str) -> Any:
    try:
        with warnings.catch_warnings():
            # GDAL's remarks on attributes (repeated feature numbers, odd dates) do not touch what is read here
            warnings.simplefilter("ignore")
            return pyogrio.read_dataframe(file, layer=layer, on_invalid="ignore")
    except (DataSourceError, DataLayerError, OSError, UnicodeDecodeError, ValueError) as error:
        raise InputError(
            f"the {where} file {file.name} breaks off or is damaged ({_short(error)})",
            "a file that can be read to its end is needed",
            "Save or copy it again",
        ) from error


def _joined(tables: list[Any]) -> Any:
    filled = [table for table in tables if len(table)]
    if not filled:
        return tables[0]
    return gpd.GeoDataFrame(pd.concat(filled, ignore_index=True), geometry="geometry", crs=filled[0].crs)


def column_named(wanted: str, columns: list[str], file: Path, key: str) -> str:
    """The column a brief asks for; its case may differ if that leaves one only.

    Raises
    ------
    InputError
        If there is none; the nearest names are given.
    """
    if wanted in columns:
        return wanted
    alike = [column for column in columns if column.strip().casefold() == wanted.strip().casefold()]
    if len(alike) == 1:
        return alike[0]
    near = difflib.get_close_matches(wanted, columns, n=1, cutoff=0.5)
    hint = f"Did you mean “{near[0]}”? Correct {key} in the brief" if near else f"Correct {key} in the brief"
    raise InputError(
        f"{key} is “{wanted}”, and {file.name} has no such column",
        f"one of its columns is needed: {_listed(columns) or 'it has none'}",
        hint,
    )


def _listed(names: list[str]) -> str:
    shown = ", ".join(f"“{name}”" for name in names[:12])
    return shown + (f" and {len(names) - 12} more" if len(names) > 12 else "")


def _short(error: Exception) -> str:
    return str(error).split("\n")[0].split(";")[0].rstrip(". ")[:200]

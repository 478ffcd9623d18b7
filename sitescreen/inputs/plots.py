"""Candidate plots: every row of the file comes out again, with its ground or with the reason why there is none."""

from collections import Counter
from dataclasses import dataclass
from pathlib import Path
from typing import Any, NamedTuple

import geopandas as gpd
import numpy as np
import pandas as pd
import shapely
from numpy.typing import NDArray
from pyproj import CRS

from sitescreen.errors import InputError
from sitescreen.inputs.datum import Datum, finite_only, geometry_to_wgs84, named_crs, refuse_unlike_its_system, to_wgs84
from sitescreen.inputs.plot_geometry import areas_m2, earlier_twin, plot_ground
from sitescreen.inputs.sheet_files import SHEET_ENDINGS, read_sheet
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.inputs.vector_files import column_named, read_vector
from sitescreen.notes import Note
from sitescreen.settings import load_defaults

ID_COLUMNS = ("plot", "plot_id", "plotid", "plot_no", "id", "parcel", "parcel_id", "site", "site_id", "ref", "code")
"""Columns that are taken as the identifier when none is named, in this order. Case does not matter."""

OUTSIDE_SHARE_MOST = 0.1
"""A plot with more of its area beyond the terrain is not judged: the rest would not stand for the whole."""


@dataclass(frozen=True)
class Plots:
    """The plots of one screening.

    Parameters
    ----------
    table : GeoDataFrame, EPSG:4326
        One row per row of the file, in the file's order. Columns: ``plot`` (str, unique), ``name`` and ``zone_given``
        (str, "" if none), ``lon`` and ``lat`` of one point on the plot [°], ``area_ha`` [ha], ``was_point`` (bool),
        ``outcome`` ("" = can be judged, else a clause that says why not), ``remarks`` (what was mended), ``geometry``
        (valid polygon, None where there is none), then the file's own columns as ``own:<column>``.
    stamp : FileStamp
    notes : tuple of Note
    """

    table: Any
    stamp: FileStamp
    notes: tuple[Note, ...]


class _Rows(NamedTuple):
    """The file as it came: its table, a problem a row, its system and what was noticed."""

    table: Any
    problems: NDArray[np.object_]
    crs: CRS
    closed_lines: bool
    notes: list[Note]


def read_plots(
    file: Path,
    *,
    id_column: str | None = None,
    name_column: str | None = None,
    zone_column: str | None = None,
    crs: str | None = None,
    point_radius_m: float = 60.0,
    outline: Any = None,
) -> Plots:
    """Read candidate plots from any usual file.

    Parameters
    ----------
    file : Path
        GeoPackage, GeoJSON, Shapefile, FlatGeobuf, KML, KMZ, GPX; or CSV and XLSX with lon/lat, x/y or wkt.
    id_column, name_column, zone_column : str, optional
        Columns of the identifier, the name and a zone that is given. Without ``id_column`` the first of
        :data:`ID_COLUMNS` whose values differ is taken, else rows are numbered from 1. Without ``name_column`` a
        column called ``name`` is.
    crs : str, optional
        Coordinate system of a file that cannot say it. A file that can keeps its own.
    point_radius_m : float
        Radius of the disc that stands for a point. [m]
    outline : shapely geometry, optional
        Footprint of the terrain, EPSG:4326; without it no plot is outside.

    Returns
    -------
    Plots

    Raises
    ------
    InputError
        If the file cannot be read, does not say its datum, has no rows, repeats an identifier, or has longitude and
        latitude swapped.
    """
    file = Path(file)
    if not 0.0 < point_radius_m <= 5000.0:
        raise InputError(
            f"[plots] point_radius_m is {point_radius_m:g}",
            "a radius above 0 and up to 5000 m is needed",
            "Correct it in the brief, or leave it out for 60 m",
        )
    rows = _open(file, crs)
    own = rows.table.drop(columns=rows.table.geometry.name)
    notes = rows.notes
    plot = _identifiers(own, id_column, file, notes)
    native = np.asarray(rows.table.geometry.values, dtype=object)
    refuse_unlike_its_system(file.name, rows.crs, shapely.total_bounds(native), _SAVE_AGAIN)
    datum = to_wgs84(rows.crs, file.name, None if outline is None else tuple(shapely.bounds(outline)))
    if datum.said:
        notes.append(Note("info", "plots", datum.said))
    lonlat = geometry_to_wgs84(native, datum)
    _refuse_swapped(native, lonlat, datum, outline, file)
    ground = plot_ground(lonlat, point_radius_m, rows.closed_lines)
    outcome = np.where(rows.problems != "", rows.problems, ground.outcome)
    lon, lat = _points_on(ground.geometry, ground.centre)
    outcome = np.where(outcome == "", _outside(ground.geometry, ground.remarks, outline), outcome)
    twin = earlier_twin(ground.geometry)
    for row in np.flatnonzero((twin >= 0) & (outcome == "")):
        outcome[row] = f"it covers the same ground as plot “{plot[twin[row]]}”, which stands earlier in the file"
    table = gpd.GeoDataFrame(
        {
            "plot": pd.array(plot, dtype=object),
            "name": pd.array(_texts(own, name_column, "name", "name", file), dtype=object),
            "zone_given": pd.array(_texts(own, zone_column, None, "zone", file), dtype=object),
            "lon": lon,
            "lat": lat,
            "area_ha": areas_m2(ground.geometry) / 1e4,
            "was_point": ground.was_point,
            "outcome": pd.array(outcome, dtype=object),
            "remarks": pd.array(["; ".join(said) for said in ground.remarks], dtype=object),
        },
        geometry=gpd.GeoSeries(ground.geometry, crs="EPSG:4326"),
    )
    table = pd.concat([table, own.add_prefix("own:").reset_index(drop=True)], axis=1)
    _summarise(table, point_radius_m, notes)
    if zone_column is None:
        notes += _unread_zones(own, file.name)
    return Plots(table, stamp(file, rows.crs.to_string()), tuple(notes))


_SAVE_AGAIN = "Save it again with the right coordinate system"


def _open(file: Path, crs: str | None) -> _Rows:
    given = named_crs(crs, "[plots] crs") if crs else None
    if file.suffix.lower() in SHEET_ENDINGS:
        sheet = read_sheet(file, given is not None)
        notes = list(sheet.notes)
        if given is None:
            if not sheet.degrees:
                raise InputError(
                    f"{file.name} holds coordinates beyond ±180 and cannot say in which system",
                    "the coordinate system is needed",
                    'Name it in the brief, for instance [plots] crs = "EPSG:32737"',
                )
            notes.append(
                Note(
                    "assumed",
                    "plots",
                    f"{file.name} gives degrees without a datum; WGS 84 is assumed, as GPS receivers give it. "
                    "If they are on an older national datum, some 300 m off, set [plots] crs in the brief.",
                )
            )
        return _Rows(sheet.table, sheet.problems, given or CRS("EPSG:4326"), False, notes)
    read = read_vector(file, "plots")
    notes = list(read.notes)
    own = CRS(read.table.crs) if read.table.crs is not None else None
    system = own or given
    if system is None:
        raise InputError(
            f"{file.name} does not say its coordinate system",
            "the system and its datum are needed: the wrong one moves the plots by 300 m or more",
            'Name it in the brief, for instance [plots] crs = "EPSG:32737"'
            + (", or put the .prj file beside it" if file.suffix.lower() == ".shp" else ""),
        )
    if own is not None and given is not None and not own.to_2d().equals(given.to_2d(), ignore_axis_order=True):
        notes.append(
            Note(
                "warning",
                "plots",
                f"{file.name} says it is in “{own.name}”, and the brief says “{given.name}”; the file was believed.",
            )
        )
    problems = np.full(len(read.table), "", dtype=object)
    return _Rows(read.table, problems, system, file.suffix.lower() == ".gpx", notes)


def _text(value: Any) -> str:
    """A cell as trimmed text; "" for a missing one; 7.0 becomes "7"."""
    if value is None or value is pd.NA or (isinstance(value, float) and np.isnan(value)) or value is pd.NaT:
        return ""
    if isinstance(value, float) and value.is_integer():
        return str(int(value))
    return str(value).strip()


def _texts(own: pd.DataFrame, column: str | None, fallback: str | None, key: str, file: Path) -> list[str]:
    columns = [str(name) for name in own.columns]
    if column is None:
        found = [name for name in columns if fallback is not None and name.casefold() == fallback]
        if len(found) != 1:
            return [""] * len(own)
        column = found[0]
    return [_text(value) for value in own[column_named(column, columns, file, f"[plots] {key}")].tolist()]


def _identifiers(own: pd.DataFrame, column: str | None, file: Path, notes: list[Note]) -> list[str]:
    columns = [str(name) for name in own.columns]
    if column is None:
        for wanted in ID_COLUMNS:
            found = [name for name in columns if name.casefold() == wanted]
            if len(found) == 1:
                ids = [_text(value) for value in own[found[0]].tolist()]
                if all(ids) and len(set(ids)) == len(ids):
                    notes.append(Note("info", "plots", f"The column “{found[0]}” of {file.name} names the plots."))
                    return ids
        notes.append(
            Note(
                "assumed",
                "plots",
                f"{file.name} has no column that names its plots; they are numbered 1 to {len(own)} in its order.",
            )
        )
        return [str(number) for number in range(1, len(own) + 1)]
    ids = _texts(own, column, None, "id", file)
    repeated = [name for name, times in Counter(ids).items() if times > 1 and name]
    if repeated:
        shown = ", ".join(f"“{name}”" for name in repeated[:5])
        raise InputError(
            f"{file.name} gives {len(repeated)} identifier(s) to several plots: {shown}"
            + (" and more" if len(repeated) > 5 else ""),
            f"a value of its own for each plot is needed in the column “{column}”",
            "Rename the repeated ones, or name another column under [plots] id",
        )
    taken = set(ids)
    for row, name in enumerate(ids):
        if not name:
            new = f"row {row + 1}"
            while new in taken:
                new += "*"
            taken.add(new)
            ids[row] = new
    blank = len(ids) - sum(
        1 for value in own[column_named(column, columns, file, "[plots] id")].tolist() if _text(value)
    )
    if blank:
        notes.append(
            Note("warning", "plots", f"{blank} plot(s) of {file.name} have no identifier and are named by their row.")
        )
    return ids


def _points_on(geometry: NDArray[np.object_], centre: Any) -> tuple[Any, Any]:
    """One point on each plot: a point's own place, else a point inside the polygon. [°] NaN without geometry."""
    inside = shapely.point_on_surface(geometry)
    lon, lat = shapely.get_x(inside), shapely.get_y(inside)
    known = ~np.isnan(centre[:, 0])
    lon[known], lat[known] = centre[known, 0], centre[known, 1]
    return lon, lat


def _swapped(geometry: NDArray[np.object_], datum: Datum) -> NDArray[np.object_]:
    turned = shapely.transform(shapely.force_2d(geometry), lambda xy: xy[:, ::-1])
    return finite_only(geometry_to_wgs84(np.asarray(turned, dtype=object), datum))


def _refuse_swapped(
    native: NDArray[np.object_], lonlat: NDArray[np.object_], datum: Datum, outline: Any, file: Path
) -> None:
    """Refuse a file that meets the terrain only once its two coordinates change places."""
    if outline is None:
        return
    shapely.prepare(outline)
    if shapely.intersects(outline, finite_only(lonlat)).any():
        return
    meets = int(shapely.intersects(outline, _swapped(native, datum)).sum())
    if meets:
        raise InputError(
            f"no plot of {file.name} lies on the terrain, but {meets} of {len(native)} would with longitude and "
            "latitude swapped",
            "longitude (x, east) first and latitude (y, north) second is needed",
            "Swap the two columns or coordinates in the file",
        )


def _outside(geometry: NDArray[np.object_], remarks: NDArray[np.object_], outline: Any) -> NDArray[np.object_]:
    """The outcome of plots beyond the terrain, "" for the others; a small part beyond it is only remarked."""
    outcome = np.full(len(geometry), "", dtype=object)
    if outline is None:
        return outcome
    shapely.prepare(outline)
    there = ~shapely.is_missing(geometry)
    meets = shapely.intersects(outline, geometry)
    outcome[there & ~meets] = "it lies outside the terrain"
    for row in np.flatnonzero(meets & ~shapely.covers(outline, geometry)):
        beyond = 1.0 - shapely.area(shapely.intersection(outline, geometry[row])) / shapely.area(geometry[row])
        if beyond > OUTSIDE_SHARE_MOST:
            outcome[row] = f"{100.0 * beyond:.0f} % of it lies outside the terrain, so it could be judged only partly"
        elif beyond >= 0.005:
            remarks[row].append(f"{100.0 * beyond:.0f} % of it lies outside the terrain")
    return outcome


def _unread_zones(own: pd.DataFrame, file: str) -> list[Note]:
    """A remark where a column seems to state climate zones and nobody asked for it to be read."""
    known = {name.replace("_", " ") for name in load_defaults().zones.with_normals}
    for column in own.columns:
        stated = [_text(value) for value in own[column]]
        zones = {one for one in stated if one.casefold().replace("_", " ").replace("-", " ") in known}
        if zones:
            text = f"The column “{column}” of {file} seems to state climate zones ({', '.join(sorted(zones)[:3])}). "
            text += f'They are not used unless the brief says so: [plots] zone = "{column}".'
            return [Note("warning", "plots", text)]
    return []


def _summarise(table: Any, point_radius_m: float, notes: list[Note]) -> None:
    points = int(table["was_point"].sum())
    if points:
        notes.append(
            Note(
                "info",
                "plots",
                f"{points} of {len(table)} plots are points; each stands for a disc of {point_radius_m:g} m.",
            )
        )
    mended = int(table["remarks"].str.contains("was mended").sum())
    if mended:
        notes.append(Note("info", "plots", f"{mended} plot outline(s) were not valid and were mended."))
    ended = int((table["outcome"] != "").sum())
    if ended:
        notes.append(Note("warning", "plots", f"{ended} of {len(table)} plots cannot be judged; each says why."))

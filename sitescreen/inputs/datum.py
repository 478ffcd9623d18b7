"""From the coordinate system of a file to WGS 84 longitude and latitude."""

import warnings
from typing import Any, NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import CRS, Transformer
from pyproj.aoi import AreaOfInterest
from pyproj.exceptions import CRSError, ProjError
from pyproj.transformer import TransformerGroup

from sitescreen.errors import InputError
from sitescreen.grid import Bounds

FloatArray = NDArray[np.float64]


class Datum(NamedTuple):
    """How a file's coordinates become WGS 84, and what there is to say about it."""

    crs: CRS
    transformer: Transformer
    said: str
    """A sentence where the datum is shifted, else empty."""


def named_crs(words: str, where: str) -> CRS:
    """The coordinate system that a user named in the brief.

    Parameters
    ----------
    words : str
        Such as ``"EPSG:32737"``.
    where : str
        The key it was read from, for the message.

    Raises
    ------
    InputError
        If it names none.
    """
    try:
        return CRS.from_user_input(words)
    except CRSError as error:
        raise InputError(
            f"{where} is “{words}”",
            "the name of a coordinate system is needed",
            "Write its EPSG code, such as “EPSG:4326” or “EPSG:32737”",
        ) from error


def to_wgs84(crs: CRS, name: str, near: Bounds | None) -> Datum:
    """The one transformation that serves a whole file.

    One for all its vertices: chosen vertex by vertex, an outline across a border would be torn by the tens of metres
    that two national shifts differ by.

    Parameters
    ----------
    crs : CRS
        The file's own system.
    name : str
        The file, for messages.
    near : Bounds, optional
        West, south, east, north of the ground in question, WGS 84 [°]; decides between several published shifts.

    Raises
    ------
    InputError
        If no published way leads from this system to WGS 84.
    """
    flat = crs.to_2d() if len(crs.axis_info) > 2 else crs
    aoi: Any = None
    if near is not None:
        west, south, east, north = near
        aoi = AreaOfInterest(max(west, -180.0), max(south, -90.0), min(east, 180.0), min(north, 90.0))
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", UserWarning)  # a missing shift grid is told from best_available below
            group = TransformerGroup(flat, "EPSG:4326", always_xy=True, allow_ballpark=False, area_of_interest=aoi)
    except (ProjError, CRSError):
        group = None
    if group is None or not group.transformers:
        raise InputError(
            f"{name} is in “{crs.name}”, from which no published transformation leads to WGS 84",
            "coordinates whose datum is known are needed",
            "Save the file in WGS 84 (EPSG:4326) or in a UTM zone on WGS 84",
        )
    transformer = group.transformers[0]
    said = ""
    accuracy = transformer.accuracy
    if accuracy != 0.0:
        steps = [part.strip() for part in transformer.description.split(" + ")]
        shift = next((part for part in steps if " to WGS 84" in part), steps[-1])
        reach = f"good to about {accuracy:g} m" if accuracy > 0 else "of unknown accuracy"
        said = f"{name} was moved from “{crs.name}” to WGS 84 by “{shift}”, {reach}."
        if not group.best_available:
            said += " A better shift exists but needs a grid that is not installed."
    return Datum(crs, transformer, said)


def geometry_to_wgs84(geometries: NDArray[np.object_], datum: Datum) -> NDArray[np.object_]:
    """Move geometries to longitude and latitude, two-dimensional; vertices that cannot be moved become infinite."""

    def move(xy: FloatArray) -> FloatArray:
        x, y = datum.transformer.transform(xy[:, 0], xy[:, 1])
        return np.column_stack([x, y])

    flat = shapely.force_2d(geometries)
    if datum.crs.is_geographic and datum.transformer.accuracy == 0.0 and _is_degrees(datum.crs):
        return np.asarray(flat, dtype=object)  # WGS 84 already: keep every bit
    return np.asarray(shapely.transform(flat, move), dtype=object)


def finite_only(geometries: NDArray[np.object_]) -> NDArray[np.object_]:
    """The geometries, None for those with a corner that is no number or infinite."""
    coordinates, owner = shapely.get_coordinates(geometries, return_index=True)
    out = geometries.copy()
    out[np.unique(owner[~np.isfinite(coordinates).all(axis=1)])] = None
    return out


def _is_degrees(crs: CRS) -> bool:
    prime = crs.prime_meridian.longitude if crs.prime_meridian is not None else 0.0
    return prime == 0.0 and all(axis.unit_name == "degree" for axis in crs.axis_info[:2])


def refuse_unlike_its_system(name: str, crs: CRS, total_bounds: FloatArray, way_out: str) -> None:
    """Refuse a file whose numbers cannot be what its coordinate system claims.

    Parameters
    ----------
    name : str
        The file.
    crs : CRS
        What it claims.
    total_bounds : array, shape (4,)
        West, south, east, north in the file's own numbers.
    way_out : str
        What to do.

    Raises
    ------
    InputError
        If a system in degrees holds values beyond ±360, or one in metres only values within ±180.
    """
    if not np.isfinite(total_bounds).all():
        return
    west, south, east, north = (float(value) for value in total_bounds)
    if crs.is_geographic and (max(abs(west), abs(east)) > 360.0 or max(abs(south), abs(north)) > 360.0):
        raise InputError(
            f"{name} says it is in degrees ({crs.name}), yet its coordinates reach from {west:.7g}, {south:.7g} to "
            f"{east:.7g}, {north:.7g}",
            "coordinates that fit their system are needed; these look like metres",
            way_out,
        )
    if crs.is_projected and max(abs(west), abs(east)) <= 180.0 and max(abs(south), abs(north)) <= 90.0:
        raise InputError(
            f"{name} says it is in metres ({crs.name}), yet all its coordinates lie between {west:.7g}, {south:.7g} "
            f"and {east:.7g}, {north:.7g}",
            "coordinates that fit their system are needed; these look like degrees",
            way_out,
        )


__all__ = ["Datum", "finite_only", "geometry_to_wgs84", "named_crs", "refuse_unlike_its_system", "to_wgs84"]

"""A planner's own layers: roads, rivers, flood zones, whatever speaks for or against a plot."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import CRS, Geod, Transformer

from sitescreen.errors import InputError
from sitescreen.inputs.datum import finite_only, geometry_to_wgs84, refuse_unlike_its_system, to_wgs84
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.inputs.vector_files import read_vector
from sitescreen.lattice import utm_zone
from sitescreen.notes import Note

FloatArray = NDArray[np.float64]

PIECE_M = 1000.0
"""Edges are cut into pieces of this length before they change projection; their sagitta is then a few centimetres."""

OVERLAP_M2 = 1.0
"""Two areas that share less than this only touch: the drawing accuracy of maps. (our choice)"""


@dataclass(frozen=True)
class OwnLayer:
    """Points, lines and polygons of one file, WGS 84, in one collection of pieces.

    Parameters
    ----------
    shapes : object array of shapely geometries, EPSG:4326
    stamp : FileStamp
    notes : tuple of Note
    """

    shapes: NDArray[np.object_]
    stamp: FileStamp
    notes: tuple[Note, ...]

    def distance_m(self, plots: Sequence[Any], lon_deg: FloatArray) -> FloatArray:
        """Distance from each plot's edge to the nearest thing in the whole layer.

        Parameters
        ----------
        plots : sequence of n shapely polygons, EPSG:4326; None where there is none
        lon_deg : float64 array, shape (n,)
            Longitude of a point in each plot: it settles the UTM zone to measure in. [°]

        Returns
        -------
        float64 array, shape (n,)
            [m] 0 where they touch or overlap; NaN without a plot. Geodesic length of the shortest line between them in
            the plot's UTM zone; depends on no other plot.
        """
        out = np.full(len(plots), np.nan)
        for rows, crs, here, layer in self._by_zone(plots, lon_deg):
            tree = shapely.STRtree(layer)
            nearest = tree.query_nearest(here, all_matches=False)
            near = layer[nearest[1]]
            lines = shapely.shortest_line(here[nearest[0]], near)
            ends = shapely.get_coordinates(lines).reshape(-1, 4)
            back = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
            lon_a, lat_a = back.transform(ends[:, 0], ends[:, 1])
            lon_b, lat_b = back.transform(ends[:, 2], ends[:, 3])
            length = np.asarray(Geod(ellps="WGS84").inv(lon_a, lat_a, lon_b, lat_b)[2])
            # two equal points come back from the projection a hair apart
            touching = shapely.intersects(here[nearest[0]], near)
            out[rows[nearest[0]]] = np.where(touching, 0.0, length)
        return out

    def is_inside(self, plots: Sequence[Any], lon_deg: FloatArray) -> FloatArray:
        """1 where a plot overlaps a polygon of the layer by over 1 m², or holds part of a line or a point; else 0.

        NaN without a plot. Arguments as for :meth:`distance_m`.
        """
        out = np.full(len(plots), np.nan)
        for rows, _, here, layer in self._by_zone(plots, lon_deg):
            out[rows] = 0.0
            plot, thing = shapely.STRtree(layer).query(here, predicate="intersects")
            is_area = shapely.get_dimensions(layer[thing]) == 2
            shared = np.where(is_area, shapely.area(shapely.intersection(here[plot], layer[thing])), np.inf)
            out[rows[plot[shared > OVERLAP_M2]]] = 1.0
        return out

    def _by_zone(self, plots: Sequence[Any], lon_deg: FloatArray) -> Iterable[tuple[Any, str, Any, Any]]:
        """Plots by UTM zone: their rows, the zone's system, and plots and layer in it."""
        outlines = np.array(list(plots), dtype=object)
        has_plot = np.array([one is not None and not one.is_empty for one in outlines], dtype=np.bool_)
        zones = np.array([utm_zone(lon) if told else 0 for lon, told in zip(lon_deg, has_plot, strict=True)])
        for zone in np.unique(zones[has_plot]):
            rows = np.flatnonzero(zones == zone)
            crs = f"EPSG:{32600 + zone}"
            there = _from_lonlat(crs)
            layer = finite_only(shapely.transform(self.shapes, there))  # far round the globe there is no such system
            layer = np.array([one for one in layer if one is not None], dtype=object)
            if len(layer):
                yield rows, crs, shapely.transform(shapely.force_2d(outlines[rows]), there), layer


def _from_lonlat(crs: str) -> Any:
    """A function from arrays (n, 2) of longitude and latitude to a metric system's."""
    there = Transformer.from_crs("EPSG:4326", crs, always_xy=True)

    def move(xy: FloatArray) -> FloatArray:
        return np.column_stack(there.transform(xy[:, 0], xy[:, 1]))

    return move


class Placed(NamedTuple):
    """What a vector file holds, in WGS 84: its rows that have a geometry, their shapes, and what was noticed."""

    table: Any
    shapes: NDArray[np.object_]
    crs: str
    notes: tuple[Note, ...]


def read_placed(file: Path, where: str) -> Placed:
    """Read the geometries of one layer, each with its row.

    Parameters
    ----------
    file : Path
        Any vector format that GDAL reads.
    where : str
        "constraint", "criterion" or "context": the part of the brief it was named in.

    Raises
    ------
    InputError
        If it cannot be read, is empty, or does not say its coordinate system.
    """
    table, notes = read_vector(file, where)
    if table.crs is None:
        raise InputError(
            f"the {where} file {file.name} does not say its coordinate system",
            "a stated coordinate system is needed",
            "Save it again with one, for instance as GeoPackage",
        )
    crs = CRS(table.crs)
    shapes = np.asarray(shapely.force_2d(table.geometry.to_numpy()), dtype=object)
    held = ~(shapely.is_missing(shapes) | shapely.is_empty(shapes))
    table, shapes = table[held], shapes[held]
    if not len(shapes):
        raise InputError(
            f"the {where} file {file.name} holds no geometry",
            "points, lines or polygons are needed",
            "Check that the right layer was saved",
        )
    refuse_unlike_its_system(file.name, crs, shapely.total_bounds(shapes), "Save it again with the right system")
    shapes = np.where(shapely.is_valid(shapes), shapes, shapely.make_valid(shapes))
    datum = to_wgs84(crs, file.name, None)
    unit_m = float(crs.axis_info[0].unit_conversion_factor) if crs.axis_info else 1.0
    longest = 0.01 if crs.is_geographic else PIECE_M / unit_m
    placed = finite_only(geometry_to_wgs84(np.asarray(shapely.segmentize(shapes, longest), dtype=object), datum))
    known = np.array([one is not None for one in placed], dtype=np.bool_)
    if not known.any():
        raise InputError(
            f"the {where} file {file.name} has no coordinates that are numbers",
            "a layer on the ground is needed",
            "Save it again from its source",
        )
    told = (Note("info", where, datum.said),) if datum.said else ()
    shown = np.array([one for one in placed if one is not None], dtype=object)
    return Placed(table[known], shown, crs.to_string(), (*notes, *told))


def read_own_layer(file: Path, where: str) -> OwnLayer:
    """Read one layer that plots are judged by; see :func:`read_placed`."""
    placed = read_placed(file, where)
    return OwnLayer(placed.shapes, stamp(file, placed.crs), placed.notes)


def read_own_layers(named: Iterable[tuple[Path, str]]) -> dict[Path, OwnLayer]:
    """Every layer that the brief's constraints and criteria name, each file once; as :func:`read_own_layer`."""
    layers: dict[Path, OwnLayer] = {}
    for file, where in named:
        if file not in layers:
            layers[file] = read_own_layer(file, where)
    return layers

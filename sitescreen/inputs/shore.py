"""The shore: where sea and lakes are, and the lines along which they meet the land."""

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import shapely
from numpy.typing import NDArray
from pyproj import CRS, Transformer

from sitescreen.errors import InputError
from sitescreen.grid import Grid
from sitescreen.inputs.datum import Datum, finite_only, geometry_to_wgs84, refuse_unlike_its_system, to_wgs84
from sitescreen.inputs.shore_edges import (
    KM_PER_DEGREE,
    cut_sides,
    known_region,
    layer_sides,
    without_cuts,
    without_frame,
)
from sitescreen.inputs.shore_kinds import WAY_OUT, shore_kinds
from sitescreen.inputs.shore_waters import Waters, areas_km2, lake_widths_km, polygon_parts, waters_of
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.inputs.vector_files import read_vector
from sitescreen.notes import Note

Geometries = NDArray[np.object_]

STRAIGHT_DEG = 0.02
"""Longer edges are given corners before they are moved to another map, where a straight line bends. [°]"""
FAR_DEG = 5.0
"""A shore farther from the terrain than this (some 550 km) deserves a warning. [°]"""


@dataclass(frozen=True)
class Shore:
    """Seas and lakes, and their shorelines.

    Parameters
    ----------
    waters : GeoDataFrame, EPSG:4326
        ``water_id`` (int), ``kind`` ("sea" or "lake"), ``name``, ``area_km2``, ``width_km`` (twice the radius of the
        largest circle that fits in; inf for the sea), ``geometry`` with islands as holes. The sea is one row. A sea
        known only as "not land" is drawn to 60 km beyond the terrain. Empty if the file holds lines.
    lines : GeoDataFrame, EPSG:4326
        ``water_id``, ``kind``, ``geometry``: shorelines of the whole layer, islands' included; edges where the layer
        was merely cut off, and lakes too small for a breeze, left out. ``water_id`` is −1 for lines whose water is
        not mapped as an area.
    stamp : FileStamp
    notes : tuple of Note
    """

    waters: Any
    lines: Any
    stamp: FileStamp
    notes: tuple[Note, ...]

    def water_kind(self, grid: Grid) -> NDArray[np.uint8]:
        """What lies under the centre of each cell: 0 land or unknown, 1 sea, 2 lake.

        Parameters
        ----------
        grid : Grid

        Returns
        -------
        uint8 array, shape (rows, cols)
        """
        from rasterio.features import rasterize

        shapes = [(part, 1 if kind == "sea" else 2) for kind in ("sea", "lake") for part in self._on_grid(kind, grid)]
        if not shapes:
            return np.zeros(grid.shape, dtype=np.uint8)
        return np.asarray(
            rasterize(shapes, out_shape=grid.shape, transform=grid.transform, fill=0, dtype="uint8"), dtype=np.uint8
        )

    def _on_grid(self, kind: str, grid: Grid) -> Geometries:
        """The waters of one kind near a grid, in its system."""
        back = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
        west, south, east, north = back.transform_bounds(*grid.bounds, densify_pts=51)
        # a grid's rim may lie across the 180° meridian: its east is then the smaller number
        spans = [(west, east)] if west <= east else [(west, 180.0), (-180.0, east)]
        parts = polygon_parts(self.waters.geometry.values[(self.waters["kind"] == kind).to_numpy()])
        near = [shapely.clip_by_rect(parts, a - 0.05, south - 0.05, b + 0.05, north + 0.05) for a, b in spans]
        clipped = polygon_parts(np.concatenate(near))
        there = Transformer.from_crs("EPSG:4326", grid.crs, always_xy=True)
        return _moved(shapely.segmentize(clipped, STRAIGHT_DEG), there)

    def share_in_water(self, plots: Any) -> NDArray[np.float64]:
        """The share of each plot's area that lies in mapped water.

        Parameters
        ----------
        plots : GeoSeries, EPSG:4326, length n
            Valid polygons; None where a plot has no ground.

        Returns
        -------
        float64 array, shape (n,)
            0–1, NaN where there is no ground, and for all where only shorelines are known.
        """
        ground: Geometries = np.asarray(plots.values, dtype=object)
        share = np.where(shapely.is_missing(ground) | shapely.is_empty(ground), np.nan, 0.0)
        parts = polygon_parts(self.waters.geometry.values)
        if len(parts) == 0:
            return np.full(len(ground), np.nan)
        tree = shapely.STRtree(ground)
        # asked from the water's side: a large outline is prepared once and serves all plots
        water, plot = tree.query(parts, predicate="intersects")
        covered = tree.query(parts, predicate="covers")
        whole = np.isin(water * len(ground) + plot, covered[0] * len(ground) + covered[1])
        share[plot[whole]] = 1.0
        for part, row in zip(parts[water[~whole]], plot[~whole], strict=True):
            near = shapely.clip_by_rect(part, *_grown(shapely.bounds(ground[row])))
            wet = shapely.intersection(near, ground[row])
            share[row] += shapely.area(wet) / shapely.area(ground[row])
        return np.asarray(np.minimum(share, 1.0), dtype=np.float64)


def _grown(bounds: NDArray[np.float64]) -> tuple[float, float, float, float]:
    west, south, east, north = (float(value) for value in bounds)
    return west - 1e-6, south - 1e-6, east + 1e-6, north + 1e-6


def _moved(geometries: Geometries, transformer: Transformer) -> Geometries:
    def move(xy: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.column_stack(transformer.transform(xy[:, 0], xy[:, 1]))

    return np.asarray(shapely.transform(geometries, move), dtype=object)


def read_shore(file: Path, kind: str | None, frame: Any, smallest_lake_km2: float = 1.0) -> Shore:
    """Read a shoreline layer.

    Parameters
    ----------
    file : Path
        Polygons of water or of land, or lines.
    kind : str, optional
        Column that holds sea, lake or land; or the word itself for all rows. Without it a column of a usual name is
        looked for.
    frame : shapely geometry
        Outline of the terrain, EPSG:4326.
    smallest_lake_km2 : float
        Smaller lakes make no breeze: they keep their area and lose their lines. [km²]

    Returns
    -------
    Shore

    Raises
    ------
    InputError
        If the file cannot be read, does not say its coordinate system or which water is which, or holds no shore.
    """
    file = Path(file)
    read = read_vector(file, "shore")
    table, notes = read.table, list(read.notes)
    if table.crs is None:
        raise InputError(
            f"the shore file {file.name} does not say its coordinate system",
            "the system is needed: a wrong one moves the shore by 300 m or more",
            "Save it again with its system (a shapefile keeps it in the .prj file beside it)",
        )
    kinds = shore_kinds(table, kind, file)
    notes.extend(kinds.notes)
    crs = CRS(table.crs)
    shapes: Geometries = shapely.force_2d(np.asarray(table.geometry.values, dtype=object))
    refuse_unlike_its_system(file.name, crs, shapely.total_bounds(shapes), "Save it again with the right system")
    datum = to_wgs84(crs, file.name, tuple(shapely.bounds(frame)))
    if datum.said:
        notes.append(Note("info", "shore", datum.said))
    if crs.is_projected:  # edges straight on the file's own map
        shapes = np.asarray(shapely.segmentize(shapes, 2000.0 / _unit_m(crs)), dtype=object)
    dimension = shapely.get_dimensions(shapes)
    used = (kinds.kinds != "") & ~shapely.is_missing(shapes) & ~shapely.is_empty(shapes)
    areal, linear = used & (dimension == 2), used & (dimension == 1)
    if not areal.any() and not linear.any():
        raise InputError(
            f"the shore file {file.name} has {len(table)} row(s) and no polygon or line of sea, lake or land in them",
            "polygons of water or land are needed, or lines along the shore",
            "Check that the right layer was saved",
        )
    _refuse_swapped(shapes[areal | linear], datum, frame, file)
    if areal.any():
        if linear.any():
            notes.append(
                Note("info", "shore", f"{int(linear.sum())} line(s) of {file.name} were left out: it has areas.")
            )
        waters, lines = _from_polygons(table[areal], shapes[areal], kinds.kinds[areal], datum, frame, file, notes)
    else:
        waters, lines = _from_lines(shapes[linear], kinds.kinds[linear], datum, file, notes)
    _say_share(waters, frame, file, notes)
    small = (waters["kind"] == "lake") & (waters["area_km2"] < smallest_lake_km2)
    if small.any():
        lines = lines[~lines["water_id"].isin(waters["water_id"][small])].reset_index(drop=True)
        text = f"{int(small.sum())} lake(s) under {smallest_lake_km2:g} km² are water, but too small to make a breeze."
        notes.append(Note("info", "shore", text))
    _say_far(lines, frame, file, notes)
    return Shore(waters, lines, stamp(file, crs.to_string()), tuple(notes))


def _unit_m(crs: CRS) -> float:
    return float(crs.axis_info[0].unit_conversion_factor) if crs.axis_info else 1.0


def _from_polygons(
    table: Any, shapes: Geometries, kinds: NDArray[np.object_], datum: Datum, frame: Any, file: Path, notes: list[Note]
) -> tuple[Any, Any]:
    broken = ~shapely.is_valid(shapes)
    if broken.any():
        shapes = shapes.copy()
        shapes[broken] = shapely.make_valid(shapes[broken], method="structure", keep_collapsed=False)
        notes.append(Note("info", "shore", f"{int(broken.sum())} outline(s) of {file.name} were not valid and mended."))
    parts, row = shapely.get_parts(shapes, return_index=True)
    flat = shapely.get_type_id(parts) == 3
    parts, row = np.asarray(parts[flat], dtype=object), row[flat]
    km_per_unit = KM_PER_DEGREE if datum.crs.is_geographic else _unit_m(datum.crs) / 1000.0
    cut = cut_sides(geometry_to_wgs84(layer_sides(parts, km_per_unit), datum), frame)
    known = known_region(shapely.total_bounds(parts), ~shapely.is_empty(cut), km_per_unit)
    region = geometry_to_wgs84(np.array([shapely.segmentize(known, 20.0 / km_per_unit)], dtype=object), datum)[0]
    lonlat = geometry_to_wgs84(parts, datum)
    lonlat[~shapely.is_valid(lonlat)] = shapely.make_valid(lonlat[~shapely.is_valid(lonlat)])
    found = waters_of(lonlat, kinds[row], frame, _drawable(region), file.name)
    notes.extend(found.notes)
    waters = _water_table(found, table, lonlat, row)
    return waters, _line_table(found, cut, frame, notes)


def _drawable(region: Any) -> Any:
    """A region whose far corners may lie beyond the map, cut to the globe."""
    if not np.isfinite(shapely.get_coordinates(region)).all():
        return shapely.box(-180.0, -90.0, 180.0, 90.0)
    valid = region if region.is_valid else shapely.make_valid(region)
    return shapely.intersection(valid, shapely.box(-180.0, -90.0, 180.0, 90.0))


def _water_table(found: Waters, table: Any, polygons: Geometries, row: NDArray[np.int64]) -> Any:
    has_sea = not found.sea.is_empty
    geometry = ([found.sea] if has_sea else []) + list(found.lakes)
    number = len(geometry)
    names = [""] * number
    named = [str(name) for name in table.columns if str(name).casefold() == "name"]
    if named:
        given = ["" if value is None or value != value else str(value).strip() for value in table[named[0]].tolist()]
        inside = shapely.point_on_surface(polygons)
        whole, part = shapely.STRtree(inside).query(np.array(geometry, dtype=object), predicate="contains")
        for at, one in sorted(zip(whole.tolist(), part.tolist(), strict=True)):
            names[at] = names[at] or given[row[one]]
    return gpd.GeoDataFrame(
        {
            "water_id": np.arange(number),
            "kind": pd.array((["sea"] if has_sea else []) + ["lake"] * len(found.lakes), dtype=object),
            "name": pd.array(names, dtype=object),
            "area_km2": areas_km2(np.array(geometry, dtype=object)),
            "width_km": np.concatenate([np.full(int(has_sea), np.inf), lake_widths_km(found.lakes)]),
        },
        geometry=gpd.GeoSeries(geometry, crs="EPSG:4326"),
    )


def _line_table(found: Waters, cut: Geometries, frame: Any, notes: list[Note]) -> Any:
    """Outlines without what is no shore: cut edges, and seams where a river mouth's sea meets its lake."""
    has_sea = not found.sea.is_empty or not found.sea_outline.is_empty
    outlines = np.array(([found.sea_outline] if has_sea else []) + list(found.lake_outlines), dtype=object)
    kinds = np.array((["sea"] if has_sea else []) + ["lake"] * len(found.lakes), dtype=object)
    ids = np.arange(len(outlines)) if not found.sea.is_empty or not has_sea else np.arange(len(outlines)) - 1
    shores = without_frame(without_cuts(outlines, cut), frame)
    part = (shapely.length(shores) < 0.999 * shapely.length(outlines)) & (kinds == "lake")
    if part.any():
        text = f"{int(part.sum())} lake(s) end at the edge of the layer: they may be wider than drawn."
        notes.append(Note("warning", "shore", text))
    if has_sea and len(found.lakes) and not found.sea.is_empty:
        for at in np.flatnonzero(shapely.intersects(found.sea, found.lakes)) + 1:
            shores[0] = shapely.difference(shores[0], found.lakes[at - 1])
            shores[at] = shapely.difference(shores[at], found.sea)
    kept = ~shapely.is_empty(shores)
    if not kept.any():
        text = "All outlines of the shore layer run where it was cut off, so no shoreline is known."
        notes.append(Note("warning", "shore", text))
    return gpd.GeoDataFrame(
        {"water_id": ids[kept], "kind": pd.array(kinds[kept], dtype=object)},
        geometry=gpd.GeoSeries(shores[kept], crs="EPSG:4326"),
    )


def _from_lines(
    shapes: Geometries, kinds: NDArray[np.object_], datum: Datum, file: Path, notes: list[Note]
) -> tuple[Any, Any]:
    if (kinds == "land").any():
        raise InputError(
            f"{file.name} holds lines that are called land",
            "for lines it is needed whether sea or lake lies on their other side",
            WAY_OUT,
        )
    text = (
        f"{file.name} holds lines: distances are measured to them, but plots in the water, the width of a lake and "
        "creeks, which are not the open sea, cannot be told. Polygons of water would say."
    )
    notes.append(Note("warning", "shore", text))
    waters = gpd.GeoDataFrame(
        {
            "water_id": np.array([], dtype=np.int64),
            "kind": pd.array([], dtype=object),
            "name": pd.array([], dtype=object),
            "area_km2": np.array([], dtype=np.float64),
            "width_km": np.array([], dtype=np.float64),
        },
        geometry=gpd.GeoSeries([], crs="EPSG:4326"),
    )
    lines = gpd.GeoDataFrame(
        {"water_id": np.full(len(shapes), -1), "kind": pd.array(kinds, dtype=object)},
        geometry=gpd.GeoSeries(geometry_to_wgs84(shapes, datum), crs="EPSG:4326"),
    )
    return waters, lines


def _refuse_swapped(shapes: Geometries, datum: Datum, frame: Any, file: Path) -> None:
    """Refuse a layer that comes near the terrain only once its two coordinates change places."""
    near = shapely.box(*_wider(shapely.bounds(frame), FAR_DEG))
    boxes = np.array([shapely.box(*shapely.total_bounds(shapes))], dtype=object)
    if shapely.intersects(near, finite_only(geometry_to_wgs84(boxes, datum))).any():
        return
    turned = np.asarray(shapely.transform(boxes, lambda xy: xy[:, ::-1]), dtype=object)
    if shapely.intersects(near, finite_only(geometry_to_wgs84(turned, datum))).any():
        raise InputError(
            f"the shore file {file.name} lies nowhere near the terrain, but would with longitude and latitude swapped",
            "longitude (x, east) first and latitude (y, north) second is needed",
            "Swap the coordinates in the file",
        )


def _say_share(waters: Any, frame: Any, file: Path, notes: list[Note]) -> None:
    if len(waters) == 0:
        return
    wet = shapely.union_all(shapely.clip_by_rect(waters.geometry.values, *(float(v) for v in shapely.bounds(frame))))
    share = float(shapely.area(shapely.intersection(wet, frame)) / shapely.area(frame))
    text = f"{share:.0%} of the terrain is mapped as water."
    if share > 0.95:
        text += f' If {file.name} holds land, say so: [shore] kind = "land".'
    notes.append(Note("warning" if share > 0.95 else "info", "shore", text))


def _say_far(lines: Any, frame: Any, file: Path, notes: list[Note]) -> None:
    near = shapely.box(*_wider(shapely.bounds(frame), FAR_DEG))
    if len(lines) and not shapely.intersects(near, lines.geometry.values).any():
        text = f"No shore of {file.name} that can make a breeze lies within 500 km of the terrain."
        notes.append(Note("warning", "shore", text))


def _wider(bounds: NDArray[np.float64], by: float) -> tuple[float, float, float, float]:
    west, south, east, north = (float(value) for value in bounds)
    return west - by, south - by, east + by, north + by


__all__ = ["Shore", "read_shore"]

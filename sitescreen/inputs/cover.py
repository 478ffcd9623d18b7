"""Ground cover: a map of classes, and what each class means for the air.

Canopies and roughness serve the wind, the cold-air factor the nights.
"""

from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import CRS, Transformer

from sitescreen.brief import CoverBrief, CoverClass
from sitescreen.errors import InputError
from sitescreen.grid import Grid
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.notes import Note

STRIP_CELLS = 1 << 24
"""Cells of a raster that are looked at in one go."""

_RASTERS = (".tif", ".tiff", ".img", ".vrt", ".asc", ".nc", ".jp2")


@dataclass(frozen=True)
class Cover:
    """A map of ground cover.

    Parameters
    ----------
    table : tuple of (class, CoverClass)
        Class ``k`` of :meth:`classes` is entry ``k − 1``.
    stamp : FileStamp
    notes : tuple of Note
    """

    table: tuple[tuple[str, CoverClass], ...]
    stamp: FileStamp
    notes: tuple[Note, ...]
    _path: Path
    _crs_wkt: str
    _polygons: Any

    def classes(self, grid: Grid) -> NDArray[np.uint8]:
        """The class at the centre of each cell: 0 where none is mapped, else 1 + its place in the table.

        Parameters
        ----------
        grid : Grid

        Returns
        -------
        uint8 array, shape (rows, cols)
        """
        return self._from_raster(grid) if self._polygons is None else self._from_polygons(grid)

    def values(
        self,
        classes: NDArray[np.uint8],
        key: Literal["roughness_m", "canopy_m", "cold_air_factor"],
        unmapped: float,
    ) -> NDArray[np.float32]:
        """What the classes of cells mean.

        Parameters
        ----------
        classes : uint8 array
            As :meth:`classes` gives them.
        key : str
            Roughness length [m], canopy height [m], or the factor on the cold air that a cell makes [1].
        unmapped : float
            For cells of no class.

        Returns
        -------
        float32 array, shape of ``classes``
        """
        by_class = np.array([unmapped, *(getattr(one, key) for _, one in self.table)], dtype=np.float32)
        return by_class[classes]

    def _from_raster(self, grid: Grid) -> NDArray[np.uint8]:
        import rasterio
        from rasterio.warp import Resampling, reproject

        nothing = np.iinfo(np.int32).min
        found = np.full(grid.shape, nothing, dtype=np.int32)
        with rasterio.open(self._path) as source:
            reproject(
                rasterio.band(source, 1),
                found,
                src_crs=self._crs_wkt,
                dst_transform=grid.transform,
                dst_crs=grid.crs,
                dst_nodata=nothing,
                resampling=Resampling.nearest,
                tolerance=0.0,
            )
        out = np.zeros(grid.shape, dtype=np.uint8)
        for number, (code, _) in enumerate(self.table, start=1):
            out[found == int(code)] = number
        return out

    def _from_polygons(self, grid: Grid) -> NDArray[np.uint8]:
        from rasterio.features import rasterize

        to_grid = Transformer.from_crs("EPSG:4326", grid.crs, always_xy=True)
        back = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
        west, south, east, north = back.transform_bounds(*grid.bounds, densify_pts=21)
        near = shapely.box(west - 0.01, south - 0.01, east + 0.01, north + 0.01)
        geometry, number = self._polygons
        shapes = [
            (shapely.transform(one, lambda xy: np.column_stack(to_grid.transform(xy[:, 0], xy[:, 1]))), int(k))
            for one, k in zip(geometry[::-1], number[::-1], strict=True)  # drawn last: the first in the file wins
            if k and one is not None and one.intersects(near)
        ]
        if not shapes:
            return np.zeros(grid.shape, dtype=np.uint8)
        drawn = rasterize(shapes, out_shape=grid.shape, transform=grid.transform, fill=0, dtype="uint8")
        return np.asarray(drawn, dtype=np.uint8)


def read_cover(brief: CoverBrief) -> Cover:
    """Open a map of ground cover and check it against the brief's classes.

    Parameters
    ----------
    brief : CoverBrief
        A raster of whole numbers, each a key of ``[cover.classes]``; or polygons with a column that holds the class.

    Raises
    ------
    InputError
        If it cannot be read, says no coordinate system, or shares no class with the brief.
    """
    table = tuple(brief.classes.items())
    if brief.file.suffix.lower() in _RASTERS:
        return _raster(brief.file, table)
    return _polygon_map(brief.file, brief.column, table)


def _raster(path: Path, table: tuple[tuple[str, CoverClass], ...]) -> Cover:
    import rasterio
    from rasterio.errors import RasterioError

    wrong = [code for code, _ in table if not code.lstrip("-").isdigit()]
    if wrong:
        raise InputError(
            f"[cover.classes] has the class “{wrong[0]}” and {path.name} is a raster",
            "the whole numbers that stand in the raster are needed",
            "Write, for instance: 10 = { roughness_m = 1.0, canopy_m = 18, cold_air_factor = 0.8 }",
        )
    try:
        with rasterio.open(path) as source:
            crs = source.crs
            whole = np.issubdtype(np.dtype(source.dtypes[0]), np.integer)
            seen = _classes_in(source) if whole else set()
    except RasterioError as error:
        raise InputError(
            f"the ground cover {path.name} cannot be read as a raster",
            "a whole raster of classes is needed",
            "Check the path under [cover] file, and copy or download it again",
        ) from error
    if not whole:
        raise InputError(
            f"the ground cover {path.name} holds numbers with fractions",
            "whole numbers, one for each class, are needed",
            "Take the file of classes, not one of shares or heights",
        )
    system = _system(crs, path)
    if not seen:
        raise InputError(
            f"the ground cover {path.name} holds no class at all, only gaps",
            "a raster of classes is needed",
            "Check that it is the right file, and that its no-data value is not a class",
        )
    notes = _compared({str(code) for code in seen}, table, path.name)
    code = system.to_epsg()
    return Cover(table, stamp(path, f"EPSG:{code}" if code else system.name), notes, path, crs.to_wkt(), None)


def _classes_in(source: Any) -> set[int]:
    """The classes in a raster, its gaps left out. The whole of it is read: a class may lie in one corner only."""
    from rasterio.windows import Window

    block = int(source.block_shapes[0][0])
    high = max(1, STRIP_CELLS // source.width // block) * block
    seen: set[int] = set()
    for top in range(0, source.height, high):
        window = Window(0, top, source.width, min(high, source.height - top))
        values = source.read(1, window=window)[source.read_masks(1, window=window) > 0]
        few = values.dtype.kind == "u" and values.dtype.itemsize <= 2  # counting is ten times as fast as sorting
        seen.update((np.flatnonzero(np.bincount(values)) if few else np.unique(values)).tolist())
    return seen


def _polygon_map(path: Path, column: str | None, table: tuple[tuple[str, CoverClass], ...]) -> Cover:
    from sitescreen.inputs.datum import geometry_to_wgs84, to_wgs84
    from sitescreen.inputs.vector_files import column_named, read_vector

    read = read_vector(path, "cover")
    names = [str(name) for name in read.table.columns if name != read.table.geometry.name]
    name = column_named(column or "class", names, path, "[cover] column")
    system = _system(read.table.crs, path)
    table_of = read.table[read.table.geometry.geom_type.isin(("Polygon", "MultiPolygon")) & read.table[name].notna()]
    if table_of.empty:
        raise InputError(
            f"the ground cover {path.name} has no polygon with a class",
            "polygons, each with its class, are needed",
            "Check the file, and [cover] column in the brief",
        )
    notes = read.notes
    if len(table_of) < len(read.table):
        said = f"{path.name}: {len(read.table) - len(table_of)} of {len(read.table)} rows are no polygons with a class."
        notes += (Note("warning", "cover", f"{said} They were left out."),)
    values = table_of[name].map(_as_written)
    notes += _compared(set(values), table, path.name)
    places = {key: number for number, (key, _) in enumerate(table, start=1)}
    datum = to_wgs84(system, path.name, None)
    geometry = geometry_to_wgs84(np.asarray(table_of.geometry.values, dtype=object), datum)
    numbers = np.array([places.get(value, 0) for value in values], dtype=np.uint8)
    code = datum.crs.to_epsg()
    polygons = (geometry, numbers)
    return Cover(table, stamp(path, f"EPSG:{code}" if code else datum.crs.name), notes, path, "", polygons)


def _as_written(value: Any) -> str:
    """A class as the brief writes it: 10 for 10.0, to which a column with one empty cell turns its whole numbers."""
    return str(int(value)) if isinstance(value, float) and value.is_integer() else str(value).strip()


def _system(found: Any, path: Path) -> CRS:
    """The coordinate system of a file, refused where it ties the file to no place."""
    system = CRS.from_wkt(found.to_wkt()) if found is not None and found.to_wkt() else None
    if system is not None and system.is_compound:
        system = system.sub_crs_list[0]
    if system is None or not (system.is_geographic or system.is_projected):
        raise InputError(
            f"the ground cover {path.name} does not say its coordinate system"
            + (f": “{system.name}” is tied to no place" if system is not None else ""),
            "a stated coordinate system is needed",
            "Save it again with one",
        )
    return system


def _compared(seen: set[str], table: tuple[tuple[str, CoverClass], ...], name: str) -> tuple[Note, ...]:
    """Classes that only the map or only the brief has; refuses a map that has none of the brief's."""
    listed = {code for code, _ in table}
    if seen and not seen & listed:
        raise InputError(
            f"the ground cover {name} holds the classes {_few(seen)}, none of which stands in [cover.classes]",
            "the map's own classes are needed there",
            "Add them under [cover.classes]",
        )
    notes = []
    if unknown := seen - listed:
        said = f"{name} holds the classes {_few(unknown)}, which [cover.classes] says nothing of: cover unknown."
        notes.append(Note("warning", "cover", said))
    if idle := listed - seen:
        notes.append(Note("info", "cover", f"{name} does not hold the classes {_few(idle)} of [cover.classes]."))
    return tuple(notes)


def _few(classes: set[str]) -> str:
    listed = sorted(classes, key=lambda one: (not one.isdigit(), int(one) if one.isdigit() else 0, one))
    return ", ".join(listed[:8]) + (" …" if len(listed) > 8 else "")

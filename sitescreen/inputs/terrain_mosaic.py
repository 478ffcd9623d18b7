"""Files whose cells coincide, put together before anything is computed from them.

Each group of such files has one lattice for the whole Earth: cell (row, col) of it spans
[(col + phase_x)·step_x, …] east and [−(row + phase_y)·step_y, …] south. Windows are whole numbers of its cells, so that
neither the number of tiles nor the window that is asked for can shift a cell by a rounding error.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import CRS, Transformer

from sitescreen.inputs.datum import Datum, to_wgs84
from sitescreen.inputs.terrain_files import RasterFile, opened

MISFIT_CELLS = 0.05
"""Files belong together if their cells coincide within this share of a cell, at both ends (1.5 m at 1″)."""

EDGE_CELLS = 64
"""Outlines get a point at every so many cells, at absolute places, before they are moved to another system."""

_STEP_MISFIT = 2e-5  # headers that give 1″ as 0.00027778 are 8e-6 off


@dataclass(frozen=True)
class SourceLattice:
    """Where the cells of a group of files lie."""

    crs_wkt: str
    step_x: float
    step_y: float
    phase_x: float
    phase_y: float

    def cells_x(self, x: Any) -> Any:
        """Position in columns of the lattice, from their western edges."""
        return x / self.step_x - self.phase_x

    def cells_y(self, y: Any) -> Any:
        """Position in rows of the lattice, from their northern edges, growing southwards."""
        return -y / self.step_y - self.phase_y

    def x_of(self, cells: Any) -> Any:
        """The opposite of :meth:`cells_x`."""
        return (cells + self.phase_x) * self.step_x

    def y_of(self, cells: Any) -> Any:
        """The opposite of :meth:`cells_y`."""
        return -(cells + self.phase_y) * self.step_y

    def place(self, file: RasterFile) -> tuple[int, int] | None:
        """Row and column of a file's first cell; None if its cells do not coincide with these."""
        west, east = self.cells_x(file.west), self.cells_x(file.west + file.cols * file.step_x)
        north, south = self.cells_y(file.north), self.cells_y(file.north - file.rows * file.step_y)
        row, col = round(north), round(west)
        off = max(abs(west - col), abs(east - col - file.cols), abs(north - row), abs(south - row - file.rows))
        return (row, col) if off < MISFIT_CELLS else None


def lattice_of(file: RasterFile) -> SourceLattice:
    """The lattice that a file's cells lie on, with round numbers where they fit."""
    degrees = file.crs.is_geographic
    step_x, step_y = _round_step(file.step_x, degrees), _round_step(file.step_y, degrees)
    rounded = SourceLattice(
        file.crs_wkt, step_x, step_y, _round_phase(file.west / step_x), _round_phase(-file.north / step_y)
    )
    if rounded.place(file) is not None:
        return rounded
    return SourceLattice(
        file.crs_wkt,
        file.step_x,
        file.step_y,
        _phase(file.west / file.step_x),
        _phase(-file.north / file.step_y),
    )


def _round_step(step: float, degrees: bool) -> float:
    """A simple number of arc seconds where the step is nearly one: 1, 3, 1.5, 1/3 …"""
    if not degrees:
        return step
    seconds = Fraction(step * 3600.0).limit_denominator(12)
    near = float(seconds) / 3600.0
    return near if near > 0 and abs(step / near - 1.0) < _STEP_MISFIT else step


def _phase(cells: float) -> float:
    return cells - math.floor(cells)


def _round_phase(cells: float) -> float:
    """Tiles begin at whole cells, or half a cell off."""
    phase = _phase(cells)
    half = round(phase * 2.0) / 2.0
    return half % 1.0 if abs(phase - half) < MISFIT_CELLS else phase


@dataclass(frozen=True)
class Mosaic:
    """Files on one lattice, with the row and column where each begins; the first-named wins where they overlap."""

    lattice: SourceLattice
    files: tuple[RasterFile, ...]
    places: tuple[tuple[int, int], ...]

    @property
    def crs(self) -> CRS:
        """The horizontal coordinate system."""
        return CRS.from_wkt(self.lattice.crs_wkt)

    @property
    def turn_cells(self) -> int | None:
        """Columns once round the Earth, if that is a whole number of them."""
        if not self.crs.is_geographic:
            return None
        turn = 360.0 / self.lattice.step_x
        return round(turn) if abs(turn - round(turn)) < MISFIT_CELLS else None

    def window(
        self, row0: int, row1: int, col0: int, col1: int, sources: dict[str, Any]
    ) -> tuple[NDArray[np.float32], NDArray[np.bool_]] | None:
        """Heights [m] of a window of the lattice, NaN where none, and where any file lies; None where no file does.

        Parameters
        ----------
        row0, row1, col0, col1 : int
            Half-open ranges.
        sources : dict
            Datasets already opened, by path; those needed are added.
        """
        heights: NDArray[np.float32] | None = None
        covered: NDArray[np.bool_] | None = None
        turn = self.turn_cells
        shifts = (0,) if turn is None else (0, -turn, turn)
        for file, (row, first_col) in zip(self.files, self.places, strict=True):
            for col in (first_col + shift for shift in shifts):
                r0, r1 = max(row0, row), min(row1, row + file.rows)
                c0, c1 = max(col0, col), min(col1, col + file.cols)
                if r0 >= r1 or c0 >= c1:
                    continue
                if heights is None or covered is None:
                    heights = np.full((row1 - row0, col1 - col0), np.nan, dtype=np.float32)
                    covered = np.zeros(heights.shape, dtype=bool)
                part = (slice(r0 - row0, r1 - row0), slice(c0 - col0, c1 - col0))
                covered[part] = True
                if not np.isnan(heights[part]).any():
                    continue
                key = str(file.path)
                if key not in sources:
                    sources[key] = opened(file.path)
                found = file.read_m(sources[key], r0 - row, r1 - row, c0 - col, c1 - col)
                heights[part] = np.where(np.isnan(heights[part]), found, heights[part])
        return None if heights is None or covered is None else (heights, covered)

    def outline(self) -> Any:
        """Ground that the files cover, in their coordinate system; corners where the outline turns, and no others."""
        # in whole cells, so that the outline of a tile cut in four is that of the tile
        boxes = [
            shapely.box(col, row, col + file.cols, row + file.rows)
            for file, (row, col) in zip(self.files, self.places, strict=True)
        ]
        polygons = shapely.get_parts(shapely.normalize(shapely.union_all(boxes)))
        return shapely.multipolygons([self._moved(one) for one in polygons])

    def _moved(self, polygon: Any) -> Any:
        rings = [self._ring(np.asarray(ring.coords)) for ring in (polygon.exterior, *polygon.interiors)]
        return shapely.Polygon(rings[0], rings[1:])

    def _ring(self, cells: NDArray[np.float64]) -> NDArray[np.float64]:
        """A ring of cell corners in the files' units, with points at every 64th cell of the lattice on its edges."""
        corners = cells[:-1]
        before, after = np.roll(corners, 1, axis=0), np.roll(corners, -1, axis=0)
        turns = ((corners - before) * (after - corners)[:, ::-1] != 0).any(axis=1)
        corners = corners[turns]
        start = np.lexsort((corners[:, 1], corners[:, 0]))[0]
        corners = np.roll(corners, -start, axis=0)
        points = []
        for a, b in zip(corners, np.roll(corners, -1, axis=0), strict=True):
            axis = 0 if a[0] != b[0] else 1
            low, high = sorted((a[axis], b[axis]))
            marks = np.arange(math.floor(low / EDGE_CELLS) + 1, math.ceil(high / EDGE_CELLS)) * EDGE_CELLS
            edge = np.repeat(a[None, :], len(marks) + 1, axis=0)
            edge[1:, axis] = marks if a[axis] < b[axis] else marks[::-1]
            points.append(edge)
        cells = np.concatenate(points)
        return np.column_stack([self.lattice.x_of(cells[:, 0]), self.lattice.y_of(cells[:, 1])])


def _same_system(one_wkt: str, other_wkt: str) -> bool:
    """Whether two descriptions mean one coordinate system."""
    return one_wkt == other_wkt or CRS.from_wkt(one_wkt) == CRS.from_wkt(other_wkt)


def mosaics(files: Sequence[RasterFile]) -> tuple[Mosaic, ...]:
    """Files grouped by coordinate system, cell size and where cells lie; groups in the order of their first files."""
    groups: list[tuple[SourceLattice, list[RasterFile]]] = []
    for file in files:
        for lattice, members in groups:
            if _same_system(file.crs_wkt, lattice.crs_wkt) and lattice.place(file) is not None:
                members.append(file)
                break
        else:
            groups.append((lattice_of(file), [file]))
    found = []
    for first, members in groups:
        # the corner of the union settles the lattice, whichever file is named first
        corner = lattice_of(min(members, key=lambda one: (-one.north, one.west)))
        fits = all(corner.place(one) is not None for one in members)
        lattice = corner if fits else first
        places = tuple(place for one in members if (place := lattice.place(one)) is not None)
        found.append(Mosaic(lattice, tuple(members), places))
    return tuple(found)


def mosaic_datum(mosaic: Mosaic) -> Datum:
    """How a mosaic's coordinates become WGS 84; not kept, since it cannot travel between processes."""
    outline = mosaic.outline()
    crs = mosaic.crs
    plain = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
    west, south, east, north = plain.transform_bounds(*outline.bounds)
    near = (west, south, east, north) if west <= east and math.isfinite(west + south + east + north) else None
    return to_wgs84(crs, mosaic.files[0].name, near)

"""Grid and Field, the two types that every stage speaks."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError

if TYPE_CHECKING:
    from affine import Affine

Bounds = tuple[float, float, float, float]
"""west, south, east, north"""


@dataclass(frozen=True)
class Grid:
    """A north-up raster grid of square cells in a metric coordinate system.

    Parameters
    ----------
    crs : str
        Coordinate system in metres, such as ``"EPSG:32641"``.
    west_m, north_m : float
        Outer corner of the cell in row 0, column 0. [m]
    cell_size_m : float
        Side of a cell. [m]
    rows, cols : int
        Row 0 is the northernmost.
    """

    crs: str
    west_m: float
    north_m: float
    cell_size_m: float
    rows: int
    cols: int

    def __post_init__(self) -> None:
        if self.rows < 1 or self.cols < 1 or not self.cell_size_m > 0:
            raise GridError(
                f"a grid of {self.rows} × {self.cols} cells of {self.cell_size_m} m was asked for",
                "at least one cell of positive size is needed",
                "Check that terrain and plots overlap",
            )

    @property
    def shape(self) -> tuple[int, int]:
        """Rows and columns."""
        return self.rows, self.cols

    @property
    def bounds(self) -> Bounds:
        """West, south, east and north of the outer edges. [m]"""
        return (
            self.west_m,
            self.north_m - self.rows * self.cell_size_m,
            self.west_m + self.cols * self.cell_size_m,
            self.north_m,
        )

    @property
    def transform(self) -> "Affine":
        """The affine transform from column, row to x, y, as rasterio wants it."""
        from affine import Affine

        return Affine(self.cell_size_m, 0.0, self.west_m, 0.0, -self.cell_size_m, self.north_m)

    def rows_cols(
        self, x_m: NDArray[np.float64], y_m: NDArray[np.float64]
    ) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """The cell that holds each point; indices outside the grid are returned as they fall, so check them.

        Parameters
        ----------
        x_m, y_m : array, shape (n,)
            Easting and northing in the grid's system. [m]

        Returns
        -------
        rows, cols : int64 arrays, shape (n,)
        """
        cols = np.floor((np.asarray(x_m, dtype=np.float64) - self.west_m) / self.cell_size_m).astype(np.int64)
        rows = np.floor((self.north_m - np.asarray(y_m, dtype=np.float64)) / self.cell_size_m).astype(np.int64)
        return rows, cols

    def x_centres_m(self) -> NDArray[np.float64]:
        """Eastings of the column centres. [m] Shape (cols,)."""
        return np.asarray(self.west_m + (np.arange(self.cols) + 0.5) * self.cell_size_m, dtype=np.float64)

    def y_centres_m(self) -> NDArray[np.float64]:
        """Northings of the row centres, falling. [m] Shape (rows,)."""
        return np.asarray(self.north_m - (np.arange(self.rows) + 0.5) * self.cell_size_m, dtype=np.float64)

    def part(self, bounds: Bounds) -> tuple["Grid", tuple[slice, slice]]:
        """The part of this grid inside bounds that lie on its cell edges, with the slices that cut it out.

        Raises
        ------
        GridError
            If nothing of the grid lies inside.
        """
        west, south, east, north = bounds
        col0 = max(0, round((west - self.west_m) / self.cell_size_m))
        col1 = min(self.cols, round((east - self.west_m) / self.cell_size_m))
        row0 = max(0, round((self.north_m - north) / self.cell_size_m))
        row1 = min(self.rows, round((self.north_m - south) / self.cell_size_m))
        grid = Grid(
            self.crs,
            self.west_m + col0 * self.cell_size_m,
            self.north_m - row0 * self.cell_size_m,
            self.cell_size_m,
            row1 - row0,
            col1 - col0,
        )
        return grid, (slice(row0, row1), slice(col0, col1))


@dataclass(frozen=True, eq=False)
class Field:
    """A raster of one quantity on a grid.

    Parameters
    ----------
    values : array, shape (rows, cols)
        Kept as float32 and made read-only; NaN where unknown. Row 0 is the northernmost.
    grid : Grid
    unit : str
        "m", "°", "K" …; "1" for a share.
    what : str
        What it is, in a few plain words; written into the layer's tags.
    """

    values: NDArray[np.float32]
    grid: Grid
    unit: str
    what: str

    def __post_init__(self) -> None:
        values = np.ascontiguousarray(self.values, dtype=np.float32)
        if values is self.values and values.flags.writeable:
            values = values.view()
        if values.shape != self.grid.shape:
            raise GridError(
                f"an array of {values.shape} was given for a grid of {self.grid.shape}",
                "one value a cell is needed",
                "Build the Field on the grid that the array was computed on",
            )
        values.flags.writeable = False
        object.__setattr__(self, "values", values)

    def part(self, bounds: Bounds) -> "Field":
        """The part inside bounds that lie on the grid's cell edges (a copy, so the whole can be let go)."""
        grid, window = self.grid.part(bounds)
        return Field(self.values[window].copy(), grid, self.unit, self.what)


def joined(fields: Sequence[Field]) -> Field:
    """Fields of one quantity on parts of one lattice, put together; NaN where none of them reaches.

    Raises
    ------
    GridError
        If they differ in coordinate system or cell size.
    """
    first = fields[0]
    if len(fields) == 1:
        return first
    step = first.grid.cell_size_m
    if any((one.grid.crs, one.grid.cell_size_m) != (first.grid.crs, step) for one in fields):
        raise GridError(
            "fields of different coordinate systems or cell sizes were to be joined",
            "parts of one lattice are needed",
            "Join the fields of each UTM zone apart",
        )
    bounds = [one.grid.bounds for one in fields]
    west, south = min(b[0] for b in bounds), min(b[1] for b in bounds)
    east, north = max(b[2] for b in bounds), max(b[3] for b in bounds)
    grid = Grid(first.grid.crs, west, north, step, round((north - south) / step), round((east - west) / step))
    values = np.full(grid.shape, np.nan, dtype=np.float32)
    for one in fields:
        row = round((north - one.grid.north_m) / step)
        col = round((one.grid.west_m - west) / step)
        values[row : row + one.grid.rows, col : col + one.grid.cols] = one.values
    return Field(values, grid, first.unit, first.what)

"""How much of each cell each plot covers: computed once, then reused for every field."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sitescreen.grid import Grid

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Coverage:
    """The cells under each plot of a block.

    Parameters
    ----------
    plot : int64 array, shape (k,)
        Index of the plot, rising; one entry for each cell that a plot touches.
    cell : int64 array, shape (k,)
        Flat index of the cell on the grid (row × cols + col).
    share : float64 array, shape (k,)
        Part of the cell inside the plot, 0–1.
    cells : float64 array, shape (n,)
        Sum of the shares: the plot's size in cells, as far as it lies on the grid.
    """

    plot: NDArray[np.int64]
    cell: NDArray[np.int64]
    share: FloatArray
    cells: FloatArray

    def total(self, per_cell: FloatArray) -> FloatArray:
        """Sum over each plot of one number for each of the entries. Shape (n,)."""
        # bincount adds each plot's cells in their own order, so a plot's sum cannot depend on the other plots
        return np.asarray(np.bincount(self.plot, weights=per_cell, minlength=len(self.cells)), dtype=np.float64)

    def known_share(self, values: NDArray[Any]) -> FloatArray:
        """The part of each plot's ground where a raster has a value, 0–1. Shape (n,); 0 where the plot has no cells."""
        known = np.isfinite(values.ravel()[self.cell])
        with np.errstate(invalid="ignore", divide="ignore"):
            share = self.total(self.share * known) / self.cells
        return np.where(self.cells > 0, share, 0.0)

    def mean(self, values: NDArray[Any], least_known: float) -> FloatArray:
        """The coverage-weighted mean of a raster over each plot.

        Parameters
        ----------
        values : array, shape of the grid
            NaN where unknown.
        least_known : float
            Part of the plot that must have a value; below it the answer is NaN, since the mean of a corner is not the
            mean of the plot.

        Returns
        -------
        float64 array, shape (n,)
        """
        picked = values.ravel()[self.cell].astype(np.float64)
        known = np.isfinite(picked)
        weight = self.share * known
        with np.errstate(invalid="ignore", divide="ignore"):
            mean = self.total(weight * np.where(known, picked, 0.0)) / self.total(weight)
        return np.where(self.known_share(values) >= least_known, mean, np.nan)

    def largest(self, values: NDArray[Any], least_share: float = 0.5) -> FloatArray:
        """The largest known value among the cells that lie in the plot for at least ``least_share`` of their area.

        A plot too small to fill any cell that far takes the cells it touches. NaN where nothing is known.
        """
        picked = values.ravel()[self.cell].astype(np.float64)
        inside = self.share >= least_share
        has_inside = self.total(inside.astype(np.float64)) > 0
        use = np.isfinite(picked) & (inside | ~has_inside[self.plot])
        out = np.full(len(self.cells), -np.inf)
        np.maximum.at(out, self.plot[use], picked[use])
        return np.where(np.isfinite(out), out, np.nan)


def cover(plots: Any, grid: Grid) -> Coverage:
    """Which cells each plot covers, and how far.

    Parameters
    ----------
    plots : GeoSeries, length n
        Polygons in the grid's coordinate system.
    grid : Grid

    Returns
    -------
    Coverage

    Notes
    -----
    The shares are exact areas, from exactextract (Baston, D., github.com/isciences/exactextract): a cell cut by the
    plot's border counts by the part inside, so that a plot smaller than a cell still gets its ground.
    """
    import geopandas as gpd
    from exactextract import exact_extract
    from exactextract.raster import NumPyRasterSource
    from pyproj import CRS

    west, south, east, north = grid.bounds
    blank = NumPyRasterSource(
        np.zeros(grid.shape, dtype=np.int8),
        xmin=west,
        ymin=south,
        xmax=east,
        ymax=north,
        srs_wkt=CRS.from_user_input(grid.crs).to_wkt(),
    )
    table = gpd.GeoDataFrame({"row": np.arange(len(plots))}, geometry=list(plots), crs=grid.crs)
    found = exact_extract(blank, table, ["cell_id", "coverage"], include_cols=["row"], output="pandas")
    found = found.sort_values("row", kind="stable")
    counts = np.array([len(ids) for ids in found["cell_id"]], dtype=np.int64)
    plot = np.repeat(np.arange(len(plots), dtype=np.int64), counts)
    cell = np.concatenate([np.asarray(ids, dtype=np.int64) for ids in found["cell_id"]] or [np.zeros(0, np.int64)])
    share = np.concatenate([np.asarray(part, dtype=np.float64) for part in found["coverage"]] or [np.zeros(0)])
    cells = np.asarray(np.bincount(plot, weights=share, minlength=len(plots)), dtype=np.float64)
    return Coverage(plot, cell, share, cells)

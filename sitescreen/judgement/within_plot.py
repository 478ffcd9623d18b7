"""Where on the plot: the mark of each cell inside it, and the best square that is large enough to build on."""

import math
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.zones import ZoneShares
from sitescreen.grid import Field, Grid
from sitescreen.judgement.coverage import Coverage
from sitescreen.judgement.derived import DERIVED_READINGS, with_derived
from sitescreen.judgement.overall import blended, zone_marks
from sitescreen.judgement.profiles import ZoneProfile
from sitescreen.judgement.reasons import load_words
from sitescreen.judgement.sentences import compass_word
from sitescreen.settings import JudgementSettings, ReadingSettings

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

READINGS_OF_FIELDS: Mapping[str, tuple[str, ...]] = {
    "hollow_depth_m": ("pond_depth_m",),
    "cold_depth_m": ("cold_pool_depth_m",),
    "buildable_chance": ("buildable_share",),
}
"""Readings that fields of another name are read into; a field serves the reading of its own name anyway."""

COLUMNS = ("best_patch_mark", "worst_patch_mark", "mean_patch_mark", "best_patch_lon", "best_patch_lat", "patch_side_m")

WORTH_SAYING = 3.0
"""Squares whose marks differ by less are alike: our choice, no source. [points]"""


@dataclass(frozen=True)
class PlotCells:
    """The cells that lie wholly inside the plots of one block, and what was measured there.

    Parameters
    ----------
    grid : Grid
    plot : int64 array, shape (k,)
        Row in the table of plots.
    row, col : int64 arrays, shape (k,)
        On the grid.
    readings : mapping of reading to float32 array, shape (k,)
        NaN where unknown.
    """

    grid: Grid
    plot: IntArray
    row: IntArray
    col: IntArray
    readings: Mapping[str, NDArray[np.float32]]


class WithinPlots(NamedTuple):
    """What a look inside the plots found.

    ``table``: :data:`COLUMNS` and ``where_on_plot`` (a sentence), one row a plot. ``patches``: GeoDataFrame,
    EPSG:4326, the best square of each plot that has one, with ``plot`` and ``best_patch_mark``.
    """

    table: pd.DataFrame
    patches: Any


def plot_cells(
    coverage: Coverage,
    rows: IntArray,
    fields: Mapping[str, Field],
    water: NDArray[np.bool_],
    grid: Grid,
    settings: ReadingSettings,
) -> PlotCells:
    """The cells inside plots: all but a sliver of the cell in the plot, and no water on it.

    Parameters
    ----------
    coverage : Coverage
        Of the block's plots.
    rows : int64 array, shape (n,)
        Those plots' rows in the table of plots.
    fields : mapping of name to Field
        Those on the grid are read; what is told on coarser ones is the same all over a plot, like all other readings.
    water : bool array, shape of the grid
        Cells that nobody can build on.
    grid : Grid
    settings : ReadingSettings
        Its ``known_share_least`` says what all but a sliver is.
    """
    inside = (coverage.share >= settings.known_share_least) & ~water.ravel()[coverage.cell]
    cell = coverage.cell[inside]
    readings = {
        reading: field.values.ravel()[cell]
        for name, field in fields.items()
        if field.grid == grid
        for reading in READINGS_OF_FIELDS.get(name, (name,))
    }
    row, col = np.divmod(cell, grid.cols)
    return PlotCells(grid, rows[coverage.plot[inside]], row, col, readings)


def patch_side_cells(footprint_m2: float, cell_size_m: float, cells_least: float) -> int:
    """Side of the square that is looked for: it holds the footprint, and as many cells as terrain can resolve."""
    return max(math.ceil(math.sqrt(footprint_m2) / cell_size_m - 1e-9), math.ceil(math.sqrt(cells_least)))


def within_plots(
    blocks: Sequence[PlotCells],
    readings: pd.DataFrame,
    lon: FloatArray,
    lat: FloatArray,
    zones: ZoneShares,
    profiles: Mapping[str, ZoneProfile],
    halved: Collection[str],
    footprint_m2: float,
    reading_settings: ReadingSettings,
    settings: JudgementSettings,
) -> WithinPlots:
    """Mark every cell inside the plots and find each plot's best square.

    Parameters
    ----------
    blocks : sequence of PlotCells
    readings : DataFrame, n rows, indexed by plot
        Of the plots.
    lon, lat : float64 arrays, shape (n,)
        A point on each plot. [°]
    zones : ZoneShares
        Of the same plots.
    profiles : mapping of zone to ZoneProfile
    halved : collection of str
        As in :func:`sitescreen.judgement.overall.judge`.
    footprint_m2 : float
        What the building needs. [m²]
    reading_settings, settings : ReadingSettings, JudgementSettings

    Notes
    -----
    A cell is marked as a plot is, by the same profiles; where no field tells a reading from cell to cell, or the cell's
    own value is unknown, the plot's holds, and where the plot's is unknown the cell's counts as unknown too. A square
    lies wholly inside, and its mark is the mean of its cells'. Being the best of many it is a little flattered by the
    terrain's error. The first from the north-west is taken of equals.
    """
    out = pd.DataFrame({name: np.full(len(readings), np.nan) for name in COLUMNS}, index=readings.index)
    shapes: dict[int, Any] = {}
    says = np.full(len(readings), "", dtype=object)
    for one in blocks:
        side = patch_side_cells(footprint_m2, one.grid.cell_size_m, reading_settings.cells_least)
        looked_at = np.unique(one.plot)
        marks = _cell_marks(one, readings, zones, profiles, halved, settings)
        start, mean = _squares(one, marks, side)
        _record_squares(one, start, mean, side, out, shapes)
        for row in looked_at:
            says[row] = _sentence(out.iloc[row], lon[row], lat[row], side * one.grid.cell_size_m)
    has_zone = zones.zone.to_numpy(dtype=object) != ""
    out["where_on_plot"] = np.where(has_zone, says, "")
    return WithinPlots(out, _patches(readings.index, out, shapes))


def _cell_marks(
    cells: PlotCells,
    readings: pd.DataFrame,
    zones: ZoneShares,
    profiles: Mapping[str, ZoneProfile],
    halved: Collection[str],
    settings: JudgementSettings,
) -> FloatArray:
    """The overall mark of each cell; NaN without a zone."""
    criteria = [criterion for profile in profiles.values() for criterion in profile.criteria]
    wanted = {one.column for one in criteria}
    wanted |= {name for one in criteria for name in DERIVED_READINGS.get(one.reading, ())}
    own = {name: readings[name].to_numpy()[cells.plot] for name in sorted(wanted) if name in readings}
    measured = dict(cells.readings)
    if "cold_share" in measured and "cold_strength_k" in readings:
        # what gathers differs from cell to cell; the climate's strength is the plot's
        strength = readings["cold_strength_k"].to_numpy(dtype=np.float64)[cells.plot]
        measured["cold_deficit_k"] = strength * measured["cold_share"].astype(np.float64)
    for name in own:
        if name in measured:
            own[name] = own[name].astype(np.float64)
            here = measured[name].astype(np.float64)
            own[name] = np.where(np.isnan(own[name]) | np.isnan(here), own[name], here)
    table = with_derived(pd.DataFrame(own, index=pd.RangeIndex(len(cells.plot))))
    shares = zones.at(cells.plot)
    by_zone = {}
    for zone in shares.shares.columns:
        rows = np.flatnonzero(shares.shares[zone].to_numpy() > 0.0)
        if len(rows):
            by_zone[zone] = zone_marks(table, rows, profiles[zone], halved, settings.assumed_weight_factor)
    return np.asarray(blended(by_zone, shares, len(table))["overall_mark"].to_numpy(dtype=np.float64))


def _squares(cells: PlotCells, marks: FloatArray, side: int) -> tuple[IntArray, FloatArray]:
    """The cells that are north-western corners of squares wholly inside one plot, and the mean mark of each square."""
    known = np.flatnonzero(~np.isnan(marks))
    size = cells.grid.rows * cells.grid.cols
    key = cells.plot * size + cells.row * cells.grid.cols + cells.col
    known = known[np.argsort(key[known], kind="stable")]
    keys, values = key[known], marks[known]
    fits = (cells.col[known] + side <= cells.grid.cols) & (cells.row[known] + side <= cells.grid.rows)

    def along(sums: FloatArray, step: int) -> FloatArray:
        total = np.zeros(len(keys))
        for number in range(side):
            place = np.searchsorted(keys, keys + number * step)
            place = np.minimum(place, len(keys) - 1)
            total += np.where(keys[place] == keys + number * step, sums[place], np.nan)
        return total

    if not len(keys):
        return known, values
    # rows first, then columns: 2·side look-ups a cell instead of side²
    mean = along(np.where(fits, along(values, 1), np.nan), cells.grid.cols) / side**2
    whole = ~np.isnan(mean)
    return known[whole], mean[whole]


def _record_squares(
    cells: PlotCells, start: IntArray, mean: FloatArray, side: int, out: pd.DataFrame, shapes: dict[int, Any]
) -> None:
    """Write the best, worst and mean square of each plot into the table, and the best one's shape."""
    from pyproj import Transformer
    from shapely.geometry import Polygon

    if not len(start):
        return
    to_lonlat = Transformer.from_crs(cells.grid.crs, "EPSG:4326", always_xy=True)
    size = cells.grid.cell_size_m
    west, _, _, north = cells.grid.bounds
    order = np.lexsort((np.arange(len(start)), -mean, cells.plot[start]))
    plots, first, count = np.unique(cells.plot[start][order], return_index=True, return_counts=True)
    for plot, begin, many in zip(plots, first, count, strict=True):
        squares = order[begin : begin + many]
        best = start[squares[0]]
        x = west + size * np.array([cells.col[best], cells.col[best] + side])
        y = north - size * np.array([cells.row[best], cells.row[best] + side])
        lon, lat = to_lonlat.transform(x.mean(), y.mean())
        out.iloc[plot] = [mean[squares[0]], mean[squares[-1]], mean[squares].mean(), lon, lat, side * size]
        corners = to_lonlat.transform(x[[0, 1, 1, 0]], y[[0, 0, 1, 1]])
        shapes[int(plot)] = Polygon(zip(*corners, strict=True))


def _sentence(found: pd.Series, lon: float, lat: float, side_m: float) -> str:
    from pyproj import Geod

    words = load_words().words
    best, worst = float(found["best_patch_mark"]), float(found["worst_patch_mark"])
    if math.isnan(best):
        return words.where_too_small.format(side_m=side_m)
    if best - worst < WORTH_SAYING:
        return words.where_alike.format(side_m=side_m)
    azimuth, _, away_m = Geod(ellps="WGS84").inv(lon, lat, found["best_patch_lon"], found["best_patch_lat"])
    part = words.where_middle if away_m < side_m / 2 else words.where_part.format(compass=compass_word(azimuth % 360.0))
    return words.where_best.format(side_m=side_m, best=best, worst=worst, part=part)


def _patches(plots: pd.Index, out: pd.DataFrame, shapes: Mapping[int, Any]) -> Any:
    import geopandas as gpd

    rows = sorted(shapes)
    told = {"plot": list(plots[rows]), "best_patch_mark": out["best_patch_mark"].to_numpy()[rows].round(1)}
    return gpd.GeoDataFrame(told, geometry=[shapes[row] for row in rows], crs="EPSG:4326")

"""Contours of the depth of cold air for the page: lines that know their deep side and what kind of air lies there."""

from collections.abc import Sequence
from typing import Any

import numpy as np
import shapely
from numpy.typing import NDArray

from sitescreen.climate.cold_kinds import KINDS
from sitescreen.deliverables.sheet import WEB_MERCATOR, Sheet, on_sheet, warped
from sitescreen.deliverables.steps import in_steps
from sitescreen.grid import Field

LEVELS_M = (5.0, 15.0, 30.0, 60.0)
"""Depths that are drawn: our choice, each about double the one before. [m]"""

MOST_CELLS = 400
"""Along the longer side of the raster that is contoured: finer lines than this are not seen at the map's first size."""

THINNINGS = ((0.8, 12.0), (1.6, 12.0), (3.2, 12.0), (3.2, 36.0))
"""Lines are thinned by so many cells, and go where they are shorter than so many, the more the less room there is.
Lines under a dozen cells are specks in any case."""

_DRAWN = KINDS[1:4]


def cold_contours(depth: Sequence[Field], kind: Sequence[Field], sheet: Sheet) -> list[list[dict[str, Any]]]:
    """Contours of one depth and kind each, as finely as may be and then coarser and coarser.

    Parameters
    ----------
    depth : sequence of Field
        Depth of the cold air. [m]
    kind : sequence of Field
        Codes of :data:`sitescreen.climate.cold_kinds.KINDS`.
    sheet : Sheet

    Returns
    -------
    list of list of dict
        For each of :data:`THINNINGS`: ``kind``, ``depth_m`` and ``lines`` in whole steps of lon and lat, with the
        deeper side on the left. Where the depth rises past several levels at once, only the lowest is drawn. No line
        runs along unknown ground or the rim of the sheet.
    """
    depths = [part for field in depth if (part := on_sheet(field, sheet)) is not None]
    kinds = [part for field in kind if (part := on_sheet(field, sheet)) is not None]
    if not depths or not kinds:
        return [[] for _ in THINNINGS]
    apart = max(1.0, max(sheet.cols, sheet.rows) / MOST_CELLS)
    coarse = Sheet(sheet.bounds_m, max(2, round(sheet.cols / apart)), max(2, round(sheet.rows / apart)))
    shares = np.stack([warped([_is(part, name) for part in kinds], coarse, exact=False) for name in _DRAWN])
    most = np.nan_to_num(shares).argmax(axis=0)
    level = _levels(warped(depths, coarse, exact=False), np.isnan(shares[0]))
    lines = [(name, k, _lines(level, most == n, k)) for n, name in enumerate(_DRAWN) for k in range(len(LEVELS_M))]
    return [
        [
            {"kind": name, "depth_m": LEVELS_M[k], "lines": [_steps(line, coarse) for line in thin]}
            for name, k, full in lines
            if len(thin := shapely.simplify(full[shapely.length(full) >= shortest], thinning))
        ]
        for thinning, shortest in THINNINGS
    ]


def _is(kind: Field, name: str) -> Field:
    """1 where the air is of this kind, 0 elsewhere, NaN where unknown."""
    unknown = np.isnan(kind.values) | (kind.values == KINDS.index("unknown"))
    is_it = np.where(unknown, np.float32(np.nan), (kind.values == KINDS.index(name)).astype(np.float32))
    return Field(is_it, kind.grid, "1", name)


def _levels(depth_m: NDArray[np.float32], unknown: NDArray[np.bool_]) -> NDArray[np.int64]:
    """How many of the levels each cell reaches; −1 where unknown."""
    reached = np.digitize(np.nan_to_num(depth_m), LEVELS_M)
    reached[unknown | np.isnan(depth_m)] = -1
    return reached


def _lines(level: NDArray[np.int64], is_kind: NDArray[np.bool_], k: int) -> NDArray[Any]:
    """Lines in cells from the north-west corner, along the edges where level k is the lowest that is passed."""

    def passes(out: NDArray[np.int64], into: NDArray[np.int64], mine: NDArray[np.bool_]) -> NDArray[np.intp]:
        return np.argwhere((out == k) & (into > k) & mine)

    here, south = slice(None, -1), slice(1, None)
    down = passes(level[:, here], level[:, south], is_kind[:, south])  # deep to the east: runs south
    up = passes(level[:, south], level[:, here], is_kind[:, here])  # deep to the west: runs north
    east = passes(level[south], level[here], is_kind[here])  # deep to the north: runs east
    west = passes(level[here], level[south], is_kind[south])  # deep to the south: runs west
    corners = ((down, (0, 1), (1, 1)), (up, (1, 1), (0, 1)), (east, (1, 0), (1, 1)), (west, (1, 1), (1, 0)))
    edges = np.concatenate([cells[:, None, :] + np.array(ends) for cells, *ends in corners])
    edges = edges[:, :, ::-1].astype(np.float64)  # from row and column to column and row
    if not len(edges):
        return np.array([], dtype=object)
    merged = shapely.line_merge(shapely.multilinestrings(shapely.linestrings(edges)), directed=True)
    return np.asarray(shapely.get_parts(merged))


def _steps(line: Any, sheet: Sheet) -> list[int]:
    from pyproj import Transformer

    column_row = shapely.get_coordinates(line)
    west, _, _, north = sheet.bounds_m
    height = (sheet.bounds_m[3] - sheet.bounds_m[1]) / sheet.rows
    x, y = west + column_row[:, 0] * sheet.pixel_m, north - column_row[:, 1] * height
    lon, lat = Transformer.from_crs(WEB_MERCATOR, "EPSG:4326", always_xy=True).transform(x, y)
    return in_steps(np.column_stack([lon, lat]))

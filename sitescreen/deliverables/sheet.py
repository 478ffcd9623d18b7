"""The sheet of the map: one Web Mercator canvas that all pictures share, whatever UTM zones the fields come in.

A browser stretches a picture linearly in Web Mercator. A picture on any other grid would lie beside its ground: a raw
UTM one by up to a kilometre.
"""

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray
from rasterio.warp import Resampling, reproject, transform_bounds

from sitescreen.errors import GridError
from sitescreen.grid import Bounds, Field

if TYPE_CHECKING:
    import geopandas as gpd
    from affine import Affine

WEB_MERCATOR = "EPSG:3857"
MOST_PIXELS = 1600
"""Along the longer side: sharp on a wide screen, small enough to mail."""

LEAST_SIDE_M = 4_000.0
MARGIN_SHARE = 0.06
SHAPE = 1.75
"""Width over height that the sheet is filled up to where there is ground: that of the map on a wide screen."""

MORE = 1.12
"""The sheet reaches so much farther than what the map shows at first."""


@dataclass(frozen=True)
class Sheet:
    """A north-up canvas in Web Mercator.

    Parameters
    ----------
    bounds_m : Bounds
        West, south, east, north in EPSG:3857.
    cols, rows : int
        Pixels.
    focus_m : Bounds, optional
        The part with the plots, which the map shows at first; the whole sheet if left out.
    """

    bounds_m: Bounds
    cols: int
    rows: int
    focus_m: Bounds | None = None

    @property
    def transform(self) -> "Affine":
        """From pixel to EPSG:3857."""
        from affine import Affine

        west, south, east, north = self.bounds_m
        return Affine((east - west) / self.cols, 0.0, west, 0.0, (south - north) / self.rows, north)

    @property
    def pixel_m(self) -> float:
        """Width of a pixel in EPSG:3857, which is longer than on the ground by 1/cos(latitude)."""
        return (self.bounds_m[2] - self.bounds_m[0]) / self.cols

    @cached_property
    def bounds_deg(self) -> Bounds:
        """West, south, east, north. [°]"""
        west, south, east, north = transform_bounds(WEB_MERCATOR, "EPSG:4326", *self.bounds_m)
        return west, south, east, north

    @cached_property
    def focus_deg(self) -> Bounds:
        """West, south, east, north of the part with the plots. [°]"""
        west, south, east, north = transform_bounds(WEB_MERCATOR, "EPSG:4326", *(self.focus_m or self.bounds_m))
        return west, south, east, north

    def pixels(self, lon: NDArray[np.float64], lat: NDArray[np.float64]) -> NDArray[np.float64]:
        """Columns and rows of points, shape (n, 2)."""
        from pyproj import Transformer

        x, y = Transformer.from_crs("EPSG:4326", WEB_MERCATOR, always_xy=True).transform(lon, lat)
        west, _, _, north = self.bounds_m
        return np.column_stack([(x - west) / self.pixel_m, (north - y) / self.pixel_m])


def by_quantity(fields: Mapping[str, Field]) -> dict[str, list[Field]]:
    """The fields by name, those of several UTM zones (``slope_deg_utm41``) together."""
    groups: dict[str, list[Field]] = {}
    for key, field in fields.items():
        groups.setdefault(re.sub(r"_utm\d{1,2}$", "", key), []).append(field)
    return groups


def sheet_for(table: "gpd.GeoDataFrame", ground: Sequence[Field]) -> Sheet:
    """The sheet that shows the plots, with some ground around them where there is any.

    Parameters
    ----------
    table : GeoDataFrame, EPSG:4326
        The ranking. Plots without an elevation lie off the ground and do not stretch the sheet, unless all do.
    ground : sequence of Field
        The elevation.
    """
    shapes = table.geometry[table.geometry.notna()]
    if "elevation_m" in table and (on_ground := shapes[table["elevation_m"].notna()]).size:
        shapes = on_ground
    data = [transform_bounds(f.grid.crs, WEB_MERCATOR, *f.grid.bounds, densify_pts=21) for f in ground]
    if len(shapes):
        west, south, east, north = transform_bounds("EPSG:4326", WEB_MERCATOR, *_apart(shapes.total_bounds))
    elif data:
        west, south, east, north = _around(data)
    else:
        west, south, east, north = -LEAST_SIDE_M, -LEAST_SIDE_M, LEAST_SIDE_M, LEAST_SIDE_M
    margin = max(MARGIN_SHARE * max(east - west, north - south), LEAST_SIDE_M / 4)
    width = max(east - west + 2 * margin, LEAST_SIDE_M)
    height = max(north - south + 2 * margin, LEAST_SIDE_M)
    x, y = (west + east) / 2, (south + north) / 2
    focus = (x - width / 2, y - height / 2, x + width / 2, y + height / 2)
    width, height = MORE * max(width, height * SHAPE), MORE * max(height, width / SHAPE)
    wide = (x - width / 2, y - height / 2, x + width / 2, y + height / 2)
    if data:
        wide = _common(wide, _around(data)) or wide
    finest = min((f.grid.cell_size_m for f in ground), default=30.0)
    side = max(wide[2] - wide[0], wide[3] - wide[1])
    pixel_m = max(side / MOST_PIXELS, finest / 2)
    cols, rows = max(2, round((wide[2] - wide[0]) / pixel_m)), max(2, round((wide[3] - wide[1]) / pixel_m))
    west, north = wide[0], wide[3]
    bounds = (west, north - rows * pixel_m, west + cols * pixel_m, north)
    return Sheet(bounds, cols, rows, _common(focus, bounds))


def _apart(bounds: Any) -> Bounds:
    """Bounds of a single point opened a little, since bounds without extent cannot be transformed."""
    west, south, east, north = (float(value) for value in bounds)
    return west - 1e-6, south - 1e-6, east + 1e-6, north + 1e-6


def _around(boxes: Sequence[Bounds]) -> Bounds:
    west, south, east, north = zip(*boxes, strict=True)
    return min(west), min(south), max(east), max(north)


def _common(a: Bounds, b: Bounds) -> Bounds | None:
    west, south, east, north = max(a[0], b[0]), max(a[1], b[1]), min(a[2], b[2]), min(a[3], b[3])
    return (west, south, east, north) if west < east and south < north else None


def on_sheet(field: Field, sheet: Sheet) -> Field | None:
    """The part of a field that the sheet shows, with a rim of some cells; None where it shows nothing of it."""
    step, grid = field.grid.cell_size_m, field.grid
    west, south, east, north = transform_bounds(WEB_MERCATOR, grid.crs, *sheet.bounds_m, densify_pts=21)
    left, top = np.floor((west - grid.west_m) / step) - 3, np.floor((grid.north_m - north) / step) - 3
    right, bottom = np.ceil((east - grid.west_m) / step) + 3, np.ceil((grid.north_m - south) / step) + 3
    bounds = (
        grid.west_m + left * step,
        grid.north_m - bottom * step,
        grid.west_m + right * step,
        grid.north_m - top * step,
    )
    try:
        return field.part(bounds)
    except GridError:
        return None


def warped(parts: Sequence[Field], sheet: Sheet, *, exact: bool) -> NDArray[np.float32]:
    """Fields on the sheet; where several hold a pixel the first known one counts.

    Parameters
    ----------
    parts : sequence of Field
    sheet : Sheet
    exact : bool
        Keep the cells' own values, as classes need, instead of blending neighbours.

    Returns
    -------
    float32 array, shape (rows, cols)
        NaN where nothing is known.
    """
    out = np.full((sheet.rows, sheet.cols), np.nan, dtype=np.float32)
    for field in parts:
        one = np.full_like(out, np.nan)
        is_coarser = sheet.pixel_m > 1.5 * field.grid.cell_size_m
        blend = Resampling.average if is_coarser else Resampling.bilinear
        reproject(
            np.array(field.values),
            one,
            src_transform=field.grid.transform,
            src_crs=field.grid.crs,
            src_nodata=np.nan,
            dst_transform=sheet.transform,
            dst_crs=WEB_MERCATOR,
            dst_nodata=np.nan,
            resampling=Resampling.nearest if exact else blend,
            tolerance=0,
        )
        out = np.where(np.isnan(out), one, out)
    return out

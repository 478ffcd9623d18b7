"""The canvas that all pictures share."""

import numpy as np
import pytest
from geopandas import GeoDataFrame
from pyproj import Geod, Transformer
from shapely.geometry import box

from sitescreen.deliverables.sheet import Sheet, by_quantity, on_sheet, sheet_for, warped
from sitescreen.grid import Field, Grid


def table_round(lon: float, lat: float, size: float = 0.05) -> GeoDataFrame:
    return GeoDataFrame(
        {"elevation_m": [1.0]}, geometry=[box(lon - size, lat - size, lon + size, lat + size)], crs="EPSG:4326"
    )


def grid_round(lon: float, lat: float, zone: int, cells: int = 160, step: float = 90.0) -> Grid:
    x, y = Transformer.from_crs("EPSG:4326", f"EPSG:{32600 + zone}", always_xy=True).transform(lon, lat)
    west, north = step * (x // step - cells // 2), step * (y // step + cells // 2)
    return Grid(f"EPSG:{32600 + zone}", west, north, step, cells, cells)


@pytest.mark.parametrize("lat", [0.02, -10.0, 20.0])
@pytest.mark.parametrize("lon", [36.2, 39.0, 41.8])  # both rims of the zone and its middle
def test_a_known_cell_is_found_where_it_lies(lon: float, lat: float) -> None:
    """Within half a cell, by the geodesic from the cell's centre to the middle of its pixels."""
    grid = grid_round(lon, lat, 37)
    row, col = 61, 103
    values = np.zeros(grid.shape, np.float32)
    values[row, col] = 1.0
    field = Field(values, grid, "1", "one cell")
    sheet = sheet_for(table_round(lon, lat), [field])
    part = on_sheet(field, sheet)
    assert part is not None
    lit = np.argwhere(warped([part], sheet, exact=True) == 1.0)
    assert len(lit) >= 2
    y_px, x_px = lit.mean(axis=0) + 0.5
    west, south, east, north = sheet.bounds_deg
    # as the browser does it: linear in Web Mercator between the corners
    found_lon = west + x_px / sheet.cols * (east - west)
    mercator = np.arcsinh(np.tan(np.radians([south, north])))
    found_lat = np.degrees(np.arctan(np.sinh(mercator[1] + y_px / sheet.rows * (mercator[0] - mercator[1]))))
    to_degrees = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
    true_lon, true_lat = to_degrees.transform(grid.x_centres_m()[col], grid.y_centres_m()[row])
    _, _, off_m = Geod(ellps="WGS84").inv(found_lon, found_lat, true_lon, true_lat)
    assert off_m < grid.cell_size_m / 2


def test_points_fall_on_the_same_pixels_as_the_ground() -> None:
    grid = grid_round(39.0, -10.0, 37)
    sheet = sheet_for(table_round(39.0, -10.0), [Field(np.zeros(grid.shape), grid, "m", "flat")])
    west, south, east, north = sheet.bounds_deg
    corners = sheet.pixels(np.array([west, east]), np.array([north, south]))
    assert corners == pytest.approx(np.array([[0, 0], [sheet.cols, sheet.rows]]), abs=1e-6)


def test_two_utm_zones_join_without_a_gap() -> None:
    """42° E is the border of zones 37 and 38."""
    fields = {
        f"elevation_m_utm{zone}": Field(np.full((160, 160), zone), grid_round(lon, -4.0, zone), "m", "height")
        for zone, lon in ((37, 41.95), (38, 42.05))
    }
    groups = by_quantity(fields)
    assert list(groups) == ["elevation_m"]
    sheet = sheet_for(table_round(42.0, -4.0, 0.03), groups["elevation_m"])
    parts = [part for field in groups["elevation_m"] if (part := on_sheet(field, sheet)) is not None]
    got = warped(parts, sheet, exact=True)
    middle = got[sheet.rows // 2]
    assert set(np.unique(middle[np.isfinite(middle)])) == {37.0, 38.0}
    assert np.isfinite(middle).all()


def test_where_fields_overlap_the_first_one_counts() -> None:
    grid = grid_round(39.0, -4.0, 37)
    first = np.full(grid.shape, 1.0)
    first[:, :80] = np.nan
    fields = [Field(first, grid, "m", "a"), Field(np.full(grid.shape, 2.0), grid, "m", "b")]
    sheet = sheet_for(table_round(39.0, -4.0), fields)
    got = warped(fields, sheet, exact=True)
    assert {1.0, 2.0} == set(np.unique(got[np.isfinite(got)]))
    assert np.nanmean(got[:, -5:]) < np.nanmean(got[:, :5])


def test_the_sheet_stays_on_the_ground_and_within_its_size() -> None:
    grid = Grid("EPSG:32637", 300_000.0, -100_000.0, 30.0, 4000, 4500)
    field = Field(np.zeros(grid.shape, np.float32), grid, "m", "flat")
    far = GeoDataFrame(
        {"elevation_m": [1.0, 1.0, np.nan]},
        geometry=[box(37.3, -1.9, 37.31, -1.89), box(38.3, -1.1, 38.31, -1.09), box(60, 40, 61, 41)],
        crs="EPSG:4326",
    )
    sheet = sheet_for(far, [field])
    assert max(sheet.cols, sheet.rows) <= 1601
    assert sheet.bounds_deg[2] < 39.0  # the plot far off the ground does not stretch it


def test_plots_without_ground_still_have_a_sheet() -> None:
    assert sheet_for(table_round(39.0, -4.0), []).cols > 1
    nowhere = GeoDataFrame({"elevation_m": [np.nan]}, geometry=[None], crs="EPSG:4326")
    assert sheet_for(nowhere, []).cols > 1


def test_ground_off_the_sheet_is_left_out() -> None:
    grid = grid_round(39.0, -4.0, 37)
    away = Sheet((0.0, 0.0, 10_000.0, 10_000.0), 100, 100)
    assert on_sheet(Field(np.zeros(grid.shape), grid, "m", "flat"), away) is None

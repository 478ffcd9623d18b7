"""The absolute lattice: one block for every point, cells on whole multiples, no seam at the equator."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pyproj import Geod, Transformer

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.lattice import (
    BLOCK_CELLS,
    CELL_LADDER_M,
    Block,
    block_of,
    blocks_of,
    cell_size_m,
    convergence_deg,
    from_true_north,
    utm_zone,
)

# 84° is where UTM ends; farther out the transverse Mercator loses its millimetres
longitudes = st.floats(-180.0, 180.0)
latitudes = st.floats(-80.0, 84.0)
ladder = st.sampled_from(CELL_LADDER_M)


@pytest.mark.parametrize(
    ("spacing_m", "step_m"),
    [
        (30.922, 30.0),  # 1″ at the equator
        (92.766, 90.0),  # 3″ at the equator
        (1.0, 5.0),
        (12.5, 10.0),
        (math.sqrt(5.0 * 10.0) - 0.01, 5.0),  # nearest by ratio: the border lies at the geometric mean
        (math.sqrt(5.0 * 10.0) + 0.01, 10.0),
        (math.sqrt(30.0 * 90.0) - 0.01, 30.0),
        (math.sqrt(30.0 * 90.0) + 0.01, 90.0),
        (927.0, 90.0),
    ],
)
def test_cell_size_is_the_nearest_step_by_ratio(spacing_m: float, step_m: float) -> None:
    assert cell_size_m(spacing_m) == step_m


@pytest.mark.parametrize(
    ("lon_deg", "zone"),
    [
        (-180.0, 1),
        (179.999, 60),
        (180.0, 1),  # the same meridian as −180°
        (0.0, 31),
        (-0.001, 30),
        (41.999999, 37),
        (42.0, 38),  # the western border belongs to the zone
        (5.0, 31),
    ],
)
def test_utm_zone_follows_from_longitude_alone(lon_deg: float, zone: int) -> None:
    assert utm_zone(lon_deg) == zone


@settings(max_examples=200, deadline=None)
@given(longitudes, latitudes, ladder)
def test_every_point_lies_in_the_core_of_its_one_block(lon: float, lat: float, step_m: float) -> None:
    block = block_of(lon, lat, step_m)
    east, north = Transformer.from_crs("EPSG:4326", block.crs, always_xy=True).transform(lon, lat)
    west_m, south_m, east_m, north_m = block.core_bounds
    assert west_m <= east < east_m
    assert south_m <= north < north_m


@settings(max_examples=50, deadline=None)
@given(st.lists(st.tuples(longitudes, latitudes), min_size=1, max_size=20), ladder)
def test_a_point_s_block_does_not_depend_on_the_others(points: list[tuple[float, float]], step_m: float) -> None:
    lon, lat = np.array(points).T
    assert blocks_of(lon, lat, step_m) == [block_of(x, y, step_m) for x, y in points]


def test_the_equator_is_no_seam() -> None:
    """One system on both sides, northings negative to the south, blocks −1 and 0 side by side."""
    south, north = block_of(39.0, -0.001, 30.0), block_of(39.0, 0.001, 30.0)
    assert south.crs == north.crs == "EPSG:32637"
    assert (south.north, north.north) == (-1, 0)
    assert south.core_bounds[3] == north.core_bounds[1] == 0.0


@settings(max_examples=100, deadline=None)
@given(
    st.integers(-5, 5),
    st.integers(-5, 5),
    ladder,
    st.floats(0.0, 30_000.0),
    st.tuples(*[st.floats(0.1, 0.9)] * 4),
)
def test_windows_lie_on_whole_multiples_of_the_cell(
    east: int, north: int, step_m: float, margin_m: float, inset: tuple[float, float, float, float]
) -> None:
    """Whatever the data's own extent, cell edges are absolute: a window never starts at the data's corner."""
    block = Block(37, east, north, step_m)
    west, south, east_m, north_m = block.core_bounds
    half = (east_m - west) / 2
    data = (west + inset[0] * half, south + inset[1] * half, east_m - inset[2] * half, north_m - inset[3] * half)
    grid = block.window(margin_m, data)
    for edge in (grid.west_m, grid.north_m):
        assert edge == round(edge / step_m) * step_m
    # all data inside the core are in, and never more than a cell beyond them
    for outer, inner in zip(grid.bounds[:2], data[:2], strict=True):
        assert 0 <= inner - outer < step_m
    for outer, inner in zip(grid.bounds[2:], data[2:], strict=True):
        assert 0 <= outer - inner < step_m


def test_a_window_in_the_midst_of_data_is_core_plus_margin() -> None:
    block = Block(37, 3, -2, 30.0)
    grid = block.window(12_601.0, (-1e7, -1e7, 1e7, 1e7))
    assert grid.bounds == (405_000.0 - 12_630.0, -270_000.0 - 12_630.0, 540_000.0 + 12_630.0, -135_000.0 + 12_630.0)
    assert grid.rows == grid.cols == BLOCK_CELLS + 2 * 421  # the margin is rounded up to whole cells


def test_a_window_without_data_is_refused() -> None:
    with pytest.raises(GridError, match="Block"):
        Block(37, 3, -2, 30.0).window(12_600.0, (0.0, 0.0, 1000.0, 1000.0))


def test_neighbouring_windows_share_their_cells() -> None:
    """What two blocks both see, they see through the same cells."""
    everywhere = (-1e7, -1e7, 1e7, 1e7)
    left, right = (Block(37, east, 0, 30.0).window(12_600.0, everywhere) for east in (2, 3))
    shared, _ = left.part(right.bounds)
    assert shared == right.part(left.bounds)[0]
    assert shared.cols == 2 * 420


@pytest.mark.parametrize(
    ("lon_deg", "lat_deg"), [(36.2, 20.0), (41.8, 20.0), (41.8, -20.0), (36.2, -20.0), (40.0, 0.0), (39.0, 15.0)]
)
def test_convergence_agrees_with_a_walk_to_grid_north(lon_deg: float, lat_deg: float) -> None:
    """Walk 10 m up the grid's north and ask the ellipsoid for the true bearing of that walk."""
    to_deg = Transformer.from_crs("EPSG:32637", "EPSG:4326", always_xy=True)
    east, north = to_deg.transform(lon_deg, lat_deg, direction="INVERSE")
    lon2, lat2 = to_deg.transform(east, north + 10.0)
    bearing, _, _ = Geod(ellps="WGS84").inv(lon_deg, lat_deg, lon2, lat2)
    found = convergence_deg("EPSG:32637", np.array([lon_deg]), np.array([lat_deg]))[0]
    # nanometres of rounding over 10 m are some 1e-7 degrees
    assert found == pytest.approx(bearing, abs=1e-5)


def test_convergence_reaches_one_degree_at_the_zone_s_edge() -> None:
    """Series of the first order, γ ≈ Δλ sin φ (Snyder 1987, USGS Professional Paper 1395, from memory): 1.03° here."""
    found = convergence_deg("EPSG:32637", np.array([42.0]), np.array([20.0]))[0]
    assert found == pytest.approx(3.0 * math.sin(math.radians(20.0)), rel=2e-3)


def test_a_field_of_bearings_is_turned_to_true_north() -> None:
    """Each cell by the meridian's convergence at its own centre, as PROJ has it."""
    grid = Grid("EPSG:32641", 700_000.0, 2_250_000.0, 900.0, 70, 90)
    turned = from_true_north(Field(np.full(grid.shape, 359.9), grid, "°", "bearing from grid north"))
    to_lonlat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
    lon, lat = to_lonlat.transform(*np.meshgrid(grid.x_centres_m(), grid.y_centres_m()))
    expected = (359.9 + convergence_deg(grid.crs, lon.ravel(), lat.ravel()).reshape(grid.shape)) % 360.0
    assert 0.5 < expected.max() < 1.5, "the grid is turned by about a degree here"
    assert turned.values == pytest.approx(expected, abs=2e-4)
    assert turned.what == "bearing from true north"

"""Heights on the lattice: a cell's height is right, and no window, cut or order of files changes a bit of it."""

from collections.abc import Callable
from itertools import permutations
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from pyproj import Transformer
from rasterio.transform import Affine

from sitescreen.brief import TerrainBrief
from sitescreen.grid import Grid
from sitescreen.inputs._cubic_kernel import _plane
from sitescreen.inputs.terrain import Terrain, open_terrain

SECOND = 1.0 / 3600.0
WAVE_DEG = 100 * SECOND
"""Waves of 100 cells of 1″ and 100 m: slopes to 11°, which a cubic follows to the centimetre."""

Surface = Callable[[Any, Any], Any]


def waves(lon: Any, lat: Any) -> Any:
    return 500.0 + 100.0 * np.sin(2 * np.pi * lon / WAVE_DEG) * np.cos(2 * np.pi * lat / WAVE_DEG)


def write(
    path: Path, values: Any, west: float, north: float, step: tuple[float, float], crs: str = "EPSG:4326", **more: Any
) -> Path:
    """A GeoTIFF, row 0 north."""
    profile = {"driver": "GTiff", "count": 1, "height": values.shape[0], "width": values.shape[1]}
    transform = Affine(step[0], 0, west, 0, -step[1], north)
    with rasterio.open(path, "w", **profile, dtype=values.dtype, crs=crs, transform=transform, **more) as out:
        out.write(values, 1)
    return path


def sampled(
    surface: Surface, west: float, north: float, shape: tuple[int, int], step: tuple[float, float]
) -> np.ndarray:
    x = west + (np.arange(shape[1]) + 0.5) * step[0]
    y = north - (np.arange(shape[0]) + 0.5) * step[1]
    return np.asarray(surface(*np.meshgrid(x, y)), dtype=np.float32)


def opened(*paths: Path, **more: Any) -> Terrain:
    return open_terrain(TerrainBrief.model_validate({"files": list(paths), **more}))


def grid_at(lon: float, lat: float, crs: str, rows: int = 150, cols: int = 170, step: float = 30.0) -> Grid:
    x, y = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(lon, lat)
    west, north = round(x / step) * step - cols // 2 * step, round(y / step) * step + rows // 2 * step
    return Grid(crs, west, north, step, rows, cols)


def lonlat(grid: Grid) -> tuple[Any, Any]:
    to = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
    lon, lat = to.transform(*np.meshgrid(grid.x_centres_m(), grid.y_centres_m()))
    return lon, lat


PLACES = {
    "across the equator": (39.0, 0.0, "EPSG:32637"),
    "10° north, at the edge of its zone": (5.95, 10.0, "EPSG:32631"),
    "20° south, northings below zero": (30.1, -20.0, "EPSG:32636"),
    "beyond the zone's edge": (42.3, -5.0, "EPSG:32637"),
    "across the date line": (180.0, -17.0, "EPSG:32660"),
}


@pytest.mark.parametrize("step", [(1, 1), (1.5, 1), (3, 3)], ids=["1″", "1.5″ × 1″", "3″"])
@pytest.mark.parametrize("place", PLACES)
def test_heights_are_those_of_the_ground_at_each_cell(tmp_path: Path, place: str, step: tuple[float, float]) -> None:
    """A surface known everywhere, evaluated at the exact longitude and latitude of each cell.

    A shift of one hundredth of a cell would show as 6 cm. Keys' cubic leaves about (2π/n)³/24 · amplitude at n cells a
    wave (half a centimetre for 100 m at 100 cells), so waves grow with the cells.
    """
    lon, lat, crs = PLACES[place]
    sx, sy = step[0] * SECOND, step[1] * SECOND
    long = max(step)

    def surface(x: Any, y: Any) -> Any:
        return waves(x / long, y / long)

    cols, rows = round(0.1 * long / sx / 2) * 2, round(0.1 * long / sy / 2) * 2
    west, north = lon - cols / 2 * sx, lat + rows / 2 * sy
    path = write(tmp_path / "tile.tif", sampled(surface, west, north, (rows, cols), (sx, sy)), west, north, (sx, sy))
    terrain = opened(path)
    assert terrain.cell_size_m == (90.0 if long == 3 else 30.0)
    grid = grid_at(lon, lat, crs, step=terrain.cell_size_m)
    at_lon, at_lat = lonlat(grid)
    at_lon = lon + (at_lon - lon + 180.0) % 360.0 - 180.0
    off = terrain.elevation(grid).values - surface(at_lon, at_lat)
    assert np.abs(off).max() < 0.03


def test_a_raster_stored_south_first_or_east_first_reads_the_same(tmp_path: Path) -> None:
    values = np.random.default_rng(8).normal(0.0, 50.0, (200, 200)).astype("f4")  # unlike itself when turned over
    plain = opened(write(tmp_path / "plain.tif", values, 39.0, -1.0, (SECOND, SECOND)))
    grid = grid_at(39.0 + 100 * SECOND, -1.0 - 100 * SECOND, "EPSG:32637", 120, 120)
    wanted = plain.elevation(grid).values
    assert np.isfinite(wanted).all()
    south = -1.0 - 200 * SECOND
    up = opened(write(tmp_path / "up.tif", values[::-1].copy(), 39.0, south, (SECOND, -SECOND)))
    assert np.array_equal(up.elevation(grid).values, wanted)
    east = 39.0 + 200 * SECOND
    left = opened(write(tmp_path / "left.tif", values[:, ::-1].copy(), east, -1.0, (-SECOND, SECOND)))
    assert np.array_equal(left.elevation(grid).values, wanted)


@pytest.fixture
def rough(tmp_path: Path) -> tuple[np.ndarray, float, float]:
    """Rough ground with gaps of all widths, so that the smallest difference in what a cell looks at would show."""
    rng = np.random.default_rng(11)
    values = rng.normal(600.0, 40.0, (240, 260)).astype(np.float32)
    for _ in range(60):
        row, col = rng.integers(0, 235), rng.integers(0, 255)
        values[row : row + rng.integers(1, 7), col : col + rng.integers(1, 9)] = np.nan
    values[:, 118:121] = np.nan  # along a seam
    values[100:103, 60:200] = np.nan
    return values, 39.0, -1.0


def part(folder: Path, rough: tuple[np.ndarray, float, float], rows: slice, cols: slice, name: str) -> Path:
    values, west, north = rough
    # a header's corner is computed as such programs do: from this tile's own numbers, with their rounding
    corner = west + cols.start / 3600.0, north - rows.start / 3600.0
    return write(folder / name, values[rows, cols].copy(), *corner, (SECOND, SECOND), nodata=float("nan"))


def test_one_tile_and_the_same_ground_in_four_agree_to_the_bit_in_any_order(
    tmp_path: Path, rough: tuple[np.ndarray, float, float]
) -> None:
    whole = opened(part(tmp_path, rough, slice(0, 240), slice(0, 260), "whole.tif"))
    halves_r, halves_c = (slice(0, 113), slice(113, 240)), (slice(0, 119), slice(119, 260))
    four = [part(tmp_path, rough, r, c, f"{r.start}_{c.start}.tif") for r in halves_r for c in halves_c]
    grid = grid_at(39.0 + 130 * SECOND, -1.0 - 120 * SECOND, "EPSG:32637", 260, 280)
    wanted = whole.elevation(grid).values
    assert 0.5 < np.isfinite(wanted).mean() < 0.95
    for order in permutations(four):
        cut = opened(*order)
        assert np.array_equal(cut.elevation(grid).values, wanted, equal_nan=True)
        assert cut.data_bounds("EPSG:32637") == whole.data_bounds("EPSG:32637")
        assert cut.data_outline().equals(whole.data_outline())
        assert cut.cell_size_m == whole.cell_size_m


def test_tiles_that_share_a_strip_agree_with_the_whole(tmp_path: Path, rough: tuple[np.ndarray, float, float]) -> None:
    """As tiles of 3,601 × 3,601 cells do, which share their outermost row and column."""
    whole = opened(part(tmp_path, rough, slice(0, 240), slice(0, 260), "whole.tif"))
    pieces = [(slice(0, 121), slice(0, 131)), (slice(120, 240), slice(0, 140))]
    pieces += [(slice(0, 130), slice(130, 260)), (slice(120, 240), slice(129, 260))]
    four = [part(tmp_path, rough, r, c, f"{k}.tif") for k, (r, c) in enumerate(pieces)]
    grid = grid_at(39.0 + 130 * SECOND, -1.0 - 120 * SECOND, "EPSG:32637", 260, 280)
    wanted = whole.elevation(grid).values
    for order in (four, four[::-1]):
        assert np.array_equal(opened(*order).elevation(grid).values, wanted, equal_nan=True)


@pytest.mark.parametrize("crs", ["EPSG:4326", "EPSG:32637"], ids=["degrees", "metres"])
@pytest.mark.parametrize("fine", [1.0, 0.3, 6.0], ids=["as fine", "averaged", "from coarse cells"])
def test_a_cells_height_is_the_same_in_every_window(
    tmp_path: Path, rough: tuple[np.ndarray, float, float], crs: str, fine: float
) -> None:
    """Coarse cells are the hardest: closing a gap looks 20 of them away, which here is 120 cells of the grid."""
    values, west, north = rough
    step = SECOND if crs == "EPSG:4326" else 30.0
    if crs != "EPSG:4326":
        west, north = 500_010.0, -110_490.0
    path = write(tmp_path / "t.tif", values, west, north, (step * fine, step * fine), crs, nodata=float("nan"))
    terrain = opened(path)
    bounds = terrain.data_bounds("EPSG:32637")
    cell = 30.0
    # with coarse cells, the part where the long gaps cross
    skip_x, skip_y = (105 * fine, 85 * fine) if fine > 1 else (-4, -5)
    x0, y0 = (round(bounds[0] / cell) + round(skip_x)) * cell, (round(bounds[3] / cell) - round(skip_y)) * cell
    rows, cols = (200, 220) if fine > 1 else (int(250 * fine), int(270 * fine))
    grid = Grid("EPSG:32637", x0, y0, cell, rows, cols)
    whole = terrain.elevation(grid).values
    assert 0.3 < np.isfinite(whole).mean() < 1.0
    rng = np.random.default_rng(3)
    for _ in range(25):
        row, col = int(rng.integers(0, rows - 2)), int(rng.integers(0, cols - 2))
        high, wide = int(rng.integers(1, rows - row)), int(rng.integers(1, cols - col))
        window = Grid(grid.crs, grid.west_m + col * cell, grid.north_m - row * cell, cell, high, wide)
        got = terrain.elevation(window).values
        assert np.array_equal(got, whole[row : row + high, col : col + wide], equal_nan=True)


def test_a_window_beyond_what_is_read_at_a_time_has_no_seam(tmp_path: Path) -> None:
    """Reading goes by squares of 1,024 cells; a window shifted by half of that must give the same bits."""
    rng = np.random.default_rng(5)
    path = write(tmp_path / "t.tif", rng.normal(0, 9, (1300, 60)).astype("f4"), 39.0, 1.0, (SECOND, SECOND))
    terrain = opened(path)
    tall = grid_at(39.0 + 30 * SECOND, 1.0 - 650 * SECOND, "EPSG:32637", 1200, 40)
    wanted = terrain.elevation(tall).values
    assert np.isfinite(wanted).all()
    below = Grid(tall.crs, tall.west_m, tall.north_m - 512 * 30.0, 30.0, 688, 40)
    assert np.array_equal(terrain.elevation(below).values, wanted[512:])


def test_where_tiles_of_two_resolutions_meet_the_first_named_wins_and_the_seam_is_sane(tmp_path: Path) -> None:
    """1″ in degrees on the left, 90 m in UTM over the whole: one surface, in which the cut must not show."""
    fine = sampled(waves, 39.0, -1.0, (200, 100), (SECOND, SECOND))
    one = write(tmp_path / "fine.tif", fine, 39.0, -1.0, (SECOND, SECOND))
    coarse_grid = grid_at(39.0 + 100 * SECOND, -1.0 - 100 * SECOND, "EPSG:32637", 100, 100, 90.0)
    coarse = (waves(*lonlat(coarse_grid)) + 1.0).astype("f4")  # a metre higher, to tell the two apart
    two = write(tmp_path / "coarse.tif", coarse, coarse_grid.west_m, coarse_grid.north_m, (90.0, 90.0), coarse_grid.crs)
    grid = grid_at(39.0 + 100 * SECOND, -1.0 - 100 * SECOND, "EPSG:32637", 120, 120)
    truth = waves(*lonlat(grid))
    east_of_cut = lonlat(grid)[0] > 39.0 + 100 * SECOND
    terrain = opened(one, two)
    assert terrain.cell_size_m == 30.0
    off = terrain.elevation(grid).values - truth
    # 34 cells of 90 m a wave: (2π/34)³/24 · 100 m is 3 cm, and as much again for the second axis
    assert np.abs(off[~east_of_cut]).max() < 0.2
    assert np.abs(off[east_of_cut] - 1.0).max() < 0.2
    assert any(note.text.startswith("coarse.tif has cells of about 90 m") for note in terrain.notes)
    turned = opened(two, one)
    assert np.abs(turned.elevation(grid).values - truth - 1.0).max() < 0.2
    assert any("Name the finer first" in note.text for note in turned.notes)


def test_where_tiles_overlap_the_first_named_wins_and_the_second_fills_its_gaps(tmp_path: Path) -> None:
    low, high = np.full((60, 60), 100.0, dtype="f4"), np.full((60, 60), 200.0, dtype="f4")
    low[20:40, 30:50] = np.nan
    one = write(tmp_path / "one.tif", low, 500_010.0, 9_000.0, (30.0, 30.0), "EPSG:32637", nodata=float("nan"))
    two = write(tmp_path / "two.tif", high, 500_010.0 + 20 * 30.0, 9_000.0, (30.0, 30.0), "EPSG:32637")
    grid = Grid("EPSG:32637", 500_010.0, 9_000.0, 30.0, 60, 80)  # cell on cell, so that heights come out as they are
    first_low, first_high = opened(one, two).elevation(grid).values, opened(two, one).elevation(grid).values
    wanted = np.full((60, 80), 100.0)
    wanted[:, 60:] = 200.0
    wanted[20:40, 30:50] = 200.0
    assert np.abs(first_low - wanted).max() < 1e-4  # a cell is found to a nanometre, not to nothing
    wanted[:, 20:] = 200.0
    assert np.abs(first_high - wanted).max() < 1e-4


def test_one_metre_ground_is_averaged_to_five(tmp_path: Path) -> None:
    """A plane stays, and of white noise of 1 m at most a third is left; picking cells would leave it whole."""
    x, y = np.meshgrid(np.arange(400) + 0.5, -np.arange(400) - 0.5)
    plane = 100.0 + 0.1 * x + 0.05 * y
    noise = np.random.default_rng(2).normal(0.0, 1.0, plane.shape)
    path = write(tmp_path / "lidar.tif", (plane + noise).astype("f4"), 500_000.0, 9_000.0, (1.0, 1.0), "EPSG:32637")
    terrain = opened(path)
    assert terrain.cell_size_m == 5.0
    grid = Grid("EPSG:32637", 500_050.0, 8_950.0, 5.0, 60, 60)
    xx, yy = np.meshgrid(grid.x_centres_m() - 500_000.0, grid.y_centres_m() - 9_000.0)
    off = terrain.elevation(grid).values - (100.0 + 0.1 * xx + 0.05 * yy)
    assert off.std() < 0.33
    assert abs(off.mean()) < 0.02


def test_a_finer_or_unevenly_cut_header_is_still_one_lattice(tmp_path: Path) -> None:
    """Headers that write a cell as 0.00027777778 or a corner to seven digits belong with their neighbours."""
    values = sampled(waves, 39.0, -1.0, (200, 200), (SECOND, SECOND))
    a = write(tmp_path / "a.tif", values[:, :100].copy(), 39.0, -1.0, (0.00027777778, 0.00027777778))
    b = write(tmp_path / "b.tif", values[:, 100:].copy(), 39.0277778, -1.0, (SECOND, SECOND))
    whole = write(tmp_path / "w.tif", values, 39.0, -1.0, (SECOND, SECOND))
    grid = grid_at(39.0 + 100 * SECOND, -1.0 - 100 * SECOND, "EPSG:32637", 120, 120)
    wanted = opened(whole).elevation(grid).values
    assert np.array_equal(opened(a, b).elevation(grid).values, wanted)
    assert len(opened(b, a).mosaics) == 1


def test_ground_beyond_the_files_is_unknown(tmp_path: Path) -> None:
    values = sampled(waves, 39.0, -1.0, (100, 100), (SECOND, SECOND))
    terrain = opened(write(tmp_path / "t.tif", values, 39.0, -1.0, (SECOND, SECOND)))
    grid = grid_at(39.0, -1.0, "EPSG:32637", 80, 80)
    heights = terrain.elevation(grid).values
    lon, lat = lonlat(grid)
    inside = (lon > 39.0) & (lat < -1.0)
    assert np.array_equal(np.isfinite(heights), inside)
    far = grid_at(40.0, -1.0, "EPSG:32637", 10, 10)
    assert np.isnan(terrain.elevation(far).values).all()


def test_the_outline_and_bounds_are_those_of_the_files(tmp_path: Path) -> None:
    values = sampled(waves, 39.0, -1.0, (100, 200), (SECOND, SECOND))
    terrain = opened(write(tmp_path / "t.tif", values, 39.0, -1.0, (SECOND, SECOND)))
    outline = terrain.data_outline()
    assert outline.bounds == pytest.approx((39.0, -1.0 - 100 * SECOND, 39.0 + 200 * SECOND, -1.0), abs=1e-9)
    to = Transformer.from_crs("EPSG:4326", "EPSG:32637", always_xy=True)
    wanted = to.transform_bounds(*outline.bounds, densify_pts=201)
    # the edge bulges by under 0.1 m between the points that are moved
    assert terrain.data_bounds("EPSG:32637") == pytest.approx(wanted, abs=0.1)


def test_on_a_slope_heights_are_right_up_to_the_edge_of_the_data_and_of_gaps(tmp_path: Path) -> None:
    """The last half cell is carried on along the slope; carried on level it would be 6 m off on this hillside."""
    col, row = np.meshgrid(np.arange(90.0), np.arange(80.0))
    hill = (300.0 + 9.0 * col - 8.0 * row).astype("f4")
    hill[30:41, 20:33] = np.nan
    hill[60:, 70:] = np.nan
    path = write(tmp_path / "t.tif", hill, 500_010.0, -20_010.0, (30.0, 30.0), "EPSG:32637", nodata=float("nan"))
    grid = Grid("EPSG:32637", 500_010.0 - 17.0, -20_010.0 + 14.0, 30.0, 82, 92)  # centres far from the file's own
    heights = opened(path).elevation(grid).values
    x, y = np.meshgrid(grid.x_centres_m() - 500_025.0, grid.y_centres_m() + 20_025.0)
    off = heights - (300.0 + 0.3 * x + 8.0 / 30.0 * y)
    assert np.isnan(heights[35, 28])
    assert np.isfinite(off).sum() == 80 * 90 - 11 * 13 - 20 * 20
    assert np.nanmax(np.abs(off)) < 0.001


@pytest.mark.parametrize(
    ("known", "wanted"),
    [
        ([(2, 2)], 50.0),  # one height says nothing of a slope
        ([(2, 2), (2, 3)], 50.0 + 4.0 * 0.3),
        ([(1, 2), (2, 2), (3, 2)], 50.0 - 6.0 * 0.2),
        ([(1, 1), (2, 2)], 50.0 - 2.0 * 0.25),  # 2 down a diagonal step, of which the point lies a quarter along
        ([(2, 2), (2, 1), (3, 2)], 50.0 + 4.0 * 0.3 - 6.0 * 0.2),
    ],
)
def test_the_plane_through_few_heights_says_only_what_they_tell(known: list[tuple[int, int]], wanted: float) -> None:
    ground = np.full((5, 5), np.nan, dtype=np.float32)
    for row, col in known:
        ground[row, col] = 50.0 + 4.0 * (col - 2) - 6.0 * (row - 2)
    for plane in (_plane, _plane.py_func):
        assert plane(ground, 2, 2, 0.2, 0.3, 1.0, 1.0, np.empty(8))[0] == pytest.approx(wanted, abs=1e-9)


def test_at_the_edge_of_rough_ground_known_heights_are_kept(tmp_path: Path) -> None:
    """Cell on cell, the files' own heights come out, those of the outermost cells too: nothing is smoothed there."""
    values = np.random.default_rng(4).normal(0.0, 40.0, (50, 60)).astype("f4")
    values[20:30, 20:34] = np.nan
    path = write(tmp_path / "t.tif", values, 500_010.0, 9_000.0, (30.0, 30.0), "EPSG:32637", nodata=float("nan"))
    read = opened(path).elevation(Grid("EPSG:32637", 500_010.0, 9_000.0, 30.0, 50, 60)).values
    assert np.array_equal(np.isnan(read), np.isnan(values))
    assert np.nanmax(np.abs(read - values)) < 1e-3

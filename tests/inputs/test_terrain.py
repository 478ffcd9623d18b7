"""The terrain as a whole: from files of every kind to heights on the lattice."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine
from pyproj import Transformer
from rasterio.warp import Resampling, reproject

from sitescreen.brief import TerrainBrief
from sitescreen.errors import BriefError, InputError
from sitescreen.grid import Grid
from sitescreen.inputs.terrain import Terrain, open_terrain
from sitescreen.lattice import block_of

SECOND = 1.0 / 3600.0


def write(path: Path, values: np.ndarray, transform: Affine, crs: str | None = "EPSG:4326", **more: Any) -> Path:
    """A GeoTIFF of one band."""
    rows, cols = values.shape
    tags = {"nodata": more.pop("nodata", None), "units": more.pop("units", None)}
    profile = {"dtype": values.dtype.name, "crs": crs, "transform": transform, "nodata": tags["nodata"], **more}
    with rasterio.open(path, "w", "GTiff", cols, rows, 1, **profile) as out:
        out.write(values, 1)
        if tags["units"]:
            out.units = (tags["units"],)
    return path


def terrain(*files: Path, **keys: Any) -> Terrain:
    return open_terrain(TerrainBrief.model_validate({"files": list(files), "vertical_error_m": 2.0, **keys}))


def said(found: Terrain, level: str | None = None) -> str:
    return "\n".join(note.text for note in found.notes if level in (None, note.level))


def whole_window(found: Terrain, crs: str) -> Grid:
    """The lattice's grid over all the data."""
    step = found.cell_size_m
    west, south, east, north = found.data_bounds(crs)
    west, south = np.floor(west / step) * step, np.floor(south / step) * step
    cols, rows = int(np.ceil((east - west) / step)), int(np.ceil((north - south) / step))
    return Grid(crs, west, south + rows * step, step, rows, cols)


Surface = Callable[[np.ndarray, np.ndarray], np.ndarray]


def wave(east: np.ndarray, north: np.ndarray) -> np.ndarray:
    """Hills of 100 m and waves of 2 km: slopes to 30 %."""
    return 500.0 + 50.0 * np.sin(east / 318.3) * np.cos(north / 318.3) + 0.05 * (east % 1e6 - 5e5) / 10.0


def plane(east: np.ndarray, north: np.ndarray) -> np.ndarray:
    """0.3 % up to the east, 0.1 % up to the north."""
    return 0.003 * (east - 500_000.0) + 0.001 * north


def geographic(
    path: Path, surface: Surface, crs: str, lon: float, lat: float, n: int = 150, dx: float = 1.0, dy: float = 1.0
) -> Path:
    """A raster in degrees whose cells hold a surface of a metric system at their centres."""
    transform = Affine(dx * SECOND, 0.0, lon, 0.0, -dy * SECOND, lat)
    cols, rows = np.meshgrid(np.arange(n) + 0.5, np.arange(n) + 0.5)
    to_metres = Transformer.from_crs("EPSG:4326", crs, always_xy=True)
    east, north = to_metres.transform(lon + cols * dx * SECOND, lat - rows * dy * SECOND)
    return write(path, surface(east, north).astype(np.float32), transform)


def inner(values: np.ndarray, rim: int = 6) -> np.ndarray:
    return values[rim:-rim, rim:-rim]


@pytest.mark.parametrize(
    ("crs", "lon", "lat"),
    [
        ("EPSG:32637", 39.2, 0.02),  # straddles the equator: northings on both sides of 0
        ("EPSG:32637", 39.9, -9.98),
        ("EPSG:32637", 36.4, -19.9),
        ("EPSG:32641", 63.0, 10.1),
    ],
)
@pytest.mark.parametrize(("surface", "within_m"), [(plane, 0.01), (wave, 0.05)])
def test_one_second_cells_come_out_as_the_surface_they_were_taken_from(
    tmp_path: Path, crs: str, lon: float, lat: float, surface: Surface, within_m: float
) -> None:
    """Cell centres at 30 m on the lattice, south of the equator with negative northings."""
    found = terrain(geographic(tmp_path / "t.tif", surface, crs, lon, lat))
    assert found.cell_size_m == 30.0
    grid = whole_window(found, crs)
    east, north = np.meshgrid(grid.x_centres_m(), grid.y_centres_m())
    off = inner(found.elevation(grid).values - surface(east, north))
    assert np.isfinite(off).mean() > 0.9
    assert np.nanmax(np.abs(off)) < within_m


def test_the_equator_is_no_seam(tmp_path: Path) -> None:
    found = terrain(geographic(tmp_path / "t.tif", wave, "EPSG:32637", 39.2, 0.02))
    west, south, east, north = found.data_bounds("EPSG:32637")
    assert south < -1000.0 < 1000.0 < north
    block = block_of(39.22, -0.001, 30.0)
    assert block.crs == "EPSG:32637"
    grid = block.window(12_600.0, (west, south, east, north))
    assert grid.north_m > 0 > grid.bounds[1]
    assert np.isfinite(inner(found.elevation(grid).values)).all()


def random_tile(n: int = 120) -> np.ndarray:
    """Rough ground with a wide void, a narrow one, and a creek that runs out at the edge."""
    rng = np.random.default_rng(7)
    values = (300.0 + 40.0 * rng.standard_normal((n, n))).astype(np.float32)
    values[30:48, 50:66] = -9999.0
    values[58:62, 20:22] = -9999.0
    values[80:90, 59:61] = -9999.0  # across the cut
    values[100:, 30] = -9999.0
    return values


def cut(folder: Path, values: np.ndarray, transform: Affine, overlap: int, crs: str = "EPSG:4326") -> list[Path]:
    """The same ground in four unequal files."""
    n = len(values)
    row, col = 53, 60
    parts = [
        (slice(0, row + overlap), slice(0, col + overlap)),
        (slice(0, row + overlap), slice(col - overlap, n)),
        (slice(row - overlap, n), slice(0, col + overlap)),
        (slice(row - overlap, n), slice(col - overlap, n)),
    ]
    return [
        write(
            folder / f"{crs[5:]}_{overlap}_{k}.tif",
            values[r, c],
            transform @ Affine.translation(c.start, r.start),
            crs,
            nodata=-9999.0,
        )
        for k, (r, c) in enumerate(parts)
    ]


AWKWARD = {
    "whole seconds": (Affine(SECOND, 0.0, 39.1, 0.0, -SECOND, -2.3), "EPSG:4326", "EPSG:32637"),
    "half a cell off": (
        Affine(SECOND, 0.0, 39.0 - SECOND / 2, 0.0, -SECOND, 1.0 + SECOND / 2),
        "EPSG:4326",
        "EPSG:32637",
    ),
    "no round step": (Affine(0.00031234567, 0.0, 39.123, 0.0, -0.00029123, -2.3001), "EPSG:4326", "EPSG:32637"),
    "west of Greenwich": (Affine(SECOND, 0.0, -0.02, 0.0, -SECOND, 0.015), "EPSG:4326", "EPSG:32630"),
    "metres of another zone": (Affine(27.3, 0.0, 803_417.77, 0.0, -27.3, 9_812_345.21), "EPSG:32736", "EPSG:32637"),
}


@pytest.mark.parametrize("name", AWKWARD)
@pytest.mark.parametrize("overlap", [0, 1, 9])
def test_four_tiles_are_one_to_the_bit(tmp_path: Path, name: str, overlap: int) -> None:
    """In every order, with seams and with overlaps, voids across the cut and all."""
    transform, crs, target = AWKWARD[name]
    values = random_tile()
    one = terrain(write(tmp_path / "whole.tif", values, transform, crs, nodata=-9999.0))
    grid = whole_window(one, target)
    expected = one.elevation(grid).values
    assert 0.5 < np.isfinite(expected).mean() < 1.0
    files = cut(tmp_path, values, transform, overlap, crs)
    for order in ([0, 1, 2, 3], [3, 2, 1, 0], [2, 0, 3, 1]):
        four = terrain(*(files[k] for k in order))
        assert four.cell_size_m == one.cell_size_m
        assert four.data_bounds(target) == one.data_bounds(target)
        assert four.elevation(grid).values.tobytes() == expected.tobytes()
        assert four.data_outline().symmetric_difference(one.data_outline()).area < 1e-15


NEAR_GAPS = [(54 + k, 17, 9, 9) for k in (0, 3, 6)] + [(70 + 4 * k, 55, 8, 8) for k in range(4)]
"""Windows whose edges pass by narrow gaps, which look like wide ones to whoever sees no further."""


@pytest.mark.parametrize("name", AWKWARD)
def test_a_cell_has_the_same_bits_in_every_window(tmp_path: Path, name: str) -> None:
    """Windows of odd sizes and corners, also ones whose corner lies outside the data."""
    transform, crs, target = AWKWARD[name]
    found = terrain(write(tmp_path / "t.tif", random_tile(), transform, crs, nodata=-9999.0))
    grid = whole_window(found, target)
    whole = found.elevation(grid).values
    step = grid.cell_size_m
    for row, col, rows, cols in [
        (0, 0, 7, 90),
        (13, 31, 50, 41),
        (60, 70, 45, 60),
        (-40, -50, 90, 90),
        (55, 2, 1, 1),
        *NEAR_GAPS,
    ]:
        part = Grid(grid.crs, grid.west_m + col * step, grid.north_m - row * step, step, rows, cols)
        heights = found.elevation(part).values
        r0, c0 = max(row, 0), max(col, 0)
        r1, c1 = min(row + rows, grid.rows), min(col + cols, grid.cols)
        inside = heights[r0 - row : r1 - row, c0 - col : c1 - col]
        assert inside.tobytes() == whole[r0:r1, c0:c1].tobytes()


def test_reading_in_several_pieces_changes_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Large grids are read piece by piece to bound the memory."""
    transform, crs, target = AWKWARD["whole seconds"]
    found = terrain(write(tmp_path / "t.tif", random_tile(), transform, crs, nodata=-9999.0))
    grid = whole_window(found, target)
    at_once = found.elevation(grid).values
    monkeypatch.setattr("sitescreen.inputs.terrain_warp.TILE_CELLS", 17)
    assert found.elevation(grid).values.tobytes() == at_once.tobytes()


def test_a_tile_far_away_changes_nothing(tmp_path: Path) -> None:
    """Also not when its header gives the cell size in fewer digits."""
    near = geographic(tmp_path / "near.tif", wave, "EPSG:32637", 39.0, -2.0)
    far = write(
        tmp_path / "far.tif", np.full((90, 90), 5.0, np.float32), Affine(0.00027778, 0, 44.0, 0, -0.00027778, 3.0)
    )
    alone, both = terrain(near), terrain(near, far)
    assert len(both.mosaics) == 1
    grid = whole_window(alone, "EPSG:32637")
    assert both.elevation(grid).values.tobytes() == alone.elevation(grid).values.tobytes()


def test_heights_agree_with_gdals_cubic_warp(tmp_path: Path) -> None:
    """GDAL, at error tolerance 0, as an independent calculation of the same convolution. Upsampling, so no widening."""
    path = geographic(tmp_path / "t.tif", wave, "EPSG:32637", 39.2, -4.0, n=100, dx=1.05, dy=1.05)
    found = terrain(path)
    grid = whole_window(found, "EPSG:32637")
    expected = np.full(grid.shape, np.nan, dtype=np.float32)
    with rasterio.open(path) as source:
        reproject(
            rasterio.band(source, 1),
            expected,
            dst_transform=grid.transform,
            dst_crs=grid.crs,
            dst_nodata=np.nan,
            resampling=Resampling.cubic,
            tolerance=0.0,
            XSCALE=1.0,
            YSCALE=1.0,
        )
    off = inner(np.abs(found.elevation(grid).values - expected), 4)
    assert np.isfinite(off).sum() > 0.8 * off.size
    assert np.nanmax(off) < 0.1


def test_fine_cells_are_averaged_and_not_picked(tmp_path: Path) -> None:
    """A metre of noise at 1 m cells must shrink when 25 of them make one of 5 m."""
    rng = np.random.default_rng(3)
    values = (100.0 + rng.standard_normal((200, 200))).astype(np.float32)
    found = terrain(write(tmp_path / "t.tif", values, Affine(1.0, 0, 500_000.0, 0, -1.0, 9000.0), "EPSG:32637"))
    assert found.cell_size_m == 5.0
    heights = inner(found.elevation(whole_window(found, "EPSG:32637")).values, 3)
    # the stretched cubic keeps 1/5 · √(Σ weights²) of the noise on each axis: ∫ of the squared kernel is 0.8651 (Keys,
    # a = −1/2, integrated by hand), so 0.865/5 in all
    assert heights.mean() == pytest.approx(100.0, abs=0.05)
    assert heights.std() == pytest.approx(0.865 / 5.0, rel=0.1)


def test_ascending_rows_and_columns_come_out_upright(tmp_path: Path) -> None:
    """South-up and mirrored files hold the same ground."""
    values = random_tile()
    a = Affine(SECOND, 0.0, 39.0, 0.0, -SECOND, 2.0)
    n = len(values)
    upright = terrain(write(tmp_path / "up.tif", values, a, nodata=-9999.0))
    grid = whole_window(upright, "EPSG:32637")
    expected = upright.elevation(grid).values
    down = Affine(SECOND, 0.0, 39.0, 0.0, SECOND, 2.0 - n * SECOND)
    south_up = terrain(write(tmp_path / "down.tif", values[::-1].copy(), down, nodata=-9999.0))
    assert south_up.elevation(grid).values.tobytes() == expected.tobytes()
    left = Affine(-SECOND, 0.0, 39.0 + n * SECOND, 0.0, -SECOND, 2.0)
    mirrored = terrain(write(tmp_path / "left.tif", values[:, ::-1].copy(), left, nodata=-9999.0))
    assert mirrored.elevation(grid).values.tobytes() == expected.tobytes()


def test_cells_need_not_be_square(tmp_path: Path) -> None:
    """1.5″ × 1″, as published far from the equator: no stretching of the ground."""
    found = terrain(geographic(tmp_path / "t.tif", wave, "EPSG:32637", 39.0, 54.0, dx=1.5, dy=1.0))
    assert found.cell_size_m == 30.0
    grid = whole_window(found, "EPSG:32637")
    east, north = np.meshgrid(grid.x_centres_m(), grid.y_centres_m())
    off = inner(found.elevation(grid).values - wave(east, north))
    assert np.isfinite(off).mean() > 0.8
    assert np.nanmax(np.abs(off)) < 0.05


@pytest.mark.parametrize(
    ("spacing_seconds", "step"), [(1.0, 30.0), (3.0, 90.0), (0.4, 10.0), (1 / 9, 5.0), (30.0, 90.0), (2.0, 90.0)]
)
def test_the_cell_size_follows_the_finest_file(tmp_path: Path, spacing_seconds: float, step: float) -> None:
    values = np.full((40, 40), 5.0, np.float32)
    coarse = write(tmp_path / "c.tif", values, Affine(60 * SECOND, 0, 39.0, 0, -60 * SECOND, 2.0))
    size = spacing_seconds * SECOND
    fine = write(tmp_path / "f.tif", values, Affine(size, 0, 39.0, 0, -size, 2.0))
    assert terrain(fine, coarse).cell_size_m == step


def test_files_of_two_systems_and_sizes_fill_one_another(tmp_path: Path) -> None:
    """The first-named counts where both have ground; the other serves beyond it and in its wide voids."""
    hole = np.full((100, 100), 100.0, np.float32)
    hole[40:60, 40:60] = -9999.0
    fine = write(tmp_path / "fine.tif", hole, Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0), nodata=-9999.0)
    coarse = write(
        tmp_path / "coarse.tif",
        np.full((80, 80), 200.0, np.float32),
        Affine(90.0, 0, 498_000.0, 0, -90.0, 223_000.0),
        "EPSG:32637",
    )
    both = terrain(fine, coarse)
    assert both.cell_size_m == 30.0
    assert "coarse.tif has cells of about 90 m" in said(both)
    grid = whole_window(both, "EPSG:32637")
    heights = both.elevation(grid).values
    assert set(np.unique(heights[np.isfinite(heights)])) == {100.0, 200.0}
    to_utm = Transformer.from_crs("EPSG:4326", "EPSG:32637", always_xy=True)
    for lon, lat, expected in [
        (39.0 + 20 * SECOND, 2.0 - 20 * SECOND, 100.0),
        (39.0 + 50 * SECOND, 2.0 - 50 * SECOND, 200.0),
        (39.0 + 50 * SECOND, 2.0 + 20 * SECOND, 200.0),
    ]:
        x, y = to_utm.transform(lon, lat)
        row, col = grid.rows_cols(np.array([x]), np.array([y]))
        assert heights[row[0], col[0]] == expected
    other = terrain(coarse, fine)
    assert (other.elevation(grid).values == 200.0).sum() > (heights == 200.0).sum()
    assert "Name the finer first" in said(other, "warning")


def test_the_first_named_of_equal_files_wins(tmp_path: Path) -> None:
    a = Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0)
    one = write(tmp_path / "one.tif", np.full((60, 60), 1.0, np.float32), a)
    two = write(tmp_path / "two.tif", np.full((60, 60), 2.0, np.float32), a @ Affine.translation(30, 0))
    grid = whole_window(terrain(one, two), "EPSG:32637")
    first, second = terrain(one, two).elevation(grid).values, terrain(two, one).elevation(grid).values
    assert first[30, 45] == 1.0
    assert second[30, 45] == 2.0


def test_sea_at_zero_stays_as_it_is(tmp_path: Path) -> None:
    """Without a declared no-data, 0 is a height: the shoreline decides what is sea."""
    values = np.full((80, 80), 12.0, np.float32)
    values[:, :30] = 0.0
    found = terrain(write(tmp_path / "t.tif", values, Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0)))
    heights = inner(found.elevation(whole_window(found, "EPSG:32637")).values, 3)
    assert np.isfinite(heights).all()
    assert (heights == 0.0).mean() == pytest.approx(30 / 80, abs=0.06)


def test_declared_no_data_at_zero_is_unknown_and_not_filled(tmp_path: Path) -> None:
    values = np.full((80, 80), 12, np.int16)
    values[:, :30] = 0
    found = terrain(write(tmp_path / "t.tif", values, Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0), nodata=0))
    heights = found.elevation(whole_window(found, "EPSG:32637")).values
    assert set(np.unique(heights[np.isfinite(heights)])) == {12.0}
    assert np.isnan(heights).mean() == pytest.approx(30 / 80, abs=0.06)
    assert "no heights on" in "".join(note.text for note in found.findings)


@pytest.mark.parametrize(
    ("sentinel", "dtype"),
    [
        (-32768, "int16"),
        (-32767, "int16"),
        (-9999, "int32"),
        (-9999.0, "float32"),
        (-99999.0, "float32"),
        (-3.4028234663852886e38, "float32"),
        (3.4e38, "float64"),
        (np.nan, "float32"),
        (np.inf, "float32"),
    ],
)
def test_undeclared_no_data_never_becomes_a_height(tmp_path: Path, sentinel: float, dtype: str) -> None:
    values = np.full((80, 80), 12, dtype)
    values[20:60, 20:60] = sentinel
    found = terrain(write(tmp_path / "t.tif", values, Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0)))
    heights = found.elevation(whole_window(found, "EPSG:32637")).values
    assert set(np.unique(heights[np.isfinite(heights)])) == {12.0}
    assert np.isnan(inner(heights)).any()
    if abs(sentinel) < 1e6:
        assert f"holds the value {sentinel:.0f} without declaring it" in said(found, "warning")


def test_no_data_declared_in_more_digits_than_stored_is_found(tmp_path: Path) -> None:
    """-3.40282e38 in the header, its nearest float32 in the cells; and a no-data that the type cannot hold."""
    values = np.full((60, 60), 12.0, np.float32)
    values[20:40, 20:40] = np.float32(-1234.56789)
    a = Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0)
    found = terrain(write(tmp_path / "t.tif", values, a, nodata=-1234.567891234))
    heights = found.elevation(whole_window(found, "EPSG:32637")).values
    assert np.nanmin(heights) == 12.0


def test_a_mask_beside_the_values_counts(tmp_path: Path) -> None:
    path = tmp_path / "t.tif"
    write(path, np.full((60, 60), 12.0, np.float32), Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0))
    with rasterio.Env(GDAL_TIFF_INTERNAL_MASK=True), rasterio.open(path, "r+") as out:
        mask = np.full((60, 60), 255, np.uint8)
        mask[20:40, 20:40] = 0
        out.write_mask(mask)
    found = terrain(path)
    heights = inner(found.elevation(whole_window(found, "EPSG:32637")).values)
    assert 200 < np.isnan(heights).sum() < 600


@pytest.mark.parametrize(
    ("tag", "brief", "factor", "spoken"),
    [
        ("ft", None, 0.3048, "turned into metres"),
        ("US survey foot", None, 1200 / 3937, "turned into metres"),
        ("metre", None, 1.0, ""),
        (None, "ft", 0.3048, ""),
        (None, None, 1.0, "taken as metres"),
        ("m", "ft", 0.3048, "the brief was believed"),
        ("US survey foot", "ft", 1200 / 3937, ""),
    ],
)
def test_feet_become_metres(tmp_path: Path, tag: str | None, brief: str | None, factor: float, spoken: str) -> None:
    values = np.full((60, 60), 3000.0, np.float32)
    path = write(tmp_path / "t.tif", values, Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0), units=tag)
    found = terrain(path, vertical_unit=brief)
    heights = inner(found.elevation(whole_window(found, "EPSG:32637")).values)
    assert heights == pytest.approx(3000.0 * factor, rel=1e-6)
    about_units = [note.text for note in found.notes if "“" in note.text or "unit" in note.text]
    assert (spoken in "".join(about_units)) if spoken else not about_units


def test_feet_of_a_vertical_system_become_metres(tmp_path: Path) -> None:
    """EPSG:6360 is NAVD 88 height in US survey feet."""
    values = np.full((60, 60), 1000.0, np.float32)
    found = terrain(write(tmp_path / "t.tif", values, Affine(SECOND, 0, -105.0, 0, -SECOND, 40.0), "EPSG:4269+6360"))
    heights = inner(found.elevation(whole_window(found, "EPSG:32613")).values)
    assert heights == pytest.approx(1000.0 * 1200 / 3937, rel=1e-6)


def test_scale_and_offset_are_applied(tmp_path: Path) -> None:
    path = write(tmp_path / "t.tif", np.full((60, 60), 1230, np.int16), Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0))
    with rasterio.open(path, "r+") as out:
        out.scales, out.offsets = (0.1,), (50.0,)
    found = terrain(path)
    assert inner(found.elevation(whole_window(found, "EPSG:32637")).values) == pytest.approx(173.0)


def test_heights_that_smell_of_feet_are_told_or_refused(tmp_path: Path) -> None:
    values = np.full((60, 60), 7000.0, np.float32)
    a = Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0)
    assert "if they are feet" in said(terrain(write(tmp_path / "high.tif", values, a)), "warning")
    with pytest.raises(InputError, match=r"higher\.tif says no unit and holds heights up to 14000.*“?vertical_unit"):
        terrain(write(tmp_path / "higher.tif", 2 * values, a))


def test_impossible_heights_are_unknown(tmp_path: Path) -> None:
    values = np.full((60, 60), 12.0, np.float32)
    values[20:40, 20:40] = 65535.0
    found = terrain(write(tmp_path / "t.tif", values, Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0), units="m"))
    heights = found.elevation(whole_window(found, "EPSG:32637")).values
    assert np.nanmax(heights) == 12.0
    assert "impossible" in said(found, "warning")


def test_several_bands_are_told_and_pictures_refused(tmp_path: Path) -> None:
    a = Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0)
    profile = {"driver": "GTiff", "width": 60, "height": 60, "crs": "EPSG:4326", "transform": a}
    with rasterio.open(tmp_path / "two.tif", "w", count=2, dtype="float32", **profile) as out:
        out.write(np.stack([np.full((60, 60), 12.0), np.full((60, 60), 99.0)]).astype(np.float32))
    found = terrain(tmp_path / "two.tif")
    assert inner(found.elevation(whole_window(found, "EPSG:32637")).values).max() == 12.0
    assert "two.tif has 2 bands" in said(found, "warning")
    with rasterio.open(tmp_path / "rgb.tif", "w", count=3, dtype="uint8", photometric="RGB", **profile) as out:
        out.write(np.full((3, 60, 60), 9, np.uint8))
    with pytest.raises(InputError, match=r"rgb\.tif is a picture"):
        terrain(tmp_path / "rgb.tif")


# --- refusals -----------------------------------------------------------------------------------------------------


def good(folder: Path, crs: str | None = "EPSG:32637") -> Path:
    return write(folder / "t.tif", random_tile(), Affine(30.0, 0, 500_000.0, 0, -30.0, 9000.0), crs, nodata=-9999.0)


def test_a_missing_file_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"gone\.tif is not there"):
        terrain(tmp_path / "gone.tif")


def test_a_file_that_is_no_raster_is_refused(tmp_path: Path) -> None:
    (tmp_path / "t.tif").write_text("not a raster", encoding="utf-8")
    with pytest.raises(InputError, match=r"t\.tif cannot be opened as a raster"):
        terrain(tmp_path / "t.tif")


@pytest.mark.parametrize("compress", [None, "deflate"])
@pytest.mark.parametrize("tiled", [True, False])
@pytest.mark.parametrize("kept", [0.3, 0.9])
def test_a_truncated_file_is_refused(tmp_path: Path, compress: str | None, tiled: bool, kept: float) -> None:
    values = np.random.default_rng(1).uniform(0, 100, (300, 300)).astype(np.float32)
    shape = {"blockxsize": 64, "blockysize": 64} if tiled else {}
    path = write(
        tmp_path / "t.tif",
        values,
        Affine(30.0, 0, 5e5, 0, -30.0, 9e3),
        "EPSG:32637",
        compress=compress,
        tiled=tiled,
        **shape,
    )
    path.write_bytes(path.read_bytes()[: int(path.stat().st_size * kept)])
    with pytest.raises(InputError, match=r"t\.tif"):
        terrain(path)


def test_damage_that_opening_does_not_see_is_refused_when_it_is_read(tmp_path: Path) -> None:
    """One block of many is overwritten: found when its heights are asked for, with the file named."""
    values = np.random.default_rng(1).uniform(0, 100, (640, 640)).astype(np.float32)
    path = write(
        tmp_path / "t.tif",
        values,
        Affine(30.0, 0, 5e5, 0, -30.0, 3e4),
        "EPSG:32637",
        compress="deflate",
        tiled=True,
        blockxsize=64,
        blockysize=64,
    )
    found = terrain(path)
    raw = bytearray(path.read_bytes())
    middle = int(len(raw) * 0.53)
    raw[middle : middle + 20_000] = b"\0" * 20_000
    path.write_bytes(raw)
    with pytest.raises(InputError, match=r"t\.tif is damaged or cut off"):
        found.elevation(whole_window(found, "EPSG:32637"))


def test_no_coordinate_system_is_refused_and_the_brief_is_the_way_out(tmp_path: Path) -> None:
    path = good(tmp_path, None)
    with pytest.raises(InputError, match=r't\.tif has no coordinate system.*\[terrain\] crs = "EPSG:32737"'):
        terrain(path)
    assert terrain(path, crs="EPSG:32637").stamps[0].crs == "EPSG:32637"
    with pytest.raises(InputError, match=r"\[terrain\] crs is “nonsense”"):
        terrain(path, crs="nonsense")


def test_a_system_tied_to_no_place_is_refused(tmp_path: Path) -> None:
    local = 'LOCAL_CS["site grid",UNIT["metre",1],AXIS["Easting",EAST],AXIS["Northing",NORTH]]'
    with pytest.raises(InputError, match=r"t\.tif has the coordinate system “site grid”, which is tied to no place"):
        terrain(good(tmp_path, local))


def test_a_nameless_system_that_is_fully_described_is_used(tmp_path: Path) -> None:
    """As in a widely used sample of an ocean coast, for which some programs print EPSG:32000."""
    nameless = (
        'PROJCS["UTM Zone 37, Northern Hemisphere",GEOGCS["GRS 1980(IUGG, 1980)",DATUM["unknown",'
        'SPHEROID["GRS80",6378137,298.257222101],TOWGS84[0,0,0,0,0,0,0]],PRIMEM["Greenwich",0],UNIT["degree",'
        '0.0174532925199433]],PROJECTION["Transverse_Mercator"],PARAMETER["latitude_of_origin",0],PARAMETER['
        '"central_meridian",39],PARAMETER["scale_factor",0.9996],PARAMETER["false_easting",500000],PARAMETER['
        '"false_northing",0],UNIT["metre",1]]'
    )
    (tmp_path / "named").mkdir()
    named, found = terrain(good(tmp_path / "named")), terrain(good(tmp_path, nameless))
    grid = whole_window(named, "EPSG:32637")
    expected, heights = named.elevation(grid).values, found.elevation(grid).values
    assert np.isfinite(inner(expected)).mean() > 0.8
    # GRS 1980 and WGS 84 differ by a tenth of a millimetre in their axes
    assert inner(heights) == pytest.approx(inner(expected), abs=0.01, nan_ok=True)


def test_a_file_that_names_another_system_than_the_brief_is_believed(tmp_path: Path) -> None:
    found = terrain(good(tmp_path), crs="EPSG:32737")
    assert "the file was believed" in said(found, "warning")
    assert found.stamps[0].crs == "EPSG:32637"


def test_degrees_claimed_as_metres_and_the_reverse_are_refused(tmp_path: Path) -> None:
    values = random_tile()
    degrees, metres = Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0), Affine(30.0, 0, 5e5, 0, -30.0, 9e3)
    with pytest.raises(InputError, match=r"t\.tif says it is in metres .* look like degrees"):
        terrain(write(tmp_path / "t.tif", values, degrees, "EPSG:32637"))
    with pytest.raises(InputError, match=r"t\.tif says it is in degrees .* look like metres"):
        terrain(write(tmp_path / "t.tif", values, metres, "EPSG:4326"))
    with pytest.raises(InputError, match="latitudes between"):
        terrain(write(tmp_path / "t.tif", values, Affine(SECOND, 0, 2.0, 0, -SECOND, 139.0), "EPSG:4326"))


def test_a_raster_that_does_not_say_where_it_lies_is_refused(tmp_path: Path) -> None:
    with pytest.warns(rasterio.errors.NotGeoreferencedWarning):
        path = write(tmp_path / "t.tif", random_tile(), Affine.identity(), "EPSG:4326")
    with pytest.raises(InputError, match=r"t\.tif does not say where on the Earth it lies"):
        terrain(path)


def test_a_turned_raster_is_refused(tmp_path: Path) -> None:
    turned = Affine.translation(5e5, 9e3) @ Affine.rotation(10.0) @ Affine.scale(30.0, -30.0)
    with pytest.raises(InputError, match=r"t\.tif lies turned"):
        terrain(write(tmp_path / "t.tif", random_tile(), turned, "EPSG:32637"))


def test_a_terrain_without_any_height_is_refused_and_one_empty_tile_of_two_told(tmp_path: Path) -> None:
    a = Affine(30.0, 0, 5e5, 0, -30.0, 9e3)
    empty = write(tmp_path / "empty.tif", np.full((60, 60), -9999.0, np.float32), a, "EPSG:32637")
    with pytest.raises(InputError, match=r"empty\.tif holds no height at all"):
        terrain(empty)
    assert "No height at all is in empty.tif" in said(terrain(empty, good(tmp_path)), "warning")


def test_one_height_in_a_corner_no_sample_looks_at_is_found(tmp_path: Path) -> None:
    """What looks empty in the sample is read whole before it is refused."""
    values = np.full((640, 640), -9999.0, np.float32)
    values[200, 300] = 7.0
    a = Affine(30.0, 0, 5e5, 0, -30.0, 3e4)
    found = terrain(write(tmp_path / "t.tif", values, a, "EPSG:32637", tiled=True, blockxsize=64, blockysize=64))
    assert found.mosaics[0].files[0].has_heights


# --- what it says of itself ---------------------------------------------------------------------------------------


def test_outline_and_bounds_cover_the_files(tmp_path: Path) -> None:
    a = Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0)
    found = terrain(write(tmp_path / "t.tif", np.full((60, 90), 1.0, np.float32), a))
    assert found.data_outline().bounds == pytest.approx((39.0, 2.0 - 60 * SECOND, 39.0 + 90 * SECOND, 2.0))
    west, south, east, north = found.data_bounds("EPSG:32637")
    assert (east - west, north - south) == pytest.approx((90 * 30.9, 60 * 30.7), rel=0.01)


def test_bounds_follow_the_bend_of_a_long_edge(tmp_path: Path) -> None:
    """A parallel is no straight line on the grid: over 0.5° at 10° S it bulges by 10 m, a third of a cell."""
    step = 7.5 * SECOND
    values = np.full((240, 240), 1.0, np.float32)
    found = terrain(write(tmp_path / "t.tif", values, Affine(step, 0, 38.75, 0, -step, -9.5)))
    to_utm = Transformer.from_crs("EPSG:4326", "EPSG:32637", always_xy=True)
    corners = to_utm.transform([38.75, 39.25, 38.75, 39.25], [-9.5, -9.5, -10.0, -10.0])
    dense = to_utm.transform_bounds(38.75, -10.0, 39.25, -9.5, densify_pts=501)
    assert dense[3] - max(corners[1]) > 9.0
    # points at every 64th cell, 15 km apart, leave under a metre of the bulge
    assert found.data_bounds("EPSG:32637") == pytest.approx(dense, abs=1.0)


def test_the_antimeridian_is_no_edge(tmp_path: Path) -> None:
    """Two tiles that meet at 180°, one counted from the east and one from the west, as published."""
    n = 60
    east_side = geographic(tmp_path / "e.tif", wave, "EPSG:32601", -180.0, -17.0, n=n)
    west_side = geographic(tmp_path / "w.tif", wave, "EPSG:32601", 180.0 - n * SECOND, -17.0, n=n)
    found = terrain(east_side, west_side)
    west, _, east, _ = found.data_bounds("EPSG:32601")
    assert east - west == pytest.approx(2 * n * 29.6, rel=0.05)
    grid = whole_window(found, "EPSG:32601")
    x, y = np.meshgrid(grid.x_centres_m(), grid.y_centres_m())
    off = inner(found.elevation(grid).values - wave(x, y), 4)
    assert np.isfinite(off).mean() > 0.9
    assert np.nanmax(np.abs(off)) < 0.05
    assert found.data_outline().area == pytest.approx(2 * (n * SECOND) ** 2)


def test_longitudes_counted_to_360_are_understood(tmp_path: Path) -> None:
    found = terrain(geographic(tmp_path / "t.tif", wave, "EPSG:32619", 290.0, -5.0, n=60))
    grid = whole_window(found, "EPSG:32619")
    assert np.isfinite(inner(found.elevation(grid).values)).all()
    assert found.data_outline().bounds[0] == pytest.approx(-70.0)


def test_error_and_surface_come_from_the_brief_the_product_or_are_assumed(tmp_path: Path) -> None:
    path = good(tmp_path)
    bare = {"files": [path]}

    def opened(**keys: Any) -> Terrain:
        return open_terrain(TerrainBrief.model_validate({**bare, **keys}))

    nothing = opened()
    assert (nothing.vertical_error_m, nothing.error_range_m, nothing.surface) == (4.0, 90.0, "bare")
    assert "standard deviation of 4 m is taken" in said(nothing, "assumed")
    preset = opened(product="Copernicus GLO-30")
    # LE90 2.57 m is 1.6449 standard deviations
    assert preset.vertical_error_m == pytest.approx(2.57 / 1.6449, abs=0.005)
    assert preset.surface == "canopy"
    own = opened(product="srtm_1", vertical_error_m=1.25, error_range_m=60.0, surface="bare")
    assert (own.vertical_error_m, own.error_range_m, own.surface) == (1.25, 60.0, "bare")
    assert (
        said(own, "assumed")
        == 't.tif says no unit: its heights are taken as metres (for feet set vertical_unit = "ft").'
    )
    with pytest.raises(BriefError, match="Perhaps “nasadem” was meant"):
        opened(product="nasa dem 1")


def test_what_many_files_say_alike_is_said_once(tmp_path: Path) -> None:
    a = Affine(SECOND, 0, 39.0, 0, -SECOND, 2.0)
    values = np.full((30, 30), 1.0, np.float32)
    files = [write(tmp_path / f"{k}.tif", values, a @ Affine.translation(30 * k, 0)) for k in range(4)]
    assert said(terrain(*files)).count("says no unit") == 1
    assert "The same goes for 3 more files." in said(terrain(*files))


def test_every_file_is_stamped(tmp_path: Path) -> None:
    import hashlib

    path = good(tmp_path)
    (stamp,) = terrain(path).stamps
    assert (stamp.name, stamp.size_bytes) == ("t.tif", path.stat().st_size)
    assert stamp.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()


def test_only_what_is_needed_is_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A small grid on a large file reads a small window."""
    from sitescreen.inputs.terrain_files import RasterFile

    values = np.full((1500, 1500), 3.0, np.float32)
    path = write(tmp_path / "t.tif", values, Affine(30.0, 0, 5e5, 0, -30.0, 6e4), "EPSG:32637", tiled=True)
    found = terrain(path)
    read: list[int] = []
    plain = RasterFile.read_m

    def counting(self: RasterFile, source: Any, *window: int) -> Any:
        heights = plain(self, source, *window)
        read.append(heights.size)
        return heights

    monkeypatch.setattr(RasterFile, "read_m", counting)
    found.elevation(Grid("EPSG:32637", 510_000.0, 40_020.0, 30.0, 40, 40))
    assert sum(read) < 200**2

"""Slope, aspect and gradient: closed forms, GDAL, holes, noise, both forms of the kernels."""

import subprocess
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sitescreen.grid import Field, Grid
from sitescreen.terrain import _slope_kernel as kernel
from sitescreen.terrain.slope import aspect_deg, gradient, slope_and_aspect, slope_deg

# half a step of float32, in which fields are kept, at 26° and at 323°
SLOPE_STEP_DEG = 1.0e-6
ASPECT_STEP_DEG = 1.6e-5


def field(values: object, cell_size_m: float = 30.0) -> Field:
    array = np.asarray(values, dtype=np.float32)
    return Field(array, Grid("EPSG:32637", 0.0, 0.0, cell_size_m, *array.shape), "m", "test ground")


def ground(formula: Callable[..., object], cells: int = 9, cell_size_m: float = 30.0) -> Field:
    """Ground z(x, y), x east and y north, both 0 in the middle."""
    across = (np.arange(cells) - cells // 2) * cell_size_m
    x, y = np.meshgrid(across, -across)
    return field(formula(x, y), cell_size_m)


def rough(rows: int, cols: int, seed: int = 3) -> np.ndarray:
    return np.cumsum(np.random.default_rng(seed).normal(0, 4, (rows, cols)), axis=1).astype(np.float32) + 900


@pytest.mark.parametrize(
    ("east", "north", "slope", "aspect"),
    [
        (0.1, 0.0, 5.710593, 270.0),
        (0.0, 0.1, 5.710593, 180.0),
        (0.3, -0.4, 26.565051, 323.130102),
        (-0.05, -0.05, 4.044691, 45.0),
        (-2.0, 0.0, 63.434949, 90.0),
        (0.0, -30.0, 88.090848, 0.0),
    ],
)
def test_plane_has_its_slope_and_faces_down_it(east: float, north: float, slope: float, aspect: float) -> None:
    """Closed form: atan √(p² + q²), atan2(−p, −q); steep planes take the other branches of the arc tangent."""
    got = slope_and_aspect(ground(lambda x, y: east * x + north * y))
    assert got.slope_deg.values[1:-1, 1:-1] == pytest.approx(slope, abs=4 * SLOPE_STEP_DEG)
    assert got.aspect_deg.values[1:-1, 1:-1] == pytest.approx(aspect, abs=2 * ASPECT_STEP_DEG)


def test_every_bearing_comes_back() -> None:
    """A plane that falls to any bearing, at any steepness, is read back, within the steps of float32."""
    bearing = np.arange(0.0, 360.0, 0.5)
    tangent = np.tan(np.radians(np.linspace(0.05, 89.0, bearing.size)))
    east, north = -tangent * np.sin(np.radians(bearing)), -tangent * np.cos(np.radians(bearing))
    got = np.array([kernel._aspect_deg(np.float32(e), np.float32(n)) for e, n in zip(east, north, strict=True)])
    off = (got - bearing + 180.0) % 360.0 - 180.0
    assert np.abs(off).max() < 4 * ASPECT_STEP_DEG
    slope = np.array([kernel._atan_deg(np.float32(t)) for t in tangent])
    assert slope == pytest.approx(np.degrees(np.arctan(tangent)), abs=1e-5)


def test_gradient_is_exact_on_quadratics() -> None:
    """On z = c(x² + y²): p = 2·c·x, q = 2·c·y, to float32's step."""
    got = gradient(ground(lambda x, y: 1e-4 * (x * x + y * y), cells=7, cell_size_m=32.0))
    across = np.arange(-2, 3) * 32.0
    assert got.east.values[1:-1, 1:-1] == pytest.approx(np.broadcast_to(2e-4 * across, (5, 5)), abs=1e-7)
    assert got.north.values[1:-1, 1:-1] == pytest.approx(np.broadcast_to(-2e-4 * across[:, None], (5, 5)), abs=1e-7)


def test_gradient_is_horns_and_not_the_plain_difference() -> None:
    """On c·x·y² at (0, 100 m), c = 1e-6, L = 30: Horn 0.010450 = c(y² + L²/2), central differences 0.010000."""
    x, y = np.meshgrid([-30.0, 0.0, 30.0], [130.0, 100.0, 70.0])
    assert gradient(field(1e-6 * x * y * y)).east.values[1, 1] == pytest.approx(0.010450, abs=1e-8)


def test_noise_gives_horns_share_of_it() -> None:
    """Independent errors σ = 3 m at 30 m: sd of either component (√12/8)·σ/L = 0.04330; 1 % over 3.6e5 cells."""
    got = gradient(field(np.random.default_rng(11).normal(0, 3, (602, 602))))
    assert np.nanstd(got.east.values) == pytest.approx(0.043301, rel=0.01)
    assert np.nanstd(got.north.values) == pytest.approx(0.043301, rel=0.01)


def test_level_ground_faces_nowhere() -> None:
    """Slope 0, aspect unknown: not north."""
    got = slope_and_aspect(field(np.full((4, 5), 123.4)))
    assert (got.slope_deg.values[1:-1, 1:-1] == 0).all()
    assert np.isnan(got.aspect_deg.values).all()


def test_a_hole_takes_its_neighbours_and_itself() -> None:
    """Nine cells round a hole are unknown, its own among them though Horn gives the centre no weight; no others are."""
    values = rough(8, 9)
    values[3, 4] = np.nan
    expected = np.ones((8, 9), dtype=bool)
    expected[1:-1, 1:-1] = False
    expected[2:5, 3:6] = True
    f = field(values)
    for got in (slope_deg(f), aspect_deg(f), *gradient(f)):
        assert (np.isnan(got.values) == expected).all()


def test_one_pass_equals_two() -> None:
    """Slope and aspect together or alone: the same bits."""
    f = field(rough(20, 33))
    both = slope_and_aspect(f)
    np.testing.assert_array_equal(both.slope_deg.values, slope_deg(f).values)
    np.testing.assert_array_equal(both.aspect_deg.values, aspect_deg(f).values)


@given(st.floats(-2000, 5000), st.integers(0, 3))
def test_lifting_changes_nothing_and_turning_turns(lift_m: float, quarter_turns: int) -> None:
    """Add a height: same slope, within the heights' own rounding. Turn the map: same slopes, aspects turned."""
    values = rough(7, 7).astype(np.float64)
    plain = slope_and_aspect(field(values))
    lifted = slope_deg(field(values + lift_m))
    np.testing.assert_allclose(lifted.values, plain.slope_deg.values, atol=2e-3)
    turned = slope_and_aspect(field(np.rot90(values, quarter_turns)))  # counterclockwise
    np.testing.assert_allclose(np.rot90(turned.slope_deg.values, -quarter_turns), plain.slope_deg.values, atol=1e-5)
    back = np.rot90(turned.aspect_deg.values, -quarter_turns) + 90.0 * quarter_turns
    off = (back - plain.aspect_deg.values + 180.0) % 360.0 - 180.0
    assert np.nanmax(np.abs(off)) < 1e-3


def test_kernels_agree_with_their_python_forms() -> None:
    """Compiled and interpreted, on ground with a hole: equal to a few float32 steps (fused arithmetic may differ)."""
    values = rough(9, 11)
    values[4, 5] = np.nan
    shape = values.shape
    compiled, plain = (np.full((4, *shape), np.nan, dtype=np.float32) for _ in range(2))
    with np.errstate(all="ignore"):
        for out, gradient_of, angles_of in (
            (compiled, kernel.horn_gradient, kernel.horn_slope_aspect),
            (plain, kernel.horn_gradient.py_func, kernel.horn_slope_aspect.py_func),
        ):
            gradient_of(values, 30.0, out[0], out[1], 0, shape[0])
            angles_of(values, 30.0, out[2], out[3], 0, shape[0])
    np.testing.assert_allclose(compiled, plain, rtol=1e-6, atol=1e-6)
    assert np.isfinite(compiled).sum() == 4 * (7 * 9 - 9)


@pytest.mark.parametrize("quantity", ["slope", "aspect"])
def test_agrees_with_gdal(quantity: str, tmp_path: Path, outside_program: Callable[[str], str]) -> None:
    """GDAL's own gdaldem, Horn's method by default, on rough ground, within float32's steps."""
    import rasterio

    program = outside_program("gdaldem")
    # whole eighths of a metre: then GDAL's float32 sums are exact too
    f = field(np.round(rough(60, 50) * 8) / 8)
    profile = {"driver": "GTiff", "height": 60, "width": 50, "count": 1, "dtype": "float32"}
    profile |= {"crs": f.grid.crs, "transform": f.grid.transform, "nodata": -9999.0}
    with rasterio.open(tmp_path / "ground.tif", "w", **profile) as file:
        file.write(f.values, 1)
    subprocess.run(
        [program, quantity, str(tmp_path / "ground.tif"), str(tmp_path / "out.tif"), "-q"], check=True, timeout=60
    )
    with rasterio.open(tmp_path / "out.tif") as file:
        theirs = file.read(1)
    inside = (slice(1, -1), slice(1, -1))
    if quantity == "slope":
        np.testing.assert_allclose(slope_deg(f).values[inside], theirs[inside], atol=2e-4)
    else:
        off = (aspect_deg(f).values[inside] - theirs[inside] + 180.0) % 360.0 - 180.0
        assert np.abs(off).max() < 2e-3

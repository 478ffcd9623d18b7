"""Drawn terrain errors: the generator's published vectors, the stated statistics, and the same bits in every window."""

import math

import numpy as np
import pytest
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain import _terrain_error_kernel as kernel
from sitescreen.terrain.slope import gradient
from sitescreen.terrain.terrain_error import (
    SHORT_SHARE,
    error_correlation,
    error_parts,
    gaussian_weights,
    standard_normals,
)


def window(rows: int, cols: int, row: int = 0, col: int = 0, cell_m: float = 30.0, crs: str = "EPSG:32637") -> Grid:
    return Grid(crs, (9_000 + col) * cell_m, -(300_000 + row) * cell_m, cell_m, rows, cols)


@pytest.mark.parametrize(
    ("counter", "key", "words"),
    [
        ((0, 0, 0, 0), (0, 0), (0x6627E8D5, 0xE169C58D, 0xBC57AC4C, 0x9B00DBD8)),
        (
            (0xFFFFFFFF, 0xFFFFFFFF, 0xFFFFFFFF, 0xFFFFFFFF),
            (0xFFFFFFFF, 0xFFFFFFFF),
            (0x408F276D, 0x41C83B0E, 0xA20BC7C6, 0x6D5451FD),
        ),
        (
            (0x243F6A88, 0x85A308D3, 0x13198A2E, 0x03707344),
            (0xA4093822, 0x299F31D0),
            (0xD16CFE09, 0x94FDCCEB, 0x5001E420, 0x24126EA1),
        ),
    ],
)
def test_philox_gives_the_published_words(
    counter: tuple[int, ...], key: tuple[int, ...], words: tuple[int, ...]
) -> None:
    """Known answers for philox4x32-10 of Random123 (Salmon et al. 2011, SC'11, file kat_vectors; from memory)."""
    inputs = [np.uint64(word) for word in (*counter, *key)]
    for function in (kernel.philox, kernel.philox.py_func):
        assert tuple(int(word) for word in function(*inputs)) == words


def test_every_window_sees_the_same_error_bit_for_bit() -> None:
    """On both sides of a column's pair and of a node, and far south of the equator."""
    whole = error_parts(window(60, 75), 2.5, 90.0, 20, 4)
    for row, col, rows, cols in ((0, 0, 60, 75), (7, 13, 20, 31), (35, 40, 25, 35), (11, 6, 1, 1)):
        part = error_parts(window(rows, cols, row, col), 2.5, 90.0, 20, 4)
        inside = np.s_[row : row + rows, col : col + cols]
        np.testing.assert_array_equal(part.short_m, whole.short_m[inside])
        np.testing.assert_array_equal(part.long_m, whole.long_m[inside])


def test_draws_seeds_and_zones_have_their_own_errors() -> None:
    """Another draw, another seed or another UTM zone is another, unrelated error."""
    parts = [
        error_parts(window(90, 90, crs=crs), 1.0, 90.0, seed, draw).short_m.ravel()
        for seed, draw, crs in ((1, 0, "EPSG:32637"), (1, 1, "EPSG:32637"), (2, 0, "EPSG:32637"), (1, 0, "EPSG:32636"))
    ]
    # some 90 · 90 / 9 independent places: a standard error of 0.03
    assert np.abs(np.corrcoef(parts) - np.eye(4)).max() < 0.15


@pytest.mark.parametrize("range_m", [0.0, 100.0, 500.0])
def test_error_has_the_stated_variance_and_correlation(range_m: float) -> None:
    """Variance 1, and the model's correlation at lags from one cell to 1.5 km, over nine draws of 24 km."""
    draws = [sum(error_parts(window(800, 800), 1.0, range_m, 3, draw)) for draw in range(9)]  # type: ignore[misc]
    for lag in (0, 1, 2, 4, 10, 25, 50):
        pairs = [np.mean(one[:, lag:] * one[:, : 800 - lag]) for one in draws]
        pairs += [np.mean(one[lag:] * one[: 800 - lag]) for one in draws]
        model = float(error_correlation(np.array(30.0 * lag), range_m))
        # the long part is interpolated between nodes, which makes it up to 0.03 smoother within 200 m; the rest is the
        # scatter of 18 means
        assert np.mean(pairs) == pytest.approx(model, abs=0.04)


@pytest.mark.parametrize(
    ("width_cells", "central", "horn"), [(1, 0.0562, 0.0506), (2, 0.0333, 0.0323), (4, 0.0174, None)]
)
def test_gradients_of_the_error_are_those_of_a_gaussian_filter(
    width_cells: float, central: float, horn: float | None
) -> None:
    """σ 3 m, cells of 30 m: σ·√(2(1 − ρ(2Δ)))/(2Δ) with ρ(d) = exp(−d²/(4 s²)), and Horn's window (closed forms)."""
    error_m = 3.0 / math.sqrt(SHORT_SHARE)
    grid = window(600, 600)
    short = error_parts(grid, error_m, 30.0 * width_cells * math.sqrt(12.0), 5, 0).short_m
    east = (short[:, 2:] - short[:, :-2]) / 60.0
    rho = math.exp(-1.0 / width_cells**2)
    assert central == pytest.approx(3.0 * math.sqrt(2.0 * (1.0 - rho)) / 60.0, abs=1e-4)
    assert east.std() == pytest.approx(central, rel=0.03)
    if horn is not None:
        slope = gradient(Field(short.astype(np.float32), grid, "m", "error")).east.values[1:-1, 1:-1]
        assert slope.std() == pytest.approx(horn, rel=0.03)


def test_no_error_is_exactly_none() -> None:
    """σ = 0 gives 0, not something small."""
    parts = error_parts(window(20, 20), 0.0, 90.0, 1, 1)
    assert not parts.short_m.any()
    assert not parts.long_m.any()


def test_numbers_of_a_draw_are_normal() -> None:
    """Mean 0, standard deviation 1 over 2,000 draws."""
    numbers = np.array([standard_normals(9, draw, 2) for draw in range(2000)])
    assert np.abs(numbers.mean(axis=0)).max() < 0.08
    assert numbers.std(axis=0) == pytest.approx(np.ones(2), abs=0.06)
    assert abs(np.corrcoef(numbers.T)[0, 1]) < 0.08


def test_kernels_do_as_their_plain_python() -> None:
    """Compiled and not: on a window that begins on an odd column."""
    key = np.uint64(3), np.uint64(8)
    both: list[NDArray[np.float64]] = []
    for function in (kernel.normals, kernel.normals.py_func):
        white = np.empty((9, 10))
        function(*key, 2, 0, np.int64(-4), np.int64(-7), white)
        both.append(white)
    np.testing.assert_allclose(both[0], both[1], rtol=1e-13)
    white, weights = both[0], gaussian_weights(0.5)
    square = np.arange(9.0).reshape(3, 3)
    cubic = np.random.default_rng(1).random((6, 4))
    for name, arguments, shape in (
        ("smooth_both_ways", (white, weights), (9 - len(weights) + 1, 10 - len(weights) + 1)),
        ("weigh_square", (white, square), (7, 8)),
        ("between_nodes", (white, 9, 9, 0, 0, cubic), (20, 22)),
    ):
        compiled, plain = np.empty(shape), np.empty(shape)
        getattr(kernel, name)(*arguments, compiled)
        getattr(kernel, name).py_func(*arguments, plain)
        np.testing.assert_allclose(compiled, plain, rtol=1e-12)


@pytest.mark.parametrize(("grid", "error_m", "given"), [
    (Grid("EPSG:32637", 12.0, 0.0, 30.0, 5, 5), 1.0, "from 12, 0"),
    (Grid("EPSG:32637", 0.0, 0.0, 70.0, 5, 5), 1.0, "70 m"),
    (window(5, 5), -1.0, "-1.0 m"),
])  # fmt: skip
def test_windows_off_the_lattice_and_negative_errors_are_refused(grid: Grid, error_m: float, given: str) -> None:
    """Noise by absolute cell needs absolute cells."""
    with pytest.raises(GridError, match=given):
        error_parts(grid, error_m, 90.0, 1, 1)

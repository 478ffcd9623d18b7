"""Disc means and the rise above them: closed forms, hard support, no memory of the window."""

import numpy as np
import pytest

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain import _position_kernel as kernel
from sitescreen.terrain.position import disc_half_widths, disc_mean, rise_m


def field(values: object, cell_size_m: float = 30.0) -> Field:
    array = np.asarray(values, dtype=np.float32)
    return Field(array, Grid("EPSG:32637", 0.0, 0.0, cell_size_m, *array.shape), "m", "test ground")


def by_hand(values: np.ndarray, radius_cells: float) -> np.ndarray:
    """The mean over every cell whose centre lies within the radius, cell by cell."""
    reach = int(radius_cells)
    dy, dx = np.mgrid[-reach : reach + 1, -reach : reach + 1]
    disc = dy**2 + dx**2 <= radius_cells**2 + 1e-6
    out = np.full(values.shape, np.nan)
    for row in range(reach, values.shape[0] - reach):
        for col in range(reach, values.shape[1] - reach):
            window = values[row - reach : row + reach + 1, col - reach : col + reach + 1]
            out[row, col] = window[disc].mean()
    return out


@pytest.mark.parametrize("radius_m", [30.0, 75.0, 90.0, 150.0])
def test_mean_is_that_of_the_disc(radius_m: float) -> None:
    """Against a count by hand, holes included: any unknown cell in the disc makes it unknown."""
    values = np.random.default_rng(5).normal(1200, 80, (23, 26)).astype(np.float32)
    values[9, 12] = np.nan
    got = disc_mean(field(values), radius_m).values
    np.testing.assert_allclose(got, by_hand(values.astype(np.float64), radius_m / 30.0), atol=1.3e-4)


def test_plane_rises_nowhere_and_bowl_by_its_closed_form() -> None:
    """Plane: 0. z = c·r²: −c·(mean r² of the disc), everywhere, and nearly −c·R²/2."""
    across = (np.arange(41) - 20) * 30.0
    x, y = np.meshgrid(across, -across)
    flat = rise_m(field(500 + 0.3 * x - 0.4 * y), 300.0).values
    assert np.nanmax(np.abs(flat)) < 2e-3
    assert np.isfinite(flat).sum() == 21 * 21
    bowl = rise_m(field(1e-4 * (x * x + y * y)), 300.0).values
    dy, dx = np.mgrid[-10:11, -10:11]
    inside = dy**2 + dx**2 <= 100
    expected = -1e-4 * 900.0 * (dy**2 + dx**2)[inside].mean()
    assert bowl[np.isfinite(bowl)] == pytest.approx(expected, abs=1e-3)
    assert expected == pytest.approx(-1e-4 * 300.0**2 / 2, rel=0.02)


def test_support_is_hard() -> None:
    """Known exactly where the whole kilometre is inside the data: 33 cells from every edge at 30 m."""
    got = np.isfinite(rise_m(field(np.zeros((80, 75)))).values)
    expected = np.zeros((80, 75), dtype=bool)
    expected[33:-33, 33:-33] = True
    assert (got == expected).all()
    assert np.isnan(rise_m(field(np.zeros((60, 200)))).values).all()


def test_values_do_not_depend_on_the_window() -> None:
    """A part with margin enough gives the same bits as the whole: sums are of whole numbers."""
    values = np.random.default_rng(6).normal(3000, 500, (60, 64)).astype(np.float32)
    whole = rise_m(field(values), 150.0).values
    part = rise_m(field(values[11:50, 7:61]), 150.0).values
    np.testing.assert_array_equal(part[5:-5, 5:-5], whole[16:45, 12:56])


def test_disc_has_the_cells_within_the_radius() -> None:
    """Radius of exactly 5 cells: cell (3, 4) is on the circle and belongs."""
    assert disc_half_widths(150.0, 30.0).tolist() == [0, 3, 4, 4, 4, 5, 4, 4, 4, 3, 0]


def test_kernels_agree_with_their_python_forms() -> None:
    """Compiled and interpreted give the same bits; sums are of whole numbers."""
    values = np.random.default_rng(7).normal(100, 9, (9, 10)).astype(np.float32)
    values[1, 1] = np.nan
    half_widths = disc_half_widths(60.0, 30.0)
    outs = []
    for sums_of, means_of in (
        (kernel.running_sums, kernel.disc_means),
        (kernel.running_sums.py_func, kernel.disc_means.py_func),
    ):
        sums, unknown = np.empty((9, 11), dtype=np.int64), np.empty((9, 11), dtype=np.int32)
        out = np.empty((9, 10), dtype=np.float32)
        sums_of(values, 16384.0, sums, unknown, 0, 9)
        means_of(sums, unknown, half_widths, 16384.0, out, 0, 9)
        whole = np.empty((9, 10), dtype=np.float32)
        sums_of(np.nan_to_num(values), 16384.0, sums, unknown[:0], 0, 9)
        means_of(sums, unknown[:0], half_widths, 16384.0, whole, 0, 9)
        outs.append((out, whole))
    for compiled, plain in zip(*outs, strict=True):
        np.testing.assert_array_equal(compiled, plain)
    holed, whole = outs[0]
    assert np.isfinite(holed).sum() == 5 * 6 - 1  # the disc of two cells round (2, 2) alone reaches (1, 1)
    assert np.isfinite(whole).sum() == 5 * 6


def test_refuses_a_disc_without_radius() -> None:
    """A radius of 0 is refused by its value."""
    with pytest.raises(GridError, match="0 m radius"):
        disc_mean(field(np.zeros((3, 3))), 0.0)

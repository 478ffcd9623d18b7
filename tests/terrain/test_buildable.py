"""Chance of a gentle slope: the error model's closed forms, and what it says of ground that is known."""

import math

import numpy as np
import pytest

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain import _buildable_kernel as kernel
from sitescreen.terrain.buildable import _chance_table, chance_buildable, gradient_error
from sitescreen.terrain.slope import gradient, slope_deg
from sitescreen.terrain.terrain_error import error_correlation

ERROR_M, RANGE_M = 4.4, 90.0


def field(values: object, cell_size_m: float = 30.0) -> Field:
    array = np.asarray(values, dtype=np.float32)
    return Field(array, Grid("EPSG:32637", 0.0, 0.0, cell_size_m, *array.shape), "m", "test ground")


def errors(cells: int, seed: int, range_m: float = RANGE_M) -> np.ndarray:
    """Height errors with the model's correlation, on a map that closes on itself: noise coloured by Fourier."""
    apart = np.minimum(np.arange(cells), cells - np.arange(cells)) * 30.0
    power = np.maximum(np.fft.fft2(error_correlation(np.hypot(apart[:, None], apart), range_m)).real, 0.0)
    power *= cells**2 / power.sum()
    white = np.random.default_rng(seed).standard_normal((cells, cells))
    return ERROR_M * np.fft.ifft2(np.fft.fft2(white) * np.sqrt(power)).real


def plane(pct: float, cells: int = 300, seed: int | None = 1) -> Field:
    z = np.broadcast_to(np.arange(cells) * 30.0 * pct / 100.0, (cells, cells))
    return field(z if seed is None else z + errors(cells, seed))


def test_gradient_error_of_independent_errors() -> None:
    """(√12/8)·σ/L for the short part alone; the long part adds its own little."""
    short = gradient_error(3.0, 0.0, 30.0)
    whole_long = math.sqrt(0.3) * 3.0
    distance = np.array([30.0, 60.0, 30 * math.sqrt(2), 30 * math.sqrt(5), 60 * math.sqrt(2)])
    r1, r2, rd, r5, r8 = np.exp(-3 * distance / 1500.0)
    # Σᵢ Σⱼ wᵢ wⱼ ρ(dᵢⱼ) over the two columns of weights 1, 2, 1, written out
    same = (6 + 8 * r1 + 2 * r2) / 64
    across = (6 * r2 + 8 * r5 + 2 * r8) / 64
    long_part = 2 * (same - across) * whole_long**2 / 900.0
    assert short**2 == pytest.approx(0.7 * (math.sqrt(12) / 8 * 3.0 / 30.0) ** 2 + long_part, rel=1e-9)
    assert rd < r1  # the diagonal neighbours of one column are never paired


@pytest.mark.parametrize("range_m", [60.0, 90.0, 180.0])
def test_gradient_error_is_what_simulated_errors_show(range_m: float) -> None:
    """Standard deviation of Horn's gradient over 160,000 cells of simulated error, within 3 %."""
    got = gradient(field(errors(400, 5, range_m))).east.values
    assert np.nanstd(got) == pytest.approx(gradient_error(ERROR_M, range_m, 30.0), rel=0.03)


def test_slope_error_is_largest_where_the_range_meets_the_window() -> None:
    """White noise is not the worst: ranges of about the 3 × 3 window are (Oksanen & Sarjakoski 2005)."""
    at = {r: gradient_error(3.0, r, 30.0) for r in (0.0, 60.0, 90.0, 300.0)}
    assert at[60.0] > at[0.0] > at[300.0]
    assert at[90.0] > at[0.0]


def test_table_is_the_chance_of_a_scattered_gradient() -> None:
    """Rows and columns of the table against a hundred thousand draws each."""
    table = _chance_table()
    draws = np.random.default_rng(2).standard_normal((2, 100_000))
    for row, col in ((32, 96), (64, 60), (128, 110), (200, 100)):
        limit = (1 - row / 256) / (row / 256)
        steepness = limit - (-6 + 12 * col / 192)
        share = (np.hypot(draws[0] + steepness, draws[1]) <= limit).mean()
        assert table[row, col] == pytest.approx(share, abs=0.006)  # four standard errors at most


def test_level_ground_is_buildable_whatever_the_noise_shows() -> None:
    """True slope 0, σ 4.4 m: the plain share within 15 % is well under 1, the chance is 0.99 at least."""
    f = plane(0.0)
    naive = np.nanmean((np.tan(np.radians(slope_deg(f).values)) <= 0.15)[1:-1, 1:-1])
    assert naive < 0.95
    assert np.nanmean(chance_buildable(f, 15.0, ERROR_M, RANGE_M).values) > 0.99


def test_steep_ground_is_not_and_the_limit_is_a_toss() -> None:
    """25 %: nearly 0. 15 %, the limit itself: about a half, over three simulated errors."""
    assert np.nanmean(chance_buildable(plane(25.0), 15.0, ERROR_M, RANGE_M).values) < 0.01
    at_limit = [np.nanmean(chance_buildable(plane(15.0, seed=s), 15.0, ERROR_M, RANGE_M).values) for s in (2, 3, 4)]
    assert np.mean(at_limit) == pytest.approx(0.5, abs=0.06)


def test_steeper_planes_are_less_likely() -> None:
    """Strictly falling from 5 % to 20 %."""
    chances = [np.nanmean(chance_buildable(plane(p), 15.0, ERROR_M, RANGE_M).values) for p in (5, 10, 13, 17, 20)]
    assert (np.diff(chances) < 0).all()


def test_real_relief_is_not_smoothed_away() -> None:
    """Waves of ±60 % slope, 480 m long, under the same noise: chance and truth agree in the mean within 0.03."""
    across = np.arange(300) * 30.0
    truth = np.broadcast_to(0.6 / (2 * math.pi / 480.0) * np.sin(2 * math.pi * across / 480.0), (300, 300))
    got = chance_buildable(field(truth + errors(300, 6)), 15.0, ERROR_M, RANGE_M).values
    true_share = (np.abs(gradient(field(truth)).east.values) <= 0.15)[1:-1, 1:-1].mean()
    assert np.nanmean(got) == pytest.approx(true_share, abs=0.03)


def test_without_error_it_is_the_slope_itself() -> None:
    """σ 0: 1 within the limit, 0 beyond."""
    assert np.nanmin(chance_buildable(plane(14.9, 20, None), 15.0, 0.0, RANGE_M).values) == 1.0
    assert np.nanmax(chance_buildable(plane(15.1, 20, None), 15.0, 0.0, RANGE_M).values) == 0.0


def test_unknown_where_the_slope_is() -> None:
    """A hole takes its 3 × 3 neighbours; the neighbourhood's other cells count without it."""
    values = np.random.default_rng(1).normal(0, 2, (30, 30))
    values[12, 14] = np.nan
    f = field(values)
    got = chance_buildable(f, 15.0, 2.0, RANGE_M).values
    assert (np.isnan(got) == np.isnan(slope_deg(f).values)).all()


def test_values_do_not_depend_on_the_window() -> None:
    """A part with a margin of six cells and one gives the whole's bits."""
    values = np.cumsum(np.random.default_rng(8).normal(0, 3, (60, 60)), axis=0)
    whole = chance_buildable(field(values), 15.0, 2.0, RANGE_M).values
    part = chance_buildable(field(values[9:51, 4:49]), 15.0, 2.0, RANGE_M).values
    np.testing.assert_array_equal(part[7:-7, 7:-7], whole[16:44, 11:42])


def test_chance_follows_from_the_neighbourhood_written_out() -> None:
    """Every cell of a rough little field, rim and hole included, from its window's mean and variance, cell by cell."""
    from scipy.special import chndtr

    values = np.cumsum(np.random.default_rng(4).normal(0, 4, (16, 18)), axis=1)
    values[6, 7] = np.nan
    f = field(values)
    east, north = (g.values.astype(np.float64) for g in gradient(f))
    noise = gradient_error(3.0, 60.0, 30.0) ** 2
    expected = np.full(values.shape, np.nan)
    for row, col in np.argwhere(np.isfinite(east)):
        window = np.s_[max(row - 4, 0) : row + 5, max(col - 4, 0) : col + 5]
        p, q = east[window][np.isfinite(east[window])], north[window][np.isfinite(east[window])]
        observed = (p.var() + q.var()) / 2
        keep = max(1 - noise / observed, 0.0)
        mean = np.hypot(p.mean() + keep * (east[row, col] - p.mean()), q.mean() + keep * (north[row, col] - q.mean()))
        scatter = keep * noise
        expected[row, col] = chndtr(0.15**2 / scatter, 2, mean**2 / scatter) if scatter > 0 else mean <= 0.15
    got = chance_buildable(f, 15.0, 3.0, 60.0).values
    # the table is read linearly between its 257 × 193 entries
    np.testing.assert_allclose(got, expected, atol=2e-3)
    assert 0.05 < np.nanmean(got) < 0.95


def test_kernel_agrees_with_its_python_form() -> None:
    """Compiled and interpreted, with a hole, at the rim and inside."""
    east, north = np.random.default_rng(3).normal(0, 0.1, (2, 9, 10)).astype(np.float32)
    east[4, 4] = north[4, 4] = np.nan
    outs = []
    for form in (kernel.chances, kernel.chances.py_func):
        out = np.empty((9, 10), dtype=np.float32)
        form(east, north, 2, 0.004, 0.15, _chance_table(), 6.0, out, 0, 9)
        outs.append(out)
    np.testing.assert_allclose(outs[0], outs[1], rtol=1e-5, atol=1e-7)
    assert 0.02 < np.nanmean(outs[0]) < 0.98


def test_refuses_a_limit_of_nothing() -> None:
    """All three figures are named."""
    with pytest.raises(GridError, match=r"limit 0 %, height error 2 m and error range 90 m"):
        chance_buildable(field(np.zeros((5, 5))), 0, 2, 90)

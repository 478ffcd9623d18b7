"""Invented ground whose truth is known: hills, drained valleys, narrows, pans and plains, each from a number."""

import numpy as np
from numpy.typing import NDArray

from sitescreen.grid import Field, Grid
from sitescreen.terrain.drainage import catchment_cells, drainage, filled

CELL_M = 30.0


def invented_ground(number: int, grid: Grid) -> Field:
    """The true ground of one number: the same number, the same ground.

    Notes
    -----
    Relief of a power spectrum, drained as real ground is (hollows mostly filled, valleys cut by what drains through
    them), then ridges across it with a gap, and pans. From nearly level to hills of some hundred metres.
    """
    rng = np.random.default_rng([20261201, number])
    rows, cols = grid.shape
    y, x = np.mgrid[:rows, :cols] * grid.cell_size_m
    relief_m = rng.choice([3.0, 10.0, 30.0, 70.0, 120.0])
    height = relief_m * _rough(rng, grid.shape, rng.uniform(1.4, 1.9), rng.uniform(3000.0, 8000.0))
    bearing, fall = rng.uniform(0.0, 2.0 * np.pi), rng.choice([0.0005, 0.003, 0.008, 0.02])
    height += fall * (x * np.cos(bearing) + y * np.sin(bearing)) + 1500.0
    height = _drained(height, grid, cut_m=rng.uniform(0.5, 4.0), left=rng.choice([0.0, 0.0, 0.02, 0.08]))
    middle = np.array([rows, cols]) * grid.cell_size_m / 2.0
    for _ in range(rng.integers(0, 4)):
        at = middle + rng.uniform(-2500.0, 2500.0, 2)
        height += _ridge(rng, y - at[0], x - at[1])
    for _ in range(rng.integers(0, 3)):
        at = middle + rng.uniform(-1600.0, 1600.0, 2)
        away = np.hypot(y - at[0], x - at[1]) / rng.uniform(120.0, 500.0)
        height -= rng.uniform(2.0, 15.0) * np.exp(-(away**4))
    return Field(height.astype(np.float32), grid, "m", "true height")


def _rough(rng: np.random.Generator, shape: tuple[int, int], steep: float, longest_m: float) -> NDArray[np.float64]:
    """A surface of standard deviation 1 whose spectrum falls with the wave number to the power −2·``steep``."""
    wave = np.hypot(np.fft.fftfreq(2 * shape[0], CELL_M)[:, None], np.fft.rfftfreq(2 * shape[1], CELL_M))
    strength = (wave**2 + longest_m**-2) ** (-steep / 2.0)
    noise = np.fft.rfft2(rng.standard_normal((2 * shape[0], 2 * shape[1])))
    surface = np.fft.irfft2(noise * strength)[: shape[0], : shape[1]]
    return np.asarray((surface - surface.mean()) / surface.std())


def _drained(height: NDArray[np.float64], grid: Grid, cut_m: float, left: float) -> NDArray[np.float64]:
    """Hollows filled but for a share, valleys cut in by the logarithm of what drains through them."""
    drained = drainage(Field(height.astype(np.float32), grid, "m", "height"))
    cells = catchment_cells(drained).astype(np.float64)
    cut = np.log10(np.maximum(cells, 1.0))
    cut = np.maximum(cut - 1.5, 0.0) * cut_m
    for _ in range(3):
        wide = np.pad(cut, 1, mode="edge")
        cut = np.maximum(cut, 0.8 * np.max([wide[:-2, 1:-1], wide[2:, 1:-1], wide[1:-1, :-2], wide[1:-1, 2:]], axis=0))
    lower = drained.level_m - cut
    level, _ = filled(Field(lower.astype(np.float32), grid, "m", "height"))
    return np.asarray(level - left * (level - np.minimum(lower, level)), dtype=np.float64)


def _ridge(rng: np.random.Generator, north: NDArray[np.float64], east: NDArray[np.float64]) -> NDArray[np.float64]:
    """A curved wall of hills with one gap."""
    radius = rng.uniform(900.0, 2500.0)
    away = np.hypot(north, east)
    angle = np.arctan2(north, east)
    gap_m, height_m = rng.uniform(60.0, 400.0), rng.uniform(8.0, 60.0)
    along = np.abs(np.angle(np.exp(1j * (angle - rng.uniform(-np.pi, np.pi))))) * radius
    crest = height_m * np.exp(-(((away - radius) / rng.uniform(120.0, 350.0)) ** 2))
    open_there = np.clip((along - gap_m / 2.0) / 60.0, 0.0, 1.0)
    return np.asarray(crest * open_there)

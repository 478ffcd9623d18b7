"""Speed-up of the wind over hills and its slow-down in hollows, by linear theory in the frequency domain.

One forward transform of the ground and three inverse ones give three fields from which the speed-up for every wind
direction follows by two multiplications a cell, since the direction enters the theory only through (k·s)².
"""

from typing import NamedTuple

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from sitescreen.grid import Field
from sitescreen.settings import WindSettings


class HillFields(NamedTuple):
    """ΔS(θ) = c²·east_east + 2·c·s·east_north + s²·north_north with the wind's unit vector (c east, s north)."""

    east_east: NDArray[np.float32]
    east_north: NDArray[np.float32]
    north_north: NDArray[np.float32]

    def speed_up(self, azimuth_deg: float) -> NDArray[np.float32]:
        """Uncapped ΔS at the height of the fields, for wind from (or to: it is the same) a grid azimuth. [1]"""
        east, north = np.sin(np.radians(azimuth_deg)), np.cos(np.radians(azimuth_deg))
        return np.asarray(
            np.float32(east * east) * self.east_east
            + np.float32(2.0 * east * north) * self.east_north
            + np.float32(north * north) * self.north_north,
            dtype=np.float32,
        )


def shear_height_m(half_length_m: NDArray[np.float64], roughness_m: float) -> NDArray[np.float64]:
    """Height of the shear layer over a hill, from (h_m/L)·√ln(h_m/z0) = 1. [m]

    Hunt, Leibovich & Richards 1988, Q. J. R. Meteorol. Soc. 114:1435–1470 (read in secondary sources); solved by
    fixed-point iteration, which converges since the root varies slowly.
    """
    length = np.asarray(half_length_m, dtype=np.float64)
    height = np.maximum(length / 3.0, 2.0 * roughness_m)
    for _ in range(60):
        height = length / np.sqrt(np.log(np.maximum(height / roughness_m, 1.001)))
    return np.asarray(height, dtype=np.float64)


def shear_factor(wavenumber: NDArray[np.float64], height_m: float, roughness_m: float) -> NDArray[np.float64]:
    """[ln(h_m/z0)/ln(z/z0)]² for each wavenumber, at least 1, with the half-length L = π/(2k) of its wave."""
    length = np.pi / (2.0 * np.maximum(wavenumber, 1e-9))
    above = np.log(np.maximum(shear_height_m(length, roughness_m) / roughness_m, 1.001)) / np.log(
        height_m / roughness_m
    )
    return np.asarray(np.maximum(above**2, 1.0), dtype=np.float64)


def hill_fields(elevation: Field, settings: WindSettings) -> HillFields:
    """The three fields of the linear speed-up at a block's every cell.

    Parameters
    ----------
    elevation : Field
        Ground with open water at its level. [m] Unknown ground is taken for level with the known ground's mean while
        transforming; what it does to its surroundings must be masked by the caller.
    settings : WindSettings
        Height above ground, roughness, pad, cuts.

    Returns
    -------
    HillFields
        Fractions of the undisturbed speed at that height above ground; uncapped.

    Notes
    -----
    Outer flow: potential, σ̂ = (k·s)²/|k|·ĥ·e^(−|k|z) (Jackson & Hunt 1975, Q. J. R. Meteorol. Soc. 101:929–955); shear:
    factor of :func:`shear_factor` wave by wave. Edges are mirrored and tapered over the pad, so that the periodic
    transform meets no cliff. Waves longer than the long cut are the lie of the land, not hills; waves shorter than the
    short cut are terrain noise at 90 m and are damped by a Gaussian flank.
    """
    ground, pad = _padded(elevation, settings)
    spectrum = scipy.fft.rfft2(ground, workers=-1)
    del ground
    step = elevation.grid.cell_size_m
    rows, cols = pad.shape
    k_north = (-2.0 * np.pi * scipy.fft.fftfreq(rows, step)).astype(np.float32)[:, None]  # rows run south
    k_east = (2.0 * np.pi * scipy.fft.rfftfreq(cols, step)).astype(np.float32)[None, :]
    spectrum *= _response(np.hypot(k_north, k_east), settings)
    row, col = pad.row, pad.col
    window = (slice(row, row + elevation.grid.rows), slice(col, col + elevation.grid.cols))
    fields = [
        scipy.fft.irfft2(spectrum * weight, s=pad.shape, workers=-1)[window].astype(np.float32)
        for weight in (k_east * k_east, k_east * k_north, k_north * k_north)
    ]
    return HillFields(*fields)


def _response(wavenumber: NDArray[np.float32], settings: WindSettings) -> NDArray[np.float32]:
    """What each wave of the ground is multiplied by, except (k·s)²: e^(−kz)/k, the shear factor and the two cuts."""
    # a table over log k: the factor is smooth, and a shear height for every cell would cost more than the transform
    table = np.geomspace(1e-6, 10.0, 400)
    log_k = np.log(np.maximum(wavenumber, 1e-6))
    response = np.exp(-table * settings.receptor_height_m) / table
    response *= shear_factor(table, settings.receptor_height_m, settings.roughness_m)
    if settings.long_cut_km > 0:
        response *= 1.0 - np.exp(-((table * settings.long_cut_km * 1000.0 / (2.0 * np.pi)) ** 2))
    if settings.short_cut_m > 0:
        response *= np.exp(-0.5 * (table * settings.short_cut_m / (2.0 * np.pi)) ** 2)
    out = np.exp(np.interp(log_k, np.log(table), np.log(np.maximum(response, 1e-30)))).astype(np.float32)
    out[0, 0] = 0.0
    return np.asarray(out)


class _Pad(NamedTuple):
    shape: tuple[int, int]
    row: int
    col: int


def _padded(elevation: Field, settings: WindSettings) -> tuple[NDArray[np.float32], _Pad]:
    """The ground about its mean, mirrored beyond its edges and tapered to nothing, in a size that transforms fast."""
    values = elevation.values
    known = np.isfinite(values)
    middle = np.float32(values[known].mean(dtype=np.float64)) if known.any() else np.float32(0.0)
    ground = np.where(known, values - middle, np.float32(0.0))
    pad = int(np.ceil(settings.pad_km * 1000.0 / elevation.grid.cell_size_m))
    rows, cols = elevation.grid.shape
    tall = scipy.fft.next_fast_len(rows + 2 * pad, real=True)
    wide = scipy.fft.next_fast_len(cols + 2 * pad, real=True)
    north, west = (tall - rows) // 2, (wide - cols) // 2
    sides = ((north, tall - rows - north), (west, wide - cols - west))
    padded = np.pad(ground, sides, mode="symmetric")
    padded *= _taper(rows, sides[0])[:, None]
    padded *= _taper(cols, sides[1])[None, :]
    return padded, _Pad((tall, wide), north, west)


def _taper(inner: int, sides: tuple[int, int]) -> NDArray[np.float32]:
    """1 over the ground, falling as cos² to 0 at the far end of each side's pad."""
    before = np.sin(0.5 * np.pi * (np.arange(sides[0]) + 0.5) / max(sides[0], 1)) ** 2
    after = np.cos(0.5 * np.pi * (np.arange(sides[1]) + 0.5) / max(sides[1], 1)) ** 2
    return np.concatenate([before, np.ones(inner), after]).astype(np.float32)

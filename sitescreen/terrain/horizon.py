"""The skyline: how high the surrounding ground stands, seen from every cell in a given direction.

Azimuths are grid azimuths: clockwise from grid north, the direction looked into (for wind: where it comes from).
"""

import math
from collections.abc import Callable, Iterable, Iterator, Sequence
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain._horizon_kernel import GAP, sweep_strips, transpose
from sitescreen.terrain._march_kernel import reach_tangents
from sitescreen.terrain._profile_kernel import TOP_CELLS, profiles, tops
from sitescreen.terrain.threads import in_bands

EARTH_RADIUS_M = 6_371_000.0
"""Mean radius of the Earth (IUGG). [m]"""

REFRACTION = 0.13
"""Share of the Earth's curvature that refraction takes back (Gauss's mean coefficient, common practice)."""

_NEAR_STEPS = 24
"""Ground up to this many steps ahead is read along each cell's own ray, the rest along lines."""

_CROSSING_STEPS = 4
"""Up to this many steps ahead a ray is read where it crosses the lines of cell centres between two steps, too."""

_STRIP = 143
"""Lines in a strip; with the one beyond its edge a whole number of cache lines."""


class _Lines(NamedTuple):
    """Skewed lines along one azimuth; the words are those of the kernel's drawing."""

    by_row: bool
    ascending: bool
    side_a_step: float
    whole: NDArray[np.int64]
    part: NDArray[np.float32]
    spacing_m: float
    first_step: int
    first_line: int
    lines: int


def _lines(grid: Grid, azimuth_deg: float) -> _Lines:
    """Lines along an azimuth whose place depends on the absolute lattice, not on where the grid's window begins."""
    azimuth = math.radians(azimuth_deg % 360.0)
    d_col, d_row = math.sin(azimuth), -math.cos(azimuth)
    by_row = _sweeps_rows(azimuth_deg)
    along, across = (d_row, d_col) if by_row else (d_col, d_row)
    steps, sides = (grid.rows, grid.cols) if by_row else (grid.cols, grid.rows)
    row0, col0 = round(-grid.north_m / grid.cell_size_m), round(grid.west_m / grid.cell_size_m)
    step0, side0 = (row0, col0) if by_row else (col0, row0)
    shift = (across / along) * (step0 + np.arange(steps, dtype=np.float64)) - side0
    whole, part = _whole_and_part(shift)
    # lines are numbered within the window, but stay in their places on the lattice
    whole -= GAP * (whole.min() // GAP)
    first_line = -GAP * (int(whole.max()) // GAP + 1)
    return _Lines(
        by_row=by_row,
        ascending=along < 0,
        side_a_step=across / abs(along),
        whole=whole,
        part=part,
        spacing_m=grid.cell_size_m * math.hypot(1.0, across / along),
        first_step=step0,
        first_line=first_line,
        lines=(sides - first_line) // GAP + 1,
    )


def _whole_and_part(shift: NDArray[np.floating[Any]]) -> tuple[NDArray[np.int64], NDArray[np.float32]]:
    """A shift in whole cells and the part of one that is left; parts that are rounding alone become 0."""
    whole = np.floor(shift + 1e-9)
    part = np.maximum(shift - whole, 0.0)
    part[part < 2e-9] = 0.0
    return whole.astype(np.int64), part.astype(np.float32)


def _rays(lines: _Lines, samples: int) -> tuple[int, NDArray[np.int64], NDArray[np.float32]]:
    """Samples 0 … n of any cell's ray, one a step: the way along the steps, and how far aside they lie."""
    whole, part = _whole_and_part(lines.side_a_step * np.arange(samples + 1))
    return -1 if lines.ascending else 1, whole, part


def _near_samples(lines: _Lines) -> tuple[NDArray[np.int64], NDArray[np.float32], NDArray[np.float64]]:
    """Where any cell's ray is read nearby: two cells each (step and side, twice), the second one's share, distance."""
    ahead = -1 if lines.ascending else 1
    _, whole, part = _rays(lines, _NEAR_STEPS)
    cells, share = [], []
    for n in range(1, _NEAR_STEPS + 1):
        aside = int(whole[n])
        cells.append((ahead * n, aside, ahead * n, aside + int(part[n] > 0)))
        share.append(float(part[n]))
    steps = [float(n) for n in range(1, _NEAR_STEPS + 1)]
    for side in range(1, _CROSSING_STEPS + 1):
        if abs(lines.side_a_step) * _CROSSING_STEPS < side:
            break
        crossed = side / abs(lines.side_a_step)
        before, between = _whole_and_part(np.array([crossed]))
        if between[0] > 0:
            n, aside = int(before[0]), side if lines.side_a_step > 0 else -side
            cells.append((ahead * n, aside, ahead * (n + 1), aside))
            share.append(float(between[0]))
            steps.append(crossed)
    order = np.argsort(steps, kind="stable")
    distance_m = lines.spacing_m * np.array(steps)[order]
    return np.array(cells, dtype=np.int64)[order], np.array(share, dtype=np.float32)[order], distance_m


def _bend_per_m(earth_curvature: bool) -> float:
    """Drop of the level surface below the sight line, over squared distance [1/m]."""
    return (1.0 - REFRACTION) / (2.0 * EARTH_RADIUS_M) if earth_curvature else 0.0


def transposed(values: NDArray[np.float32]) -> NDArray[np.float32]:
    """The array with rows and columns exchanged, in memory too; read-only, as a field's is.

    Kernels are compiled anew for arrays that may be written to.
    """
    out = np.empty((values.shape[1], values.shape[0]), dtype=np.float32)
    in_bands(transpose, out.shape[0], values, out)
    out.flags.writeable = False
    return out


def _sweeps_rows(azimuth_deg: float) -> bool:
    """Whether an azimuth lies within 45° of north or south: its steps are rows; else they are columns."""
    azimuth = math.radians(azimuth_deg % 360.0)
    return abs(math.cos(azimuth)) >= abs(math.sin(azimuth)) * (1.0 - 1e-12)


HorizonConsumer = Callable[[float, NDArray[np.float32]], None]
"""Takes one azimuth [°, clockwise from grid north] and the tangents of :func:`horizon_tangent` in that direction, shape
(rows, cols). The array is overwritten by the next azimuth: what is to stay must be added up or copied."""


def horizon_stream(
    elevation: Field,
    azimuths_deg: Iterable[float],
    consumers: Sequence[HorizonConsumer],
    earth_curvature: bool = True,
) -> None:
    """Hand every consumer the horizon in one direction after another; one pass serves them all, one field is held.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m]
    azimuths_deg : iterable of float
        Directions looked into, clockwise from grid north. [°]
    consumers : sequence of HorizonConsumer
        Sky view, sun hours … each adds up what it needs.
    earth_curvature : bool
        See :func:`horizon_tangent`.
    """
    for azimuth, tangent in _tangents(elevation, azimuths_deg, earth_curvature):
        for consumer in consumers:
            consumer(azimuth, tangent)


def _tangents(
    elevation: Field, azimuths_deg: Iterable[float], earth_curvature: bool
) -> Iterator[tuple[float, NDArray[np.float32]]]:
    """The tangents in one direction after another, in one array that is written anew each time."""
    grid = elevation.grid
    out = np.empty(grid.shape, dtype=np.float32)
    seen = out.view()
    seen.flags.writeable = False
    turned = None
    turned_out = turned_seen = np.empty((0, 0), dtype=np.float32)
    for azimuth in azimuths_deg:
        if _sweeps_rows(azimuth):
            _sweep(elevation.values, grid, azimuth, earth_curvature, out)
        else:
            if turned is None:
                turned, turned_out = transposed(elevation.values), np.empty(grid.shape[::-1], dtype=np.float32)
                turned_seen = turned_out.view()
                turned_seen.flags.writeable = False
            _sweep(turned, grid, azimuth, earth_curvature, turned_out)
            in_bands(transpose, grid.rows, turned_seen, out)
        yield azimuth, seen


def _sweep(
    values: NDArray[np.float32], grid: Grid, azimuth_deg: float, earth_curvature: bool, out: NDArray[np.float32]
) -> None:
    """Write the tangents of :func:`horizon_tangent` to ``out``; steps are rows of ``values`` and of ``out``."""
    lines = _lines(grid, azimuth_deg)
    in_bands(
        sweep_strips,
        -(-lines.lines // _STRIP),
        values,
        lines.ascending,
        *_near_samples(lines),
        _NEAR_STEPS,
        lines.whole,
        lines.part,
        lines.spacing_m,
        _bend_per_m(earth_curvature),
        lines.first_step,
        lines.first_line,
        _STRIP,
        out,
        bands_a_thread=16,
    )


def horizon_tangent(elevation: Field, azimuth_deg: float, earth_curvature: bool = True) -> NDArray[np.float32]:
    """Tangent of the horizon's elevation in one direction, for every cell.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m] Unknown ground is passed over: it hides nothing.
    azimuth_deg : float
        Direction looked into, clockwise from grid north. [°]
    earth_curvature : bool
        Lower far ground by d²·(1 − 0.13)/(2·6,371 km).

    Returns
    -------
    float32 array, shape (rows, cols)
        Negative where all ground in that direction lies lower. NaN where the cell is unknown or no ground is known
        in that direction.

    Notes
    -----
    Sweep of Dozier & Frew [1]_ with the hull kept on a stack, as Timonen & Westerholm [2]_. Ground is mixed onto lines
    that run exactly along the azimuth, two cells apart, and looked at from every other step; answers are mixed to the
    cells between, linearly. Lines that jump to the nearest cell instead miss oblique azimuths by most of a degree. The
    nearest 24 steps, where mixing would still cost a few tenths of a degree, are read along each cell's own ray, and
    the first four also where the ray crosses between two steps. Against exact rays: 0.05° RMS over rounded hills, 0.07°
    over rough ones of 21°, 0.13° over rough ones of 34°, in the mean of all azimuths. More ground never lowers the
    answer, but for viewers within four cells of it.

    References
    ----------
    .. [1] J. Dozier and J. Frew, "Rapid calculation of terrain parameters for radiation modeling from digital elevation
       data," IEEE Trans. Geosci. Remote Sens., vol. 28, pp. 963–969, 1990.
    .. [2] V. Timonen and J. Westerholm, "Scalable height field self-shadowing," Comput. Graph. Forum, vol. 29,
       pp. 723–731, 2010.
    """
    _, tangent = next(_tangents(elevation, [azimuth_deg], earth_curvature))
    return tangent


def horizon_sweep(
    elevation: Field, azimuths_deg: Iterable[float], earth_curvature: bool = True
) -> Iterator[tuple[float, Field]]:
    """The horizon's elevation angle in one direction after another; only one is ever held.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m]
    azimuths_deg : iterable of float
        Directions looked into, clockwise from grid north. [°]
    earth_curvature : bool
        See :func:`horizon_tangent`.

    Yields
    ------
    azimuth_deg : float
    horizon : Field, shape (rows, cols)
        Angle above the horizontal. [°] Negative where all ground in that direction lies lower; NaN as in
        :func:`horizon_tangent`.
    """
    for azimuth, tangent in _tangents(elevation, azimuths_deg, earth_curvature):
        angle = np.arctan(tangent)
        np.degrees(angle, out=angle)
        yield azimuth, Field(angle, elevation.grid, "°", f"elevation of the horizon towards {azimuth:g}°")


def upwind_tangent(elevation: Field, azimuth_deg: float, reach_m: float, receptor_height_m: float = 10.0) -> Field:
    """Tangent of the largest angle from above a cell to the ground upwind, within a distance (Sx of Winstral [1]_).

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m]
    azimuth_deg : float
        Where the wind comes from, clockwise from grid north. [°]
    reach_m : float
        How far upwind to look. [m] The ray is sampled where it crosses the rows or columns of cell centres, about once
        a cell, so the last sample may lie up to one cell short of the reach.
    receptor_height_m : float
        Height above the cell that is looked from. [m] Winstral and Marks look from the ground, 0.

    Returns
    -------
    Field, shape (rows, cols)
        Tangent. [1] Positive where upwind ground stands above the receptor (sheltered), negative where all of it lies
        lower. NaN where the ray meets unknown ground, or the end of the grid, within the reach.

    Raises
    ------
    GridError
        If the reach is under one cell.

    References
    ----------
    .. [1] A. Winstral and D. Marks, "Simulating wind fields and snow redistribution using terrain-based parameters,"
       Hydrol. Process., vol. 16, pp. 3585–3603, 2002. doi:10.1002/hyp.1238
    """
    grid = elevation.grid
    lines = _lines(grid, azimuth_deg)
    samples = math.floor(reach_m / lines.spacing_m + 1e-9)
    if samples < 1:
        raise GridError(
            f"a reach of {reach_m:g} m was asked for on cells of {grid.cell_size_m:g} m",
            "a reach of at least one step along the ray is needed",
            "Ask for a longer reach or give finer terrain",
        )
    values = np.empty(grid.shape, dtype=np.float32)
    height = np.float32(receptor_height_m)
    in_bands(
        reach_tangents,
        grid.rows,
        elevation.values,
        lines.by_row,
        *_rays(lines, samples),
        lines.spacing_m,
        height,
        values,
        bands_a_thread=4,
    )
    return Field(values, elevation.grid, "1", f"largest upwind tangent within {reach_m:g} m towards {azimuth_deg:g}°")


class HorizonProfile(NamedTuple):
    """Horizons of n points in m directions, both arrays of shape (n, m).

    ``angle_deg``: elevation of the horizon, NaN where the point is unknown or no ground is known in that direction.
    ``seen_m``: distance to which the ground is known without a gap.
    """

    angle_deg: NDArray[np.float64]
    seen_m: NDArray[np.float64]


def horizon_profile(
    elevation: Field,
    x_m: NDArray[np.float64],
    y_m: NDArray[np.float64],
    azimuths_deg: NDArray[np.float64],
    receptor_height_m: float = 0.0,
    earth_curvature: bool = True,
    reach_m: float = math.inf,
) -> HorizonProfile:
    """The skyline of single points, read along exact rays over the bilinear surface between cell centres.

    Parameters
    ----------
    elevation : Field
        Height. [m] Unknown ground is passed over, and ``seen_m`` says where it began.
    x_m, y_m : array, shape (n,)
        Points in the grid's system. [m]
    azimuths_deg : array, shape (m,)
        Directions looked into, clockwise from grid north. [°]
    receptor_height_m : float
        Height of the eye above the ground. [m]
    earth_curvature : bool
        See :func:`horizon_tangent`.
    reach_m : float
        Ground further away is not looked at. [m]

    Returns
    -------
    HorizonProfile
    """
    grid = elevation.grid
    x, y = np.atleast_1d(np.asarray(x_m, dtype=np.float64)), np.atleast_1d(np.asarray(y_m, dtype=np.float64))
    azimuths = np.radians(np.atleast_1d(np.asarray(azimuths_deg, dtype=np.float64)))
    rows = (grid.north_m - y) / grid.cell_size_m - 0.5
    cols = (x - grid.west_m) / grid.cell_size_m - 0.5
    tangent = np.empty((x.size, azimuths.size))
    seen_m = np.empty_like(tangent)
    squares = np.empty((-(-grid.rows // TOP_CELLS), -(-grid.cols // TOP_CELLS)))
    in_bands(tops, squares.shape[0], elevation.values, squares)
    in_bands(
        profiles,
        x.size,
        elevation.values,
        squares,
        grid.cell_size_m,
        rows,
        cols,
        azimuths,
        receptor_height_m,
        _bend_per_m(earth_curvature),
        reach_m,
        tangent,
        seen_m,
        bands_a_thread=4,
    )
    return HorizonProfile(np.degrees(np.arctan(tangent)), seen_m)

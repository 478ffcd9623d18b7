"""The sun over plots: what each one's skyline and seasons leave of it, month by month."""

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate._sun_month_kernel import month_sums
from sitescreen.climate.seasons import Seasons
from sitescreen.climate.sun_path import Skies, SunPath, clearance_deg, cos_incidence, sun_paths, wall_sky_view
from sitescreen.inputs.sky import ClearSky
from sitescreen.settings import SunSettings
from sitescreen.terrain.threads import in_bands

FloatArray = NDArray[np.float64]

WEST_DEG = 270.0

_CHUNK = 2000
"""Plots looked at together: some 20 MB of skylines along the sun's path."""


@dataclass(frozen=True)
class PlotSkies:
    """What the sun's readings of n plots rest on; siting takes it too.

    ``skyline_deg`` (n, 72): from true north [°]; NaN counts as level. ``skies``: the suns, and which is each plot's.
    ``seasons``. ``clear_share`` (12, 2): of mornings and afternoons; None where no table was given. ``sky_view`` (n,):
    of the plot's ground. ``normal`` (n, 3): of the plot's mean plane, east, north, up.
    """

    skyline_deg: NDArray[np.float32]
    skies: Skies
    seasons: Seasons
    clear_share: FloatArray | None
    sky_view: FloatArray
    normal: FloatArray


def plot_skies(
    skyline_deg: NDArray[np.float32],
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    elevation_m: FloatArray,
    seasons: Seasons,
    sky: ClearSky | None,
    sky_view: FloatArray,
    normal: FloatArray,
    settings: SunSettings,
    utc_offset_h: float | None,
) -> PlotSkies:
    """Bring together the sun over n plots; see :class:`PlotSkies` and :func:`sun_paths`."""
    skies = sun_paths(lon_deg, lat_deg, elevation_m, settings, utc_offset_h)
    return PlotSkies(skyline_deg, skies, seasons, None if sky is None else sky.share, sky_view, normal)


def mean_plane(east_gradient: FloatArray, north_gradient: FloatArray, convergence_deg: FloatArray) -> FloatArray:
    """Upward unit normal of the plane with a plot's mean gradient, east, north and up by true north; shape (n, 3).

    Parameters
    ----------
    east_gradient, north_gradient : float64 arrays, shape (n,)
        Rise over run along the grid. [1]
    convergence_deg : float64 array, shape (n,)
        Bearing of grid north from true north. [°]
    """
    turn = np.radians(convergence_deg)
    east = east_gradient * np.cos(turn) + north_gradient * np.sin(turn)
    north = north_gradient * np.cos(turn) - east_gradient * np.sin(turn)
    long = np.sqrt(1.0 + east**2 + north**2)
    return np.column_stack([-east / long, -north / long, 1.0 / long])


def clear_of(path: SunPath, clear_share: FloatArray | None) -> FloatArray:
    """Share of the time without cloud before the sun, at each step; shape (12, steps). 1 without a table."""
    shares = np.ones((12, 2)) if clear_share is None else clear_share
    morning = morning_share(path)
    return np.asarray(morning * shares[:, :1] + (1.0 - morning) * shares[:, 1:])


def morning_share(path: SunPath) -> FloatArray:
    """Part of each step in which the sun stands in the eastern half of the sky, before its highest; (12, steps)."""
    east = np.cos(np.radians(path.elevation_deg)) * np.sin(np.radians(path.azimuth_deg))
    # about noon the sun goes west evenly; the step in which it passes is parted there
    pace = np.maximum(np.abs(np.gradient(east, axis=1)), 1e-12)
    return np.asarray(np.clip(0.5 + east / pace, 0.0, 1.0))


class MonthlySun(NamedTuple):
    """The sun of n plots on the mean day of each month; float64 arrays of shape (n, 12), NaN where unknown.

    ``hours``: of sun [h a day]. ``morning_hours``: those before the sun stands highest [h a day].
    ``open_morning_hours``: the same on open level ground [h a day]. ``west_wall_kwh_m2``:
    light on a west wall, afternoons [kWh/m² a day]. ``ground_kwh_m2``: on the plot's ground [kWh/m² a day].
    ``first_h``, ``last_h``: clock hours of the first and the last sun, clouds left aside [h]; NaN where none.
    """

    hours: FloatArray
    morning_hours: FloatArray
    open_morning_hours: FloatArray
    west_wall_kwh_m2: FloatArray
    ground_kwh_m2: FloatArray
    first_h: FloatArray
    last_h: FloatArray


def monthly_sun(suns: PlotSkies, settings: SunSettings) -> MonthlySun:
    """The sun that reaches each plot, month by month.

    Parameters
    ----------
    suns : PlotSkies
    settings : SunSettings

    Notes
    -----
    Each step counts by the part of it in which the sun stands above the skyline, its clearance taken linear from step
    to step. Light as in :func:`sitescreen.climate.sun_path.on_plane`. A west wall stands free on the plot: no house and
    no tree is known.
    """
    count = len(suns.skyline_deg)
    out = MonthlySun(*(np.full((count, 12), np.nan) for _ in MonthlySun._fields))
    for number, path in enumerate(suns.skies.paths):
        rows = np.flatnonzero(suns.skies.which == number)
        for at in range(0, len(rows), _CHUNK):
            _add_month_sums(out, rows[at : at + _CHUNK], path, suns, settings.ground_albedo)
    return out


def _add_month_sums(out: MonthlySun, rows: NDArray[np.int64], path: SunPath, suns: PlotSkies, albedo: float) -> None:
    """Fill the rows of plots that share a sun."""
    clear = clear_of(path, suns.clear_share)
    morning = morning_share(path)
    height, azimuth = np.radians(path.elevation_deg), np.radians(path.azimuth_deg)
    beam = path.beam_w_m2 * clear * path.step_h / 1000.0
    level = beam * np.sin(height)
    weights = np.stack(
        [
            path.step_h * clear,
            path.step_h * morning * (1.0 if suns.clear_share is None else suns.clear_share[:, :1]),
            beam * cos_incidence(path, 90.0, WEST_DEG),
            level,
            level * (1.0 - morning),
        ],
        axis=-1,
    )
    towards = np.stack([np.cos(height) * np.sin(azimuth), np.cos(height) * np.cos(azimuth), np.sin(height)], axis=-1)
    skyline = suns.skyline_deg[rows]
    count = len(rows)
    # a plot more, on open level ground
    lines, normals = np.vstack([skyline, np.zeros_like(skyline[:1])]), np.vstack([suns.normal[rows], [[0.0, 0.0, 1.0]]])
    sums = np.empty((count + 1, 12, 6))
    edges = np.empty((count + 1, 12, 2))
    in_bands(
        month_sums,
        count + 1,
        clearance_deg(path, lines),
        weights,
        towards,
        beam,
        normals,
        path.hour,
        path.step_h,
        sums,
        edges,
    )
    hours, morning_hours, west_beam, level_day, level_afternoon, ground_beam = np.moveaxis(sums[:count], -1, 0)
    diffuse = path.diffuse_w_m2 * path.step_h / 1000.0
    diffuse_day, diffuse_afternoon = diffuse.sum(axis=1), (diffuse * (1.0 - morning)).sum(axis=1)
    wall = wall_sky_view(skyline, WEST_DEG)[:, None]
    view = suns.sky_view[rows][:, None]
    out.hours[rows] = hours
    out.morning_hours[rows] = morning_hours
    out.open_morning_hours[rows] = sums[count, :, 1]
    out.west_wall_kwh_m2[rows] = (
        west_beam + diffuse_afternoon * wall + albedo * (1.0 - wall) * (level_afternoon + diffuse_afternoon)
    )
    out.ground_kwh_m2[rows] = ground_beam + diffuse_day * view + albedo * (1.0 - view) * (level_day + diffuse_day)
    out.first_h[rows], out.last_h[rows] = edges[:count, :, 0], edges[:count, :, 1]

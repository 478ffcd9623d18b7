"""Seconds for the field of yearly sun hours on a 1° tile, and for the exact sun of many plots.

Run: python benchmarks/sun.py [SIDE_CELLS] [PLOTS]
"""

import sys
import time

import numpy as np
from pyproj import Transformer
from scipy import ndimage

from sitescreen.climate.plot_sun import PlotSkies, monthly_sun
from sitescreen.climate.seasons import seasons_without_normals
from sitescreen.climate.sun_field import SunField
from sitescreen.climate.sun_path import sun_paths
from sitescreen.grid import Field, Grid
from sitescreen.lattice import block_of
from sitescreen.settings import load_defaults
from sitescreen.terrain.horizon import horizon_stream
from sitescreen.terrain.plot_skyline import plot_skylines

SIDE = int(sys.argv[1]) if len(sys.argv) > 1 else 3711  # 1° at 30 m
PLOTS = int(sys.argv[2]) if len(sys.argv) > 2 else 2000


def hills(side: int) -> np.ndarray:
    rng = np.random.default_rng(7)
    coarse = ndimage.zoom(rng.standard_normal((side // 60 + 2, side // 60 + 2)), 60, order=3)[:side, :side]
    return (1200.0 + 250.0 * coarse + rng.standard_normal((side, side))).astype(np.float32)


def least(repeats: int, work):
    found = []
    for _ in range(repeats):
        begin = time.perf_counter()
        work()
        found.append(time.perf_counter() - begin)
    return min(found)


def main() -> None:
    settings = load_defaults()
    block = block_of(37.0, 0.5, 30.0)
    west, south, _, _ = block.core_bounds
    grid = Grid(block.crs, west + 3000.0, south + 3000.0 + SIDE * 30.0, 30.0, SIDE, SIDE)
    ground = Field(hills(SIDE), grid, "m", "")
    every = np.arange(36) * 10.0
    sun = SunField(block, grid, every, settings.sun)
    tangent = np.full(grid.shape, 0.05, dtype=np.float32)
    sun(90.0, tangent)
    each = least(5, lambda: sun(90.0, tangent))
    print(f"{SIDE}² cells; riding on the sky view's sweep: {each * 36:.2f} s for 36 directions")
    print(f"tables: {least(2, lambda: SunField(block, grid, every, settings.sun)):.2f} s")
    begin, spent = time.perf_counter(), time.process_time()
    sun = SunField(block, grid, every, settings.sun)
    horizon_stream(ground, every, [sun])
    small = sun.hours(ground)
    wall, spent = time.perf_counter() - begin, time.process_time() - spent
    print(f"with a sweep of its own: {wall:.1f} s, {spent:.1f} s of processor time")
    rng = np.random.default_rng(1)
    x, y = rng.uniform(0.1, 0.9, (2, PLOTS)) * SIDE * 30.0
    lon, lat = Transformer.from_crs(block.crs, "EPSG:4326", always_xy=True).transform(grid.west_m + x, grid.north_m - y)
    height = np.full(PLOTS, 1200.0)
    begin, spent = time.perf_counter(), time.process_time()
    skylines = plot_skylines(ground, lon, lat, 2.0, settings.sun.skyline_reach_m).height_deg
    wall, spent = time.perf_counter() - begin, time.process_time() - spent
    print(f"{PLOTS} skylines of 72 directions: {wall:.2f} s, {spent:.2f} s of processor time")
    for label in ("first", "again"):
        begin, spent = time.perf_counter(), time.process_time()
        suns = PlotSkies(
            skylines,
            sun_paths(lon, lat, height, settings.sun),
            seasons_without_normals(lat),
            None,
            np.ones(PLOTS),
            np.tile([0.0, 0.0, 1.0], (PLOTS, 1)),
        )
        exact = monthly_sun(suns, settings.sun)
        wall, spent = time.perf_counter() - begin, time.process_time() - spent
        print(f"their sun, {label}: {wall:.2f} s, {spent:.2f} s of processor time, {len(suns.skies.paths)} places")
    year = (exact.hours * np.array([31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])).sum(axis=1)
    field = small.values[(y / 30.0).astype(int), (x / 30.0).astype(int)]
    off = field / year - 1.0
    print(f"field against exact plots: mean {100 * off.mean():+.2f} %, RMS {100 * np.sqrt((off**2).mean()):.2f} %")


if __name__ == "__main__":
    main()

"""Times the terrain stage against the libraries that one would otherwise script, on one array, in one run.

    python benchmarks/terrain.py                 the table at 3601² cells (a 1° tile at 1″): about three minutes
    python benchmarks/terrain.py --cells 1024    smaller
    python benchmarks/terrain.py --growth        own figures at 1024², 2048² and 3601²: cost a cell should be flat
    python benchmarks/terrain.py --start         seconds from start to result, without and with compiled kernels

Other libraries are timed where they are installed (gdal-bin, scikit-image, scipy, exactextract; pip install pyflwdir).
Each time is the best of a few, warm. Nothing here is a test: machines differ.
"""

import argparse
import os
import resource
import shutil
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np

from sitescreen.grid import Field, Grid

CELL_M = 30.0
PLOTS = 1000


def ground(cells: int, seed: int = 5) -> Field:
    """Invented relief: power falls with the fourth power of wave number, mean slope 10°, 0.5 m of noise in every cell.

    Two fifths of it lie under water once filled, several times more than on real ground: hard on every flood.
    """
    random = np.random.default_rng(seed)
    wave = np.hypot(np.fft.fftfreq(cells)[:, None], np.fft.rfftfreq(cells)[None])
    wave[0, 0] = 1.0
    spectrum = np.fft.rfft2(random.standard_normal((cells, cells))) * wave**-2.0
    spectrum[0, 0] = 0.0
    z = np.fft.irfft2(spectrum, (cells, cells))
    z *= np.tan(np.radians(10.0)) / np.hypot(*np.gradient(z, CELL_M)).mean()
    z += 0.5 * random.standard_normal((cells, cells)) + 800.0
    return Field(z.astype(np.float32), Grid("EPSG:32637", 300_000.0, 0.0, CELL_M, cells, cells), "m", "invented relief")


class Taken(NamedTuple):
    """Wall-clock seconds, and processor seconds of all threads, which other programs on the machine hardly change."""

    wall_s: float
    cpu_s: float


def best(work: Callable[[], Any], times: int = 3, warm_up: bool = True) -> Taken:
    """Shortest of a few calls, after one that does not count."""
    if warm_up:
        work()
    taken = []
    for _ in range(times):
        begun, used = time.perf_counter(), time.process_time()
        work()
        taken.append((time.perf_counter() - begun, time.process_time() - used))
    return Taken(*(min(t) for t in zip(*taken, strict=True)))


def best_s(work: Callable[[], Any], times: int = 3) -> float:
    """Shortest wall-clock time of a few calls, after one that does not count. [s]"""
    return best(work, times).wall_s


def once_s(work: Callable[[], Any]) -> float:
    """Wall-clock time of one call, for what is slow. [s]"""
    return best(work, 1, warm_up=False).wall_s


def mean(taken: list[Taken]) -> Taken:
    """The mean of several."""
    return Taken(*(float(np.mean(t)) for t in zip(*taken, strict=True)))


def own_figures(f: Field) -> dict[str, Taken]:
    """Time of each quantity of ours."""
    from sitescreen.terrain.buildable import chance_buildable
    from sitescreen.terrain.drainage import catchment_cells, filled, ways_down
    from sitescreen.terrain.hollows import hollows
    from sitescreen.terrain.horizon import horizon_tangent, upwind_tangent
    from sitescreen.terrain.position import rise_m
    from sitescreen.terrain.sky_view import sky_view
    from sitescreen.terrain.slope import slope_and_aspect

    small = Field(f.values[:200, :200], Grid(f.grid.crs, 300_000.0, 0.0, CELL_M, 200, 200), "m", "to warm up")
    sky_view(small, 8)
    azimuths = (0.0, 22.5, 45.0, 67.5, 90.0, 250.0)
    horizons = [best(lambda a=a: horizon_tangent(f, a), 2) for a in azimuths]
    upwinds = [best(lambda a=a: upwind_tangent(f, a, 3000.0), 2) for a in azimuths]
    full = filled(f)
    return {
        "slope and aspect": best(lambda: slope_and_aspect(f), 5),
        "filled surface": best(lambda: filled(f)),
        "flow direction and accumulation": best(lambda: catchment_cells(ways_down(*full))),
        "hollows: sills, pools, catchments": best(lambda: hollows(f), 2),
        "horizon, one azimuth": mean(horizons),
        "sky view, 36 azimuths": best(lambda: sky_view(f, 36), 1, warm_up=False),
        "upwind angle to 3 km, one azimuth": mean(upwinds),
        "rise over 1 km": best(lambda: rise_m(f)),
        "chance of slope ≤ 15 %": best(lambda: chance_buildable(f, 15.0, 2.5, 90.0), 2),
    }


LIMITS_S = {
    "slope and aspect": 0.02,
    "filled surface": 0.25,
    "flow direction and accumulation": 0.4,
    "hollows: sills, pools, catchments": 2.0,
    "horizon, one azimuth": 6.5e-9 * 3601**2,
    "sky view, 36 azimuths": 3.5,
    "upwind angle to 3 km, one azimuth": 0.1,
    "coverage of 1,000 plots": 0.3,
    "whole stage, from the file": 8.0,
}
"""What was aimed at for 3601² cells on two processors. [s]"""


# other ways


def naive_march_s(f: Field, reach_m: float) -> float:
    """Seconds of one azimuth of the plain compiled, threaded loop: walk every cell's ray, nearest cell by cell."""
    import math

    from numba import njit, prange

    @njit(parallel=True)  # type: ignore[untyped-decorator, unused-ignore]
    def march(z: Any, d_row: float, d_col: float, steps: int, cell_m: float, out: Any) -> None:
        rows, cols = z.shape
        for row in prange(rows):
            for col in range(cols):
                best = -np.inf
                for k in range(1, steps + 1):
                    r, c = int(row + k * d_row + 0.5), int(col + k * d_col + 0.5)
                    if r < 0 or c < 0 or r >= rows or c >= cols:
                        break
                    best = max(best, (z[r, c] - z[row, col]) / (k * cell_m))
                out[row, col] = best

    out = np.empty(f.grid.shape, dtype=np.float32)
    azimuth = math.radians(67.5)
    work = (f.values, -math.cos(azimuth), math.sin(azimuth), int(reach_m / CELL_M), CELL_M, out)
    return best_s(lambda: march(*work), 1)


def gdal_s(f: Field, folder: Path) -> dict[str, float]:
    """Seconds of GDAL's programs, reading and writing files included."""
    import rasterio

    profile = {"driver": "GTiff", "height": f.grid.rows, "width": f.grid.cols, "count": 1, "dtype": "float32"}
    profile |= {"crs": f.grid.crs, "transform": f.grid.transform}
    tile, mask, out = folder / "tile.tif", folder / "mask.tif", folder / "out.tif"
    with rasterio.open(tile, "w", **profile) as file:
        file.write(f.values, 1)
    with rasterio.open(mask, "w", **(profile | {"dtype": "uint8"})) as file:
        file.write((f.values < np.quantile(f.values, 0.2)).astype(np.uint8), 1)

    def run(*call: str) -> None:
        subprocess.run([*call, "-q"], check=True, capture_output=True)

    seconds = {}
    if shutil.which("gdaldem"):
        slope = best_s(lambda: run("gdaldem", "slope", str(tile), str(out)), 2)
        seconds["GDAL slope + aspect (gdaldem, with files)"] = slope + best_s(
            lambda: run("gdaldem", "aspect", str(tile), str(out)), 2
        )
    if shutil.which("gdal_proximity.py"):
        seconds["GDAL proximity (with files)"] = once_s(lambda: run("gdal_proximity.py", str(mask), str(out)))
    return seconds


def flood_s(f: Field) -> dict[str, float]:
    """Seconds of other floods; scikit-image's result must be ours, cell for cell."""
    from sitescreen.terrain.drainage import filled

    seconds = {}
    try:
        from skimage.morphology import reconstruction

        seeds = np.full_like(f.values, f.values.max())
        seeds[[0, -1], :], seeds[:, [0, -1]] = f.values[[0, -1], :], f.values[:, [0, -1]]
        theirs: list[Any] = []
        seconds["scikit-image reconstruction"] = once_s(
            lambda: theirs.append(reconstruction(seeds, f.values, method="erosion", footprint=np.ones((3, 3))))
        )
        same = int((theirs[0] == filled(f)[0]).sum())
        print(f"filled surface: {same:,} of {f.values.size:,} cells equal scikit-image's", file=sys.stderr)
    except ImportError:
        pass
    try:
        import pyflwdir

        values = np.array(f.values)
        seconds["pyflwdir fill and directions"] = best_s(lambda: pyflwdir.fill_depressions(values), 1)
        ways = pyflwdir.fill_depressions(values)[1]
        seconds["pyflwdir accumulation"] = best_s(lambda: pyflwdir.from_array(ways, ftype="d8").upstream_area(), 1)
    except ImportError:
        pass
    return seconds


def coverage_figures(f: Field) -> tuple[dict[str, Taken], dict[str, float]]:
    """The plots' cells found once and five layers read over them: ours, and exactextract layer by layer."""
    try:
        import geopandas as gpd
        from exactextract import exact_extract
        from exactextract.raster import NumPyRasterSource
        from shapely import Point

        from sitescreen.judgement.coverage import cover
    except ImportError:
        return {}, {}
    random = np.random.default_rng(1)
    west, south, east, north = f.grid.bounds
    x, y = random.uniform(west + 500, east - 500, PLOTS), random.uniform(south + 500, north - 500, PLOTS)
    shapes = [Point(*p).buffer(r) for *p, r in zip(x, y, random.uniform(50, 200, PLOTS), strict=True)]
    plots = gpd.GeoDataFrame(geometry=shapes, crs=f.grid.crs)
    source = NumPyRasterSource(f.values, xmin=west, ymin=south, xmax=east, ymax=north, srs_wkt=plots.crs.to_wkt())

    def ours() -> None:
        covered = cover(plots.geometry, f.grid)
        for _ in range(5):
            covered.mean(f.values, 0.9)

    theirs = once_s(lambda: [exact_extract(source, plots, ["mean"]) for _ in range(5)])
    return {"coverage of 1,000 plots": best(ours, 2)}, {"exactextract mean, five layers": theirs}


def others_s(f: Field) -> dict[str, float]:
    """Seconds of everything that is not ours."""
    from scipy import ndimage

    seconds = {"plain copy of the array": best_s(f.values.copy, 5)}
    with tempfile.TemporaryDirectory() as folder:
        seconds |= gdal_s(f, Path(folder))
    seconds |= flood_s(f)
    low = f.values > np.quantile(f.values, 0.2)
    seconds["scipy exact distance transform"] = once_s(lambda: ndimage.distance_transform_edt(low))
    seconds["scipy box mean, 67 cells wide"] = best_s(lambda: ndimage.uniform_filter(f.values, 67), 1)
    seconds["naive march to 10 km, one azimuth"] = naive_march_s(f, 10_000.0)
    seconds["naive march to 3 km, one azimuth"] = naive_march_s(f, 3_000.0)
    return seconds


# the whole stage, and starting


def every_quantity(f: Field, sky_azimuths: int = 36, reach_m: float = 3000.0) -> None:
    """What a run asks of the terrain, water and all 16 sectors of the wind included, with the shipped settings."""
    from sitescreen.settings import load_defaults
    from sitescreen.terrain.ground import read_ground
    from sitescreen.terrain.horizon import upwind_tangent

    settings = load_defaults().terrain.model_copy(update={"sky_azimuths": sky_azimuths})
    ground_of_block = read_ground(f, f, np.zeros(f.grid.shape, dtype=np.uint8), 2.5, 90.0, settings)
    for sector in range(16):
        upwind_tangent(ground_of_block.elevation, 22.5 * sector, reach_m)


def stage(tile: str) -> None:
    """Read a tile and derive everything; print seconds and the highest memory. Runs in a process of its own."""
    import rasterio

    begun, used = time.perf_counter(), time.process_time()
    with rasterio.open(tile) as file:
        values = file.read(1)
        grid = Grid(file.crs.to_string(), file.transform.c, file.transform.f, CELL_M, *values.shape)
    every_quantity(Field(values, grid, "m", "tile"))
    seconds = time.perf_counter() - begun
    print(seconds, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6, time.process_time() - used)


def stage_figures(f: Field) -> tuple[float, float, float]:
    """Seconds, gigabytes and processor seconds of the whole terrain stage, kernels cached, in a fresh process."""
    import rasterio

    with tempfile.TemporaryDirectory() as folder:
        tile = str(Path(folder) / "tile.tif")
        profile = {"driver": "GTiff", "height": f.grid.rows, "width": f.grid.cols, "count": 1, "dtype": "float32"}
        profile |= {"crs": f.grid.crs, "transform": f.grid.transform, "compress": "deflate", "predictor": 3}
        with rasterio.open(tile, "w", **profile) as file:
            file.write(f.values, 1)
        call = [sys.executable, __file__, "--stage", tile]
        found = [subprocess.run(call, check=True, capture_output=True, text=True).stdout.split() for _ in range(2)]
    seconds, gigabytes, cpu_s = (float(figure) for figure in found[-1])
    return seconds, gigabytes, cpu_s


def first_use() -> None:
    """Import and call every terrain quantity of the main job once on little ground; print the seconds."""
    f = ground(80)
    begun = time.perf_counter()
    every_quantity(f, 8, 300.0)
    print(time.perf_counter() - begun, time.process_time())


def start_figures() -> None:
    """Print seconds of the first run after installation, and of the second."""
    with tempfile.TemporaryDirectory() as folder:
        environment = os.environ | {"NUMBA_CACHE_DIR": folder}
        for name in ("first run, compiling", "second run, from the cache"):
            call = [sys.executable, __file__, "--first-use"]
            out = subprocess.run(call, check=True, capture_output=True, text=True, env=environment).stdout
            seconds, cpu_s = (float(figure) for figure in out.split())
            print(
                f"{name}: {seconds:.2f} s; processor {cpu_s:.2f} s, with starting Python; load {os.getloadavg()[0]:.1f}"
            )


# the tables

BESIDE = {
    "slope and aspect": ["plain copy of the array", "GDAL slope + aspect (gdaldem, with files)"],
    "filled surface": ["scikit-image reconstruction", "pyflwdir fill and directions"],
    "flow direction and accumulation": ["pyflwdir accumulation"],
    "horizon, one azimuth": ["naive march to 10 km, one azimuth"],
    "upwind angle to 3 km, one azimuth": ["naive march to 3 km, one azimuth"],
    "rise over 1 km": [
        "scipy box mean, 67 cells wide",
        "scipy exact distance transform",
        "GDAL proximity (with files)",
    ],
    "coverage of 1,000 plots": ["exactextract mean, five layers"],
}


def table(cells: int) -> None:
    f = ground(cells)
    print(f"{cells}² cells, {os.cpu_count()} processors, load {os.getloadavg()[0]:.1f} before; best of a few, warm\n")
    ours = own_figures(f)
    theirs = others_s(f)
    covered, layer_by_layer = coverage_figures(f)
    ours |= covered
    theirs |= layer_by_layer
    seconds, gigabytes, cpu_s = stage_figures(f)
    ours["whole stage, from the file"] = Taken(seconds, cpu_s)
    scale = (cells / 3601) ** 2
    copy_s = theirs["plain copy of the array"]
    print(f"{'ours':36}{'wall s':>9}{'cpu s':>9}{'ns/cell':>9}{'limit s':>9}{'copies':>9}   the same array with")
    for name, taken in ours.items():
        limit = f"{LIMITS_S[name] * scale:9.3f}" if name in LIMITS_S else " " * 9
        line = f"{name:36}{taken.wall_s:9.3f}{taken.cpu_s:9.3f}{taken.wall_s / cells**2 * 1e9:9.2f}{limit}"
        line += f"{taken.wall_s / copy_s:9.1f}   "
        others = [(other, theirs[other]) for other in BESIDE.get(name, []) if other in theirs]
        print(line + "; ".join(f"{other} {s:.3f} s = {s / taken.wall_s:.1f} ×" for other, s in others))
    print(f"\nhighest memory of the whole stage: {gigabytes:.2f} GB; load {os.getloadavg()[0]:.1f} after")


def growth() -> None:
    sizes = (1024, 2048, 3601)
    figures = [own_figures(ground(cells)) for cells in sizes]
    print(f"load {os.getloadavg()[0]:.1f}; wall ns a cell, then cpu ns a cell")
    print(" " * 36 + 2 * "".join(f"{cells}²".rjust(9) for cells in sizes))
    for name in figures[0]:
        taken = [f[name] for f in figures]
        wall = "".join(f"{t.wall_s / c**2 * 1e9:9.2f}" for t, c in zip(taken, sizes, strict=True))
        cpu = "".join(f"{t.cpu_s / c**2 * 1e9:9.2f}" for t, c in zip(taken, sizes, strict=True))
        print(f"{name:36}{wall}{cpu}")


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--cells", type=int, default=3601)
    parser.add_argument("--growth", action="store_true")
    parser.add_argument("--start", action="store_true")
    parser.add_argument("--stage", help=argparse.SUPPRESS)
    parser.add_argument("--first-use", action="store_true", help=argparse.SUPPRESS)
    arguments = parser.parse_args()
    if arguments.stage:
        stage(arguments.stage)
    elif arguments.first_use:
        first_use()
    elif arguments.start:
        start_figures()
    elif arguments.growth:
        growth()
    else:
        table(arguments.cells)


if __name__ == "__main__":
    main()

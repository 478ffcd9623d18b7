"""Times and errors of the wind: hill fields of a 1° tile, edges, sectors, convergence. Nothing here is a test.

    python benchmarks/wind.py                seconds and memory of the three hill fields, 3,601² cells of 30 m
    python benchmarks/wind.py --edge         error of the speed-up by distance from the tile's edge
    python benchmarks/wind.py --sectors      8 sectors against 16, on the demo region
    python benchmarks/wind.py --convergence  one azimuth a block against each cell's own, on the demo region

Times are the least of a few, warm: other programs on the machine only ever add.
"""

import argparse
import resource
import time
from pathlib import Path

import numpy as np
from scipy.ndimage import gaussian_filter

from sitescreen.climate.hill_speed_up import hill_fields
from sitescreen.climate.sector_winds import SectorWinds, sector_winds
from sitescreen.grid import Field, Grid
from sitescreen.inputs.wind import Rose, read_wind
from sitescreen.judgement.wind_readings import wind_readings
from sitescreen.settings import WindSettings, load_defaults
from sitescreen.terrain.position import rise_m
from sitescreen.terrain.threads import thread_count

DEMO = Path(__file__).resolve().parent.parent / "demo_region"
WIND = load_defaults().wind


def relief(cells: int, step_m: float = 30.0, seed: int = 2) -> Field:
    """Hills of 0.4, 1 and 4 km."""
    random = np.random.default_rng(seed)
    height = np.zeros((cells, cells), dtype=np.float32)
    for width, size_m in ((4, 12.0), (12, 40.0), (40, 130.0)):
        noise = random.standard_normal((cells, cells), dtype=np.float32)
        waves = gaussian_filter(noise, width, mode="wrap")
        height += np.float32(size_m / waves.std()) * waves
    return Field(height, Grid("EPSG:32641", 0.0, cells * step_m, step_m, cells, cells), "m", "relief")


def timed(cells: int, times: int) -> None:
    """Seconds and memory."""
    ground = relief(cells)
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
    taken = []
    for _ in range(times):
        begun, busy = time.perf_counter(), time.process_time()
        hill_fields(ground, WIND)
        taken.append((time.perf_counter() - begun, time.process_time() - busy))
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
    print(f"{cells}² cells, {thread_count()} processors, least of {times}:")
    print(
        f"{min(wall for wall, _ in taken):.2f} s on the clock, {min(cpu for _, cpu in taken):.2f} s of processor time"
    )
    print(f"{peak:.0f} MB at most, of which {before:.0f} MB before the fields were begun")


def edge() -> None:
    """A window of 14.4 km cut out of ground of 33.6 km, against the whole."""
    cells, cut = 1120, 320
    whole_ground = relief(cells)
    inner = Grid("EPSG:32641", cut * 30.0, (cells - cut) * 30.0, 30.0, cells - 2 * cut, cells - 2 * cut)
    part_ground = Field(whole_ground.values[cut:-cut, cut:-cut], inner, "m", "part")
    whole, part = hill_fields(whole_ground, WIND), hill_fields(part_ground, WIND)
    from_edge = np.minimum(np.arange(inner.cols), np.arange(inner.cols)[::-1])
    away = np.minimum(from_edge[:, None], from_edge[None, :]) * 30.0
    truth = [whole.speed_up(azimuth)[cut:-cut, cut:-cut] for azimuth in np.arange(8) * 22.5]
    error = [one - part.speed_up(azimuth) for one, azimuth in zip(truth, np.arange(8) * 22.5, strict=True)]
    print(f"speed-up of {np.std(truth):.3f} r.m.s.; error of a tile that ends, all directions")
    print("from the edge    r.m.s.   largest")
    for near, far in ((0, 300), (300, 600), (600, 1000), (1000, 2000), (2000, 3000), (3000, 5000), (5000, 7200)):
        here = (away >= near) & (away < far)
        values = np.concatenate([one[here] for one in error])
        rms, most = np.sqrt(np.mean(values**2)), np.abs(values).max()
        print(f"{near / 1000:4.1f}–{far / 1000:.1f} km      {rms:.4f}   {most:.4f}")


def demo_cells(count: int, turn_deg: float, settings: WindSettings, ground: Field) -> SectorWinds:
    """Single cells of the demo region, its north turned."""
    random = np.random.default_rng(7)
    rise = rise_m(ground, 1000.0)
    margin = round(settings.shelter_reach_m / ground.grid.cell_size_m) + 2
    row = random.integers(margin, ground.grid.rows - margin, count)
    col = random.integers(margin, ground.grid.cols - margin, count)
    return sector_winds(
        tuple(map(str, range(count))), ground, rise, hill_fields(ground, settings), None, np.arange(count + 1),
        row * ground.grid.cols + col, np.ones(count), np.full(count, turn_deg), 0.9, settings,
    )  # fmt: skip


def demo_ground() -> Field:
    """The demo region's finest terrain on the lattice."""
    from sitescreen.brief import load_brief
    from sitescreen.inputs.terrain import open_terrain
    from sitescreen.lattice import block_of

    terrain = open_terrain(load_brief(DEMO / "brief.toml").terrain)
    block = block_of(62.75, -6.7, terrain.cell_size_m)
    return terrain.elevation(block.window(0.0, terrain.data_bounds(block.crs)))


def compared(
    what: str, one: SectorWinds, other: SectorWinds, rose: Rose, ours: WindSettings, theirs: WindSettings
) -> None:
    """How far readings differ."""
    a, b = wind_readings(one, rose, ours), wind_readings(other, rose, theirs)
    print(what)
    for name in ("ventilation", "ridge_exposure", "sheltered_fraction", "worst_sector_exposure"):
        first, second = getattr(a, name), getattr(b, name)
        known = np.isfinite(first) & np.isfinite(second)
        off = np.abs(first - second)[known]
        spread = first[known].std()
        print(
            f"  {name:22s} {off.mean():.4f} mean, {np.quantile(off, 0.95):.4f} of 95 in 100, {off.max():.3f} largest;"
            f" spread of the reading {spread:.3f}"
        )


def main() -> None:
    """Run what was asked for."""
    asked = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    asked.add_argument("--cells", type=int, default=3601)
    asked.add_argument("--times", type=int, default=5)
    for flag in ("--edge", "--sectors", "--convergence"):
        asked.add_argument(flag, action="store_true")
    given = asked.parse_args()
    if given.edge:
        edge()
    elif given.sectors or given.convergence:
        ground, table = demo_ground(), read_wind(DEMO / "wind.csv")
        rose = table.roses["year", 0]
        sixteen = demo_cells(4000, 0.0, WIND, ground)
        if given.sectors:
            eight = WIND.model_copy(update={"sectors": 8})
            compared("8 sectors against 16", sixteen, demo_cells(4000, 0.0, eight, ground), rose, WIND, eight)
        for turn in (0.25, 0.7, 3.0) if given.convergence else ():
            turned = demo_cells(4000, turn, WIND, ground)
            compared(f"sectors {turn}° off", sixteen, turned, rose, WIND, WIND)
    else:
        timed(given.cells, given.times)


if __name__ == "__main__":
    main()

"""How often the chance of cold air is right: invented grounds whose truth is known, measured with a known error.

Run from the repository: ``python benchmarks/cold_calibration.py set`` prints what the thresholds were chosen by
(grounds 0 to 15); ``python benchmarks/cold_calibration.py table`` writes ``tests/climate/cold_calibration.csv`` from
grounds that the choice never saw (100 to 115). ``tests/climate/test_cold_calibration.py`` computes a part of that table
again.
"""

import csv
import sys
from collections.abc import Iterable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

sys.path.insert(0, str(Path(__file__).parent))

from invented_ground import invented_ground

from sitescreen.climate.cold_air import ClosedPools, closed_pools
from sitescreen.climate.cold_chance import Nest, WiderRun, drawn_night, nest, nest_bounds
from sitescreen.climate.cold_flow import Source, level_depth_m, run_night, supply_m_s
from sitescreen.climate.cold_kinds import NONE, cold_kinds
from sitescreen.climate.cold_layer import ColdLayer, layer_of, night_ground, rise_m
from sitescreen.grid import Bounds, Field, Grid
from sitescreen.settings import Defaults, load_defaults
from sitescreen.terrain.hollows import hollows
from sitescreen.terrain.terrain_error import error_parts
from sitescreen.terrain.threads import thread_count, work_alone

TABLE = Path(__file__).parents[1] / "tests" / "climate" / "cold_calibration.csv"
CHOOSING, NEVER_SEEN = range(16), range(100, 116)
ERRORS_M, RANGES_M = (1.6, 2.5, 4.0), (100.0, 500.0)
STRENGTH_K = 6.0
TRUTH_SEED, DRAW_SEED = 7001, 20
SIDE = 3


class Tally(NamedTuple):
    """Patches of 90 m over one ground.

    ``cold`` in truth; told ``likely``, and of those ``likely_right`` cold in truth; the same for those told likely by
    not all draws, which is where the rule has to decide; ``possible``, and cold of those; ``missed``: cold, told none.
    """

    ground: int
    vertical_error_m: float
    error_range_m: float
    patches: int
    cold: int
    likely: int
    likely_right: int
    doubted: int
    doubted_right: int
    possible: int
    possible_cold: int
    missed: int


def window(settings: Defaults) -> tuple[Grid, Bounds]:
    """12 km of ground, and the core of the one nest in its middle."""
    core = settings.cold_chance.nest_core_m
    west, south = 100 * core, -1000 * core
    side = 12_060.0 + (core - 2700.0)
    out = (side - core) / 2.0
    cells = round(side / 30.0)
    return Grid("EPSG:32637", west - out, south + core + out, 30.0, cells, cells), (
        west,
        south,
        west + core,
        south + core,
    )


def layer_over(ground: Field, settings: Defaults) -> tuple[ColdLayer, NDArray[np.bool_]]:
    """The stated night over the whole window, its edge open."""
    flow = settings.cold_layer
    night = night_ground(ground, np.zeros(ground.grid.shape, dtype=np.bool_), flow)
    source = Source(flow.heat_w_m2, flow.deficit_k)
    supply = supply_m_s(source, night.ground.bed_m)
    run = run_night(night.ground, night.wet, supply, source.deficit_k, "open", flow)
    rise = rise_m(night.ground, flow)
    return layer_of(night.ground, (run, run), level_depth_m(supply, flow), rise, source, flow), night.wet


def patch_deficit_k(kind: NDArray[np.uint8], fill: NDArray[np.float32]) -> NDArray[np.float64]:
    """Deficit of patches of 3 × 3 cells, by the rule for plots: none unless half of the patch lies in cold air. [K]"""
    rows, cols = kind.shape[0] // SIDE, kind.shape[1] // SIDE
    shape = (rows, SIDE, cols, SIDE)
    share = (kind != NONE).reshape(shape).mean(axis=(1, 3))
    return np.where(share >= 0.5, STRENGTH_K * fill.astype(np.float64).reshape(shape).mean(axis=(1, 3)), 0.0)


def deficit_of(ground: Field, part: Bounds, settings: Defaults) -> NDArray[np.float64]:
    """What one night over known ground gives."""
    layer, _ = layer_over(ground, settings)
    pools = closed_pools(hollows(ground), 0.0, settings.cold_air).depth_m.part(part)
    none_cut = ClosedPools(pools, np.zeros(pools.grid.shape, dtype=np.bool_))
    kinds = cold_kinds(layer, none_cut, ground.part(part), 0.0, settings.cold_layer, settings.cold_air.fill_scale_m)
    return patch_deficit_k(kinds.kind, kinds.fill.values)


def measured_nest(truth: Field, number: int, error_m: float, range_m: float, settings: Defaults) -> Nest:
    """The nest that a run over the ground with an error on it hands on."""
    error = error_parts(truth.grid, error_m, range_m, TRUTH_SEED, number)
    seen = Field((truth.values + error.short_m + error.long_m).astype(np.float32), truth.grid, "m", "measured height")
    layer, wet = layer_over(seen, settings)
    level = Field(seen.values + hollows(seen).depth_m.values, seen.grid, "m", "filled height")
    sky = Field(np.ones(seen.grid.shape), seen.grid, "1", "open sky")
    wider = WiderRun(seen, level, np.zeros(seen.grid.shape, dtype=np.bool_), sky, None, layer, wet)
    _, core = window(settings)
    bounds = nest_bounds(core[0] + 1.0, core[1] + 1.0, settings.cold_chance)
    return nest(bounds, wider, error_m, range_m)


def drawn_deficits_k(one: Nest, draws: Iterable[int], settings: Defaults) -> NDArray[np.float64]:
    """Deficit of each patch in each draw, shape (draws, rows, cols)."""
    _, core = window(settings)

    def single(draw: int) -> NDArray[np.float64]:
        night = drawn_night(one, core, DRAW_SEED, draw, settings.cold_chance, settings.cold_layer, settings.cold_air)
        return patch_deficit_k(night.kinds.kind, night.kinds.fill.values)

    with ThreadPoolExecutor(thread_count(), initializer=work_alone) as pool:
        return np.stack(list(pool.map(single, draws)))


def chances(number: int, error_m: float, range_m: float, draws: int, settings: Defaults) -> tuple[Any, Any]:
    """Which patches are cold in truth, and the chance that the draws give each."""
    grid, core = window(settings)
    truth = invented_ground(number, grid)
    cold_from = settings.cold_chance.cold_from_k
    drawn = drawn_deficits_k(measured_nest(truth, number, error_m, range_m, settings), range(draws), settings)
    return deficit_of(truth, core, settings) > cold_from, (drawn > cold_from).mean(axis=0)


def tally(number: int, error_m: float, range_m: float, draws: int, settings: Defaults) -> Tally:
    """One line of the table."""
    cold, chance = chances(number, error_m, range_m, draws, settings)
    likely, none = chance >= settings.cold_chance.likely, chance < settings.cold_chance.possible
    doubted, possible = likely & (chance < 1.0), ~likely & ~none
    told = (likely, likely & cold, doubted, doubted & cold, possible, possible & cold, none & cold)
    counts = (cold.size, cold.sum(), *(one.sum() for one in told))
    return Tally(number, error_m, range_m, *(int(count) for count in counts))


def main(which: str) -> None:
    settings = load_defaults()
    if which == "table":
        with TABLE.open("w", newline="") as file:
            writer = csv.writer(file)
            writer.writerow(Tally._fields)
            for error_m in ERRORS_M:
                for range_m in RANGES_M:
                    for number in NEVER_SEEN:
                        writer.writerow(tally(number, error_m, range_m, settings.judgement.data_draws, settings))
                        file.flush()
        return
    for error_m in ERRORS_M:
        for range_m in RANGES_M:
            pairs = [
                chances(number, error_m, range_m, settings.cold_chance.draws_first, settings) for number in CHOOSING
            ]
            cold, chance = (np.concatenate([one[i].ravel() for one in pairs]) for i in (0, 1))
            print(f"error {error_m} m, range {range_m:g} m: {cold.mean():.1%} cold in truth; none said to", end=" ")
            print(f"{(chance < settings.cold_chance.possible)[cold].mean():.1%} of that")
            for likely in (0.6, 0.7, 0.8, 0.9, 0.95):
                said = chance >= likely
                print(f"   likely from {likely}: {said.mean():.1%} of ground, right {cold[said].mean():.1%}", end="")
                print(f", {said[cold].mean():.1%} of the cold found", flush=True)


if __name__ == "__main__":
    main(sys.argv[1])

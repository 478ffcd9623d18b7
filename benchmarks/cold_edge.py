"""How far from the edge of the terrain model a plot's cold air is known, and how often rightly.

Run from the repository: ``python benchmarks/cold_edge.py [seed …]``. Invented hills of several sizes on ground that
falls from west to east are run whole, 110 km wide; then cut at a western or an eastern edge. Cells 6, 12, 20 and 28 km
behind that edge, of which the whole knows the cold air, are compared with it. The whole holds few large valleys, so the
shares hang on the seed and on how much of the ground is looked at.
"""

import sys

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter

from sitescreen.climate.cold_air import ClosedPools
from sitescreen.climate.cold_kinds import KINDS, ColdKinds, cold_kinds
from sitescreen.climate.cold_layer import cold_layer, night_ground
from sitescreen.grid import Field, Grid
from sitescreen.settings import load_defaults

CELL_M = 90.0
ROWS, COLS = 800, 1222
CUT_KM = 40.0
DISTANCES_KM = (6.0, 12.0, 20.0, 28.0)
SETTINGS = load_defaults()


def hills(seed: int) -> NDArray[np.float64]:
    """Relief of some hundred metres over 2 to 40 km, on ground that falls 900 m eastward."""
    random = np.random.default_rng(seed)
    height = 1800.0 - np.linspace(0.0, 900.0, COLS)[None] * np.ones((ROWS, 1))
    for width, size_m in ((8, 40.0), (30, 120.0), (120, 250.0)):
        waves = gaussian_filter(random.standard_normal((ROWS, COLS)), width, mode="wrap")
        height += size_m * waves / waves.std()
    return height


def kinds_of(height: NDArray[np.float64]) -> ColdKinds:
    """Kinds by the layer alone: what closed hollows hold does not hang on far ground."""
    ground = Field(height, Grid("EPSG:32641", 0.0, height.shape[0] * CELL_M, CELL_M, *height.shape), "m", "hills")
    nothing = np.zeros(height.shape, dtype=np.bool_)
    layer = cold_layer(night_ground(ground, nothing, SETTINGS.cold_layer), None, SETTINGS.cold_layer)
    none = ClosedPools(Field(nothing.astype(np.float32), ground.grid, "m", ""), nothing)
    return cold_kinds(layer, none, ground, 5.0, SETTINGS.cold_layer, SETTINGS.cold_air.fill_scale_m)


def main(seeds: list[int]) -> None:
    """The table, over both edges and all seeds."""
    cut = round(CUT_KM * 1000.0 / CELL_M)
    inner = round(12_000.0 / CELL_M)
    found: dict[float, list[NDArray[np.float64]]] = {distance: [] for distance in DISTANCES_KM}
    for seed in seeds:
        height = hills(seed)
        whole = kinds_of(height)
        for part in (np.s_[:, cut:], np.s_[:, : COLS - cut]):
            cut_kinds = kinds_of(height[part].copy())
            for distance in DISTANCES_KM:
                at = round(distance * 1000.0 / CELL_M)
                col = at if part[1].start else cut_kinds.kind.shape[1] - 1 - at
                here = np.s_[inner : ROWS - inner, max(col - 5, 0) : col + 6]
                truth = whole.fill.values[part][here].astype(np.float64)
                told, least, most = (
                    one.values[here].astype(np.float64)
                    for one in (cut_kinds.fill, cut_kinds.fill_least, cut_kinds.fill_most)
                )
                known = ~np.isnan(truth)
                found[distance].append(np.stack([truth, told, least, most])[:, known])
    print(
        "from the edge  unknown  known and off by > 1 K  unknown: true value outside the limits  mean width of limits"
    )
    for distance, parts in found.items():
        truth, told, least, most = np.concatenate(parts, axis=1)
        unknown = np.isnan(told)
        off = 6.0 * np.abs(told - truth) > 1.0  # of a climate's 6 K
        outside = unknown & ((truth < least - 1.0 / 6.0) | (truth > most + 1.0 / 6.0))
        width = 6.0 * float(np.mean((most - least)[unknown])) if unknown.any() else 0.0
        share = float(np.mean(off[~unknown]))
        beside = float(outside.sum() / max(unknown.sum(), 1))
        print(f"{distance:10.0f} km {unknown.mean():9.1%} {share:22.1%} {beside:38.1%} {width:20.1f} K")
    cold = np.concatenate([part[0] for part in found[28.0]]) > 1.0 / 6.0
    print(f"{cold.mean():.0%} of the ground is colder by over 1 K; kinds are {', '.join(KINDS)}")


if __name__ == "__main__":
    main([int(one) for one in sys.argv[1:]] or [1])

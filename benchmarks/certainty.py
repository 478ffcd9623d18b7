"""How long ranks and chances take beyond the readings: 40 plots and 1,000, 2,000 trials, 100 draws of the data.

    python benchmarks/certainty.py

Asked for: 40 plots in at most 3 s, 1,000 plots in at most 20 s. Above 5,000 only the best are drawn.
"""

import sys
import time
from collections.abc import Callable

import numpy as np
import pandas as pd

from sitescreen.climate.roses import sector_bearings_deg
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.climate.zones import ZoneShares, memberships, zone_shares
from sitescreen.inputs.wind import assumed_wind
from sitescreen.judgement.cautions import load_cautions
from sitescreen.judgement.certainty import certainty
from sitescreen.judgement.draws import ReadingDraws
from sitescreen.judgement.overall import judge
from sitescreen.judgement.profiles import load_profiles
from sitescreen.judgement.rose_draws import rose_draws
from sitescreen.settings import load_defaults

SETTINGS = load_defaults()
REPEATS = 3


def invented(count: int) -> tuple[pd.DataFrame, ZoneShares, SectorWinds]:
    """Plots of all zones, some of them shared."""
    rng = np.random.default_rng(1)
    readings = pd.DataFrame(
        {
            "elevation_m": rng.uniform(0, 2600, count), "slope_deg": rng.uniform(0, 12, count),
            "aspect_deg": rng.uniform(0, 360, count), "buildable_share": rng.uniform(0.5, 1, count),
            "rise_m": rng.normal(0, 15, count), "breeze_reach": rng.uniform(0, 1, count),
            "ventilation": rng.uniform(0.5, 1.4, count), "ridge_exposure": rng.uniform(0.5, 1.6, count),
            "sheltered_fraction": rng.uniform(0, 0.5, count), "cold_pool_depth_m": rng.uniform(0, 5, count),
            "cold_deficit_k": rng.uniform(0, 3, count), "sky_view": rng.uniform(0.9, 1, count),
            "pond_depth_m": 0.0, "share_in_water": 0.0, "water_disagrees": 0.0, "cells": 40.0, "outcome": "",
        },
        index=pd.Index([str(k) for k in range(count)], name="plot"),
    )  # fmt: skip
    far = np.full(count, 500.0)
    fits = memberships(readings["elevation_m"], rng.uniform(0, 200, count), far, far, None, SETTINGS.zones)
    fits["undecided"] = False
    ids = tuple(readings.index)
    ratio, left = rng.uniform(0.4, 1.6, (count, 16)), rng.uniform(0.4, 1.0, (count, 16))
    winds = SectorWinds(ids, sector_bearings_deg(16), ratio, left, np.zeros((count, 16)))
    return readings, zone_shares(fits, None, SETTINGS.zones), winds


def drawn(readings: pd.DataFrame, winds: SectorWinds) -> ReadingDraws:
    """Roses drawn as a run draws them, and readings of the ground as if the terrain had been drawn."""
    columns = ("ventilation", "ridge_exposure", "sheltered_fraction")
    count, draws = len(readings), SETTINGS.judgement.data_draws
    nowhere = np.zeros(count)
    rose = rose_draws(winds, assumed_wind(), nowhere, nowhere, columns, (), 20, draws, SETTINGS.wind)
    rng = np.random.default_rng(2)
    ground = {
        name: readings[name].to_numpy()[:, None] * rng.uniform(0.8, 1.2, (count, draws))
        for name in ("slope_deg", "rise_m", "buildable_share", "pond_depth_m", "cold_deficit_k")
    }
    return ReadingDraws({**ground, **rose})


def best_of(work: Callable[[], object]) -> float:
    """Least of some repeats, since other programs may be running. [s]"""
    seconds = []
    for _ in range(REPEATS):
        begun = time.perf_counter()
        work()
        seconds.append(time.perf_counter() - begun)
    return min(seconds)


def main(counts: list[int]) -> None:
    profiles, rules, how = load_profiles(), load_cautions(), SETTINGS.judgement
    for count in counts:
        readings, zones, winds = invented(count)
        judged = judge(readings, zones, profiles, rules, how)
        draws = drawn(readings, winds)
        roses_s = best_of(lambda w=winds, r=readings: drawn(r, w))  # type: ignore[misc]
        trials_s = best_of(
            lambda j=judged, z=zones, d=draws: certainty(j, z, profiles, 20, 5, how, d, rules)  # type: ignore[misc]
        )
        took_part = certainty(judged, zones, profiles, 20, 5, how, draws, rules).drawn
        print(
            f"{count:>6} plots ({took_part} in the trials): roses {roses_s:.2f} s, "
            f"{how.trials:,} trials {trials_s:.2f} s, together {roses_s + trials_s:.2f} s"
        )


if __name__ == "__main__":
    main([int(word) for word in sys.argv[1:]] or [40, 1000, 6000])

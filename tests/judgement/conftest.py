"""Small plots to judge."""

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.plot_sun import PlotSkies
from sitescreen.climate.seasons import Seasons
from sitescreen.climate.sun_path import Skies, SunPath
from sitescreen.climate.zones import ZoneShares, memberships, zone_shares
from sitescreen.inputs.wind import SLOTS
from sitescreen.judgement.long_axis import SitingGround
from sitescreen.judgement.profiles import Criterion, ZoneProfile
from sitescreen.settings import load_defaults

ZONES = load_defaults().zones

GOOD_GROUND: dict[str, Any] = {
    "elevation_m": 50.0,
    "slope_deg": 2.0,
    "aspect_deg": 180.0,
    "buildable_share": 1.0,
    "rise_m": 12.0,
    "shore_kind": "sea",
    "shore_distance_km": 3.0,
    "sea_km": 3.0,
    "onshore_from_deg": 135.0,
    "breeze_reach": 0.96,
    "ventilation": 1.2,
    "ridge_exposure": 1.1,
    "sheltered_fraction": 0.05,
    "cold_pool_kind": "none",
    "cold_pool_depth_m": 0.0,
    "cold_deficit_k": 0.0,
    "smallest_pool_seen_m": 3.0,
    "night_flow_m2_s": 20.0,
    "night_flow_speed_m_s": 0.8,
    "still_air": 0.0,
    "sky_view": 0.995,
    "sun_cool_morning_h": 5.9,
    "morning_sun_share": 0.99,
    "west_load_kwh_m2": 2.9,
    "pond_depth_m": 0.0,
    "area_ha": 2.0,
    "share_in_water": 0.0,
    "water_disagrees": False,
    "cells": 22.0,
    "outcome": "",
}
"""Pleasant ground near an invented sea. The floating-point columns may be blanked."""


@pytest.fixture
def plots() -> Callable[..., pd.DataFrame]:
    """Readings of plots a, b, c …, each good ground but for the values given."""

    def make(*changes: dict[str, Any]) -> pd.DataFrame:
        rows = [{**GOOD_GROUND, **change} for change in changes]
        return pd.DataFrame(rows, index=pd.Index([chr(97 + n) for n in range(len(rows))], name="plot"))

    return make


@pytest.fixture
def in_zone() -> Callable[..., ZoneShares]:
    """The plots' zones, stated."""

    def make(readings: pd.DataFrame, *zone: str) -> ZoneShares:
        stated = list(zone) * len(readings) if len(zone) == 1 else list(zone)
        nowhere = np.full(len(readings), 500.0)
        fits = memberships(readings["elevation_m"].fillna(0.0), nowhere, nowhere, nowhere, None, ZONES)
        return zone_shares(fits, stated, ZONES)

    return make


@pytest.fixture(scope="session")
def axis_ground() -> Callable[..., SitingGround]:
    """Gives what the long axis of some plots goes by."""

    def ground(
        path: SunPath,
        count: int = 1,
        breeze_from_deg: float = np.nan,
        reach: float = 1.0,
        flow: Any = None,
        skyline: Any = None,
        seasons: tuple[Sequence[int], Sequence[int]] = ((5, 6, 7), (11, 0, 1)),
    ) -> SitingGround:
        """Plots alike, on level open ground unless a skyline is given; without wind unless a breeze or a flow is."""
        cool, hot = (np.zeros((count, 12), dtype=bool) for _ in range(2))
        cool[:, list(seasons[0])], hot[:, list(seasons[1])] = True, True
        unknown = np.zeros(count, dtype=bool)
        suns = PlotSkies(
            np.tile(np.zeros(72) if skyline is None else skyline, (count, 1)),
            Skies((path,), np.zeros(count, dtype=np.int64)),
            Seasons(cool, hot, unknown, unknown, "brief"),
            None,
            np.ones(count),
            np.tile([0.0, 0.0, 1.0], (count, 1)),
        )
        winds = np.tile(np.ones(16) if flow is None else flow, (count, 1))
        return SitingGround(
            suns, np.full(count, breeze_from_deg), np.full(count, reach), dict.fromkeys(SLOTS, winds), flow is None
        )

    return ground


@pytest.fixture
def cold_and_slope() -> dict[str, ZoneProfile]:
    """The upland's profile cut down to two criteria of equal weight: 100 at 0 K and 0°, 0 at 4 K and 20°."""
    criteria = tuple(
        Criterion(name=name, reading=reading, question="own", title=name, weight=50.0, curve=curve, source="x")
        for name, reading, curve in (
            ("cold", "cold_deficit_k", ((0.0, 100.0), (4.0, 0.0))),
            ("slope", "slope_deg", ((0.0, 100.0), (20.0, 0.0))),
        )
    )
    return {"upland": ZoneProfile(zone="upland", title="Upland", wants="Two things.", criteria=criteria)}

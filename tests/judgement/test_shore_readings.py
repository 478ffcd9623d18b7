"""The shore's readings: what is told, what is missing and why, and the sentence about the screen."""

from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.breeze import PlotBreeze
from sitescreen.climate.breeze_path import Way
from sitescreen.judgement.readings import Readings
from sitescreen.judgement.reasons import load_words
from sitescreen.judgement.sentences import facts, fill
from sitescreen.judgement.shore_readings import with_shore
from sitescreen.settings import load_defaults
from sitescreen.terrain.shore_distance import ShoreDistance
from sitescreen.terrain.shore_fetch import OpenShore

BREEZE = load_defaults().breeze
BARE = Readings(pd.DataFrame(index=pd.Index(["a"], name="plot")), pd.DataFrame(index=pd.Index(["a"], name="plot")))


def one(value: Any) -> Any:
    return np.array([value])


def read(near_m: float = 300.0, **other: Any) -> Readings:
    """Readings of one plot 3 km from an open sea with a creek beside it, behind a 64 m ridge; or as said otherwise."""
    told = {
        "kind": "sea", "distance_m": 3000.0, "bearing_deg": 88.0, "reach": 0.49, "screen": 0.5, "onshore": 80.0,
        "skyline_deg": 9.0, "crest_distance_m": 300.0, "crest_above_plot_m": 64.0, "known": True,
    } | other  # fmt: skip
    way = Way(
        *(one(told[name]) for name in ("skyline_deg", "crest_distance_m", "crest_above_plot_m")),
        *(one(0.0) for _ in range(4)),
        one(told["known"]),
    )
    breeze = PlotBreeze(
        np.array([told["kind"]], dtype=object),
        *(one(told[name]) for name in ("distance_m", "bearing_deg", "reach", "screen")),
        way,
        one(np.nan),
        one(np.nan),
    )
    near = ShoreDistance(
        one("sea"), one(0), one(near_m), one(0.0), one(0.0), one(0.0), one(near_m), one(0.0), one(np.nan), one(np.nan),
        one(np.nan), one(-1), one(""),
    )  # fmt: skip
    nothing = OpenShore(*(one(np.nan) for _ in OpenShore._fields))
    return with_shore(BARE, near, nothing, breeze, one(told["onshore"]), BREEZE)


def test_the_open_shore_gives_the_breeze_and_the_nearest_water_the_rest() -> None:
    row = read().values.loc["a"]
    assert (row["shore_distance_km"], row["sea_km"]) == (3.0, 0.3)
    assert (row["shore_skyline_deg"], row["crest_bearing_deg"]) == (9.0, 88.0)


@pytest.mark.parametrize(("by_day", "by_night"), [(80.0, 260.0), (180.0, 0.0), (270.0, 90.0)])
def test_the_land_breeze_comes_from_the_other_side(by_day: float, by_night: float) -> None:
    assert read(onshore=by_day).values.at["a", "offshore_from_deg"] == by_night


@pytest.mark.parametrize(
    ("told", "column", "reason"),
    [
        ({"onshore": np.nan}, "offshore_from_deg", "face one another"),
        ({"known": False, "reach": np.nan, "screen": np.nan}, "breeze_reach", "no data for part of the way"),
        ({"known": False, "reach": np.nan, "screen": np.nan}, "shore_skyline_deg", "no data for part of the way"),
        ({"known": False, "reach": np.nan, "screen": np.nan}, "crest_distance_m", "no data for part of the way"),
        ({"reach": np.nan}, "breeze_reach", "how wide the lake is"),
        ({"crest_distance_m": np.nan, "skyline_deg": 0.0}, "crest_bearing_deg", "no ground on the way"),
        ({"distance_m": 95_000.0}, "breeze_arrival_h", "too far"),
        ({"kind": "", "distance_m": np.nan, "reach": np.nan}, "shore_distance_km", "only creeks"),
        ({"kind": "", "distance_m": np.nan, "reach": np.nan, "near_m": np.nan}, "breeze_reach", "neither a sea nor"),
    ],
)
def test_what_is_missing_says_why(told: dict[str, Any], column: str, reason: str) -> None:
    readings = read(**told)
    assert np.isnan(readings.values.at["a", column])
    assert reason in readings.why_unknown.at["a", column]


def test_without_a_shoreline_everything_says_so() -> None:
    readings = with_shore(BARE, None, None, None, one(np.nan), BREEZE)
    assert (readings.why_unknown.loc["a"] == "no shoreline was given").all()
    assert {"breeze_reach", "offshore_from_deg", "shore_skyline_deg"} <= set(readings.why_unknown.columns)
    assert readings.values.at["a", "shore_kind"] == ""


def breeze_sentence(**other: Any) -> str:
    told = facts(read(**other).values.loc["a"].to_dict())
    return fill(load_words().criteria["breeze"].for_value(told["breeze_reach"]), told)


def test_the_screening_ridge_is_named() -> None:
    assert breeze_sentence() == (
        "Screened: a 64 m ridge 300 m to the east stands 9° above the plot, "
        "so only 49 % of a full sea breeze reaches it."
    )
    assert "400 m ridge 9.1 km to the east stands 2°" in breeze_sentence(
        crest_above_plot_m=400.0, crest_distance_m=9120.0, skyline_deg=2.4
    )


def test_high_ground_that_is_no_ridge_to_look_at_is_not_called_one() -> None:
    said = breeze_sentence(skyline_deg=0.4, screen=0.38, reach=0.58)
    assert said == "High ground takes 38 % of the sea breeze: 58 % of a full one reaches it."


def test_a_screen_too_small_to_matter_is_not_told() -> None:
    assert (
        breeze_sentence(screen=0.05, reach=0.59) == "Only 59 % of a full sea breeze reaches it, 3.0 km from the shore."
    )

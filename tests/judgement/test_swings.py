"""One input at a time at its low and at its high end."""

from collections.abc import Callable

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.roses import sector_bearings_deg
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.climate.zones import ZoneShares
from sitescreen.inputs.wind import SLOTS, Rose, WindTable, assumed_wind
from sitescreen.judgement.cautions import load_cautions
from sitescreen.judgement.draws import NO_DRAWS, ReadingDraws
from sitescreen.judgement.overall import judge
from sitescreen.judgement.profiles import ZoneProfile, load_profiles
from sitescreen.judgement.swings import (
    Swing,
    breeze_swings,
    night_swings,
    rose_swings,
    swing_notes,
    swung,
    terrain_swings,
)
from sitescreen.settings import load_defaults

DEFAULTS = load_defaults()
PROFILES = load_profiles()
RULES = load_cautions()

Profiles = dict[str, ZoneProfile]
Plots = Callable[..., pd.DataFrame]
InZone = Callable[..., ZoneShares]


def test_each_swing_is_judged_as_a_run_of_its_own(plots: Plots, in_zone: InZone, cold_and_slope: Profiles) -> None:
    readings = plots({"cold_deficit_k": 1.0}, {"cold_deficit_k": 0.0, "slope_deg": 7.6}, {"cold_deficit_k": 2.0})
    zones = in_zone(readings, "upland")
    judged = judge(readings, zones, cold_and_slope, RULES, DEFAULTS.judgement)
    swings = [
        *night_swings(readings, DEFAULTS.swings),
        Swing("terrain", "it were steep", {"slope_deg": np.array([25.0, np.nan, 3.0])}),
    ]
    for one, found in zip(
        swings, swung(swings, judged, zones, cold_and_slope, RULES, 1, DEFAULTS.judgement), strict=True
    ):
        changed = {name: np.where(np.isnan(values), readings[name], values) for name, values in one.readings.items()}
        again = judge(readings.assign(**changed), zones, cold_and_slope, RULES, DEFAULTS.judgement).table
        assert list(found.first) == list(again.index[again["rank"] == 1])
        ranked = again["rank"].notna()
        assert found.mean_change == pytest.approx((again["mark_low"] - judged.table["mark_low"])[ranked].abs().mean())
        was, now = set(judged.table.index[judged.table["rank"] == 1]), set(again.index[again["rank"] == 1])
        assert (set(found.entered), set(found.left)) == (now - was, was - now)
        assert found.is_first_new == (was != now)
    assert found.left == ("a",), "25° sets it aside"
    assert "plot a would leave the first 1" in found.sentence()


def test_colder_nights_cost_the_plot_in_the_hollow_its_place(
    plots: Plots, in_zone: InZone, cold_and_slope: Profiles
) -> None:
    """(75 + 90)/2 = 82.5 against (100 + 62)/2 = 81; with 1.25 K instead of 1 K it is 79.4, with 0.625 K 87.2."""
    readings = plots({"cold_deficit_k": 1.0}, {"cold_deficit_k": 0.0, "slope_deg": 7.6})
    zones = in_zone(readings, "upland")
    judged = judge(readings, zones, cold_and_slope, RULES, DEFAULTS.judgement)
    found = swung(night_swings(readings, DEFAULTS.swings), judged, zones, cold_and_slope, RULES, 1, DEFAULTS.judgement)
    assert [one.first for one in found] == [("a",), ("b",)], judged.table["mark_low"].tolist()
    assert [one.moves for one in found].count(True) == 1
    notes = [note.text for note in swing_notes(found)]
    assert len(notes) == 2
    assert any("would be first" in text for text in notes)
    assert notes[-1].startswith("Tried one at a time, the first 1 stay the same plots if ")


def test_the_breeze_fades_from_elsewhere(plots: Plots) -> None:
    """12 km inland: e^(−(12 − 5)/20) and 1 against e^(−(12 − 8)/20); within the band nothing changes."""
    readings = plots({"shore_distance_km": 12.0, "breeze_reach": 0.5}, {"shore_distance_km": 2.0, "breeze_reach": 0.9})
    near, far = breeze_swings(readings, DEFAULTS.breeze, DEFAULTS.swings)
    assert near.readings["breeze_reach"] == pytest.approx([0.5 * np.exp(-3 / 20), 0.9])
    assert far.readings["breeze_reach"] == pytest.approx([0.5 * np.exp(4 / 20), 0.9])
    assert "5 km inland instead of 8 km" in near.says
    assert breeze_swings(plots({"breeze_reach": np.nan}), DEFAULTS.breeze, DEFAULTS.swings) == []


def test_winds_turn_by_one_sector_to_either_side() -> None:
    ratio = np.arange(16.0)[None, :] + 1.0
    winds = SectorWinds(("a",), sector_bearings_deg(16), ratio, np.ones((1, 16)), np.zeros((1, 16)))
    rose = Rose(np.array([90.0]), np.array([1.0]), np.array([5.0]), 0.0, False)
    table = WindTable(((0.0, 0.0),), {(slot, 0): rose for slot in SLOTS}, False, None, ())
    here = np.zeros(1)
    anti, clockwise = rose_swings(winds, table, here, here, [("ventilation", "hot_afternoon")], DEFAULTS.wind)
    # from the east, sector 4, F is 5; from 67.5° it is 4 and from 112.5° it is 6
    assert anti.readings["ventilation"] == pytest.approx([4.0])
    assert clockwise.readings["ventilation"] == pytest.approx([6.0])
    assert rose_swings(winds, assumed_wind(), here, here, [("ventilation", "hot_afternoon")], DEFAULTS.wind) == []


def test_the_grounds_readings_go_to_both_ends_of_their_draws() -> None:
    drawn = np.array([np.arange(100.0)[::-1], np.full(100, np.nan)])
    kinds = np.full((2, 100), "none", dtype=object)
    low, high = terrain_swings(ReadingDraws({"slope_deg": drawn, "cold_pool_kind": kinds}), ["slope_deg", "cold_pool_kind"], DEFAULTS.swings)  # fmt: skip  # noqa: E501
    assert list(low.readings) == ["slope_deg"]
    assert low.readings["slope_deg"][0] == 10.0
    assert high.readings["slope_deg"][0] == 90.0
    assert np.isnan(low.readings["slope_deg"][1])
    assert terrain_swings(NO_DRAWS, ["slope_deg"], DEFAULTS.swings) == []


def test_without_ranked_plots_there_is_nothing_to_swing(plots: Plots, in_zone: InZone) -> None:
    readings = plots({"outcome": "outside the terrain"})
    zones = in_zone(readings, "upland")
    judged = judge(readings, zones, PROFILES, RULES, DEFAULTS.judgement)
    assert swung(night_swings(readings, DEFAULTS.swings), judged, zones, PROFILES, RULES, 5, DEFAULTS.judgement) == ()
    assert swing_notes(()) == ()

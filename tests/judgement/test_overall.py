"""The overall mark, its limits and the ranks."""

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sitescreen.climate.zones import ZoneShares, memberships, zone_shares
from sitescreen.errors import ConfigError
from sitescreen.judgement.cautions import load_cautions
from sitescreen.judgement.overall import Judged, judge, weighted_mean
from sitescreen.judgement.profiles import Criterion, ZoneProfile, load_profiles
from sitescreen.settings import load_defaults

DEFAULTS = load_defaults()
PROFILES = load_profiles()
RULES = load_cautions()

Plots = Callable[..., pd.DataFrame]
InZone = Callable[..., ZoneShares]


def judged(readings: pd.DataFrame, zones: ZoneShares, halved: Sequence[str] = (), profiles: Any = None) -> Judged:
    return judge(readings, zones, profiles or PROFILES, RULES, DEFAULTS.judgement, halved)


def ranks(result: Judged) -> dict[str, int | None]:
    return {plot: None if pd.isna(rank) else int(rank) for plot, rank in result.table["rank"].items()}


# --- the mean --------------------------------------------------------------------------------------------------------


def test_a_weighted_mean_lets_good_make_up_for_bad() -> None:
    """Scores 0.9 and 0.1 at equal weights give 0.5 as a weighted mean (0.3 as a geometric one)."""
    values = pd.DataFrame({"mark_a": [0.9, 0.5], "mark_b": [0.1, 0.5]})
    mean, known = weighted_mean(values, {"a": 3.0, "b": 3.0})
    assert mean.tolist() == pytest.approx([0.5, 0.5])
    assert known.tolist() == [1.0, 1.0]


def test_unknown_marks_take_no_part_and_their_weight_is_told() -> None:
    values = pd.DataFrame({"mark_a": [80.0, np.nan, np.nan], "mark_b": [20.0, 20.0, np.nan]})
    mean, known = weighted_mean(values, {"a": 3.0, "b": 1.0})
    assert mean.tolist() == pytest.approx([65.0, 20.0, np.nan], nan_ok=True)
    assert known.tolist() == [1.0, 0.25, 0.0]


def test_the_overall_mark_is_the_weighted_mean_of_the_table(plots: Plots, in_zone: InZone) -> None:
    result = judged(plots({}, {"slope_deg": 7.0, "ventilation": 0.7}), in_zone(plots({}, {}), "hot_humid_coast"))
    weights = {one.name: one.weight for one in PROFILES["hot_humid_coast"].criteria}
    for plot in ("a", "b"):
        row = result.table.loc[plot]
        by_hand = sum(weight * row[f"mark_{name}"] for name, weight in weights.items()) / 100.0
        assert row["overall_mark"] == row["mark_low"] == row["mark_high"] == pytest.approx(by_hand)
    assert np.isnan(result.table.at["a", "mark_cold"]), "no mark for what the zone does not ask"


# --- ignorance never wins --------------------------------------------------------------------------------------------


def test_an_unknown_reading_stands_at_its_worst_for_the_rank(plots: Plots, in_zone: InZone) -> None:
    readings = plots({}, {"ventilation": np.nan}, {"ventilation": 0.5})
    table = judged(readings, in_zone(readings, "hot_humid_coast")).table
    assert ranks(judged(readings, in_zone(readings, "hot_humid_coast"))) == {"a": 1, "b": 3, "c": 2}
    assert table.at["b", "overall_mark"] == pytest.approx(0.35 * 50 + 0.65 * 100), "a gap stands halfway"
    assert table.at["b", "mark_low"] == pytest.approx(0.35 * 0 + 0.65 * 100)
    assert table.at["b", "mark_high"] == pytest.approx(100.0)
    assert table.at["b", "known_weight_share"] == pytest.approx(0.65)


BLANKED = (
    "slope_deg", "aspect_deg", "buildable_share", "rise_m", "breeze_reach", "ventilation", "ridge_exposure",
    "cold_deficit_k", "cold_pool_depth_m", "sky_view", "pond_depth_m", "shore_distance_km", "cold_pool_kind",
    "morning_sun_share", "west_load_kwh_m2",
    "night_flow_speed_m_s", "still_air",
)  # fmt: skip
RANGES = {
    "slope_deg": (0, 25), "aspect_deg": (0, 360), "buildable_share": (0, 1), "rise_m": (-60, 200),
    "breeze_reach": (0, 1), "ventilation": (0.2, 2.3), "ridge_exposure": (0.3, 2), "cold_deficit_k": (0, 6),
    "cold_pool_depth_m": (0, 30), "sky_view": (0.6, 1), "pond_depth_m": (0, 6), "shore_distance_km": (0, 60),
    "morning_sun_share": (0, 1), "west_load_kwh_m2": (0, 5),
    "night_flow_speed_m_s": (0, 6), "still_air": (0, 1),
}  # fmt: skip
MARKED = ("slope_deg", "rise_m", "breeze_reach", "ventilation", "ridge_exposure", "cold_deficit_k", "sky_view",
          "pond_depth_m", "facing_ns", "morning_sun_share", "west_load_kwh_m2", "night_flow_speed_m_s",
          "still_air")  # fmt: skip


@st.composite
def ground(draw: st.DrawFn) -> dict[str, Any]:
    """One completely measured plot."""
    row: dict[str, Any] = {name: draw(st.floats(low, high)) for name, (low, high) in RANGES.items()}
    fixed = {"elevation_m": 50.0, "shore_kind": "sea", "share_in_water": 0.0, "water_disagrees": False, "cells": 20.0}
    return row | fixed | {"cold_pool_kind": draw(st.sampled_from(["none", "closed"])), "outcome": ""}


@st.composite
def any_profile(draw: st.DrawFn) -> ZoneProfile:
    """A profile of a planner's own, however odd."""
    criteria = []
    for reading in draw(st.lists(st.sampled_from(MARKED), min_size=1, max_size=6, unique=True)):
        low, high = RANGES.get(reading, (-1, 1))
        at = sorted(draw(st.sets(st.integers(0, 20), min_size=2, max_size=5)))
        curve = tuple((low + (high - low) * step / 20, draw(st.floats(0, 100))) for step in at)
        weight = draw(st.floats(0.1, 50))
        criteria.append(
            Criterion(
                name=reading, reading=reading, question="own", title=reading, weight=weight, curve=curve, source="x"
            )
        )
    return ZoneProfile(zone="mine", title="Mine", wants="Anything.", criteria=tuple(criteria))


PROFILE = st.one_of(st.sampled_from(list(PROFILES.values())), any_profile())


def all_in(profile: ZoneProfile, readings: pd.DataFrame) -> ZoneShares:
    nowhere = np.full(len(readings), 500.0)
    fits = memberships(np.full(len(readings), 50.0), nowhere, nowhere, nowhere, None, DEFAULTS.zones)
    fits.index = readings.index
    known = [*PROFILES, profile.zone]
    return zone_shares(fits, [profile.zone] * len(readings), DEFAULTS.zones, known=dict.fromkeys(known))


@settings(max_examples=150, deadline=None)
@given(complete=ground(), blanked=st.sets(st.sampled_from(BLANKED), min_size=1), profile=PROFILE)
def test_a_twin_with_a_gap_never_ranks_above_its_complete_twin(
    complete: dict[str, Any], blanked: set[str], profile: ZoneProfile
) -> None:
    gap = {name: "unknown" if name == "cold_pool_kind" else np.nan for name in blanked}
    readings = pd.DataFrame([complete, complete | gap], index=["complete", "gap"])
    result = judged(readings, all_in(profile, readings), profiles=PROFILES | {profile.zone: profile})
    rank = ranks(result)
    if rank["gap"] is not None:
        assert rank["complete"] is not None, "a gap must not escape what sets its twin aside"
        assert rank["complete"] <= rank["gap"]
    assert result.table.at["gap", "mark_low"] <= result.table.at["complete", "mark_low"] + 1e-9
    assert result.table.at["gap", "mark_high"] >= result.table.at["complete", "mark_high"] - 1e-9


@settings(max_examples=100, deadline=None)
@given(rows=st.lists(ground(), min_size=3, max_size=5), profile=PROFILE)
def test_the_order_of_two_plots_never_depends_on_a_third(rows: list[dict[str, Any]], profile: ZoneProfile) -> None:
    readings = pd.DataFrame(rows, index=[f"p{n}" for n in range(len(rows))])
    profiles = PROFILES | {profile.zone: profile}
    two = judged(readings.iloc[:2], all_in(profile, readings.iloc[:2]), profiles=profiles)
    more = judged(readings, all_in(profile, readings), profiles=profiles)
    one, other = (more.table.loc[plot] for plot in ("p0", "p1"))
    assert one["overall_mark"] == two.table.at["p0", "overall_mark"]
    assert pd.isna(one["rank"]) == pd.isna(two.table.at["p0", "rank"])
    if pd.notna(one["rank"]) and pd.notna(other["rank"]):
        both = two.table["rank"]
        assert np.sign(one["rank"] - other["rank"]) == np.sign(both["p0"] - both["p1"])


def test_an_unknown_slope_does_not_pass_where_a_steep_one_is_stopped(plots: Plots, in_zone: InZone) -> None:
    readings = plots({}, {"slope_deg": 20.0}, {"slope_deg": np.nan})
    table = judged(readings, in_zone(readings, "upland")).table
    assert table["rank"].isna().tolist() == [False, True, True]
    assert table.at["b", "set_aside"] == "too steep to build on: the ground slopes 36 % on average"
    assert "slope is unknown" in table.at["c", "set_aside"]


# --- ranks -----------------------------------------------------------------------------------------------------------


def test_equal_plots_share_a_rank(plots: Plots, in_zone: InZone) -> None:
    readings = plots({"slope_deg": 6.0}, {}, {}, {"slope_deg": 9.0})
    assert ranks(judged(readings, in_zone(readings, "hot_arid"))) == {"a": 3, "b": 1, "c": 1, "d": 4}


def test_ranks_within_zones_count_each_zone(plots: Plots, in_zone: InZone) -> None:
    readings = plots({"slope_deg": 6.0}, {}, {"slope_deg": 7.0}, {"outcome": "outside the terrain"})
    zones = in_zone(readings, "upland", "upland", "hot_arid", "hot_arid")
    table = judged(readings, zones).table
    assert table["rank_in_zone"].tolist()[:3] == [2, 1, 1]
    assert pd.isna(table.at["d", "rank_in_zone"])


def test_the_weakest_known_mark_is_named(plots: Plots, in_zone: InZone) -> None:
    readings = plots({"slope_deg": 11.31, "ventilation": np.nan}, {"pond_depth_m": 4.0})
    table = judged(readings, in_zone(readings, "hot_humid_coast")).table
    assert table["weakest"].tolist() == ["slope (25)", "standing water (0)"]


# --- set aside -------------------------------------------------------------------------------------------------------


def test_plots_with_an_outcome_are_set_aside_with_it_and_cause_no_other_alarm(plots: Plots, in_zone: InZone) -> None:
    blank = dict.fromkeys(("slope_deg", "ventilation", "breeze_reach", "pond_depth_m", "still_air"), np.nan)
    readings = plots({}, {"outcome": "outside the terrain model", **blank})
    table = judged(readings, in_zone(readings, "hot_humid_coast")).table
    assert table.at["b", "set_aside"] == "outside the terrain model"
    assert table.at["b", "cautions"] == ""
    assert ranks(judged(readings, in_zone(readings, "hot_humid_coast"))) == {"a": 1, "b": None}


def test_plots_outside_the_zones_are_set_aside(plots: Plots) -> None:
    readings = plots({}, {"elevation_m": 4000.0}, {"elevation_m": np.nan})
    nowhere = np.full(3, 500.0)
    fits = memberships(readings["elevation_m"], np.array([2.0, 400.0, 400.0]), nowhere, nowhere, None, DEFAULTS.zones)
    result = judged(readings, zone_shares(fits, None, DEFAULTS.zones))
    assert ranks(result) == {"a": 1, "b": None, "c": None}
    assert "outside the six climate zones" in result.table.at["b", "set_aside"]
    assert "height of the plot" in result.table.at["c", "set_aside"]
    assert np.isnan(result.table.at["b", "mark_low"])


# --- zones that share a plot -----------------------------------------------------------------------------------------


def test_a_plot_between_zones_gets_both_marks_and_their_blend(plots: Plots) -> None:
    readings = plots({"elevation_m": 2170.0, "ridge_exposure": 1.2, "cold_deficit_k": 1.0})
    nowhere = np.array([500.0])
    fits = memberships(readings["elevation_m"], nowhere, nowhere, nowhere, None, DEFAULTS.zones)
    row = judged(readings, zone_shares(fits, None, DEFAULTS.zones)).table.loc["a"]
    assert (row["zone"], row["zone_2"]) == ("upland", "high_upland")
    assert row["zone_share"] == pytest.approx((2275 - 2170) / 150)
    blend = row["zone_share"] * row["mark_in_zone"] + row["zone_2_share"] * row["mark_in_zone_2"]
    assert row["overall_mark"] == pytest.approx(blend)
    assert row["mark_in_zone"] > row["mark_in_zone_2"] + 5


def test_an_undecided_zone_ranks_by_the_one_that_suits_it_least(plots: Plots) -> None:
    readings = plots({"elevation_m": 500.0, "cold_deficit_k": 4.0})
    nowhere = np.array([500.0])
    fits = memberships(readings["elevation_m"], nowhere, nowhere, nowhere, None, DEFAULTS.zones)
    row = judged(readings, zone_shares(fits, None, DEFAULTS.zones)).table.loc["a"]
    assert row["zone_provisional"]
    said = "its rank is provisional: hot arid or savannah cannot be told without the humidity of the place"
    assert said in row["cautions"]
    assert "humidity" in row["zone_missing"]
    assert {row["zone"], row["zone_2"]} == {"hot_arid", "savannah"}
    assert row["mark_low"] == pytest.approx(min(row["mark_in_zone"], row["mark_in_zone_2"]))
    assert row["mark_high"] == pytest.approx(max(row["mark_in_zone"], row["mark_in_zone_2"]))
    assert row["mark_low"] < row["overall_mark"] < row["mark_high"]


def test_a_zone_without_a_profile_is_refused(plots: Plots, in_zone: InZone) -> None:
    readings = plots({})
    without = {zone: profile for zone, profile in PROFILES.items() if zone != "upland"}
    with pytest.raises(ConfigError, match="plot a lies in the zone 'upland', which has no profile"):
        judged(readings, in_zone(readings, "upland"), profiles=without)


# --- assumed inputs --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("halved", ["wind", "ventilation"])
def test_an_assumed_input_keeps_half_its_weight(plots: Plots, in_zone: InZone, halved: str) -> None:
    readings = plots({"ventilation": 0.3})
    zones = in_zone(readings, "hot_humid_coast")
    assert judged(readings, zones).table.at["a", "overall_mark"] == pytest.approx(65.0)
    assert judged(readings, zones, [halved]).table.at["a", "overall_mark"] == pytest.approx(100 * 65 / 82.5)


def test_the_readings_handed_in_stay_as_they_are(plots: Plots, in_zone: InZone) -> None:
    readings = plots({}, {"slope_deg": np.nan})
    before = readings.copy()
    judged(readings, in_zone(readings, "upland"))
    pd.testing.assert_frame_equal(readings, before)


def test_a_table_without_any_plot_is_judged_too(plots: Plots) -> None:
    readings = plots({}).iloc[:0]
    nowhere = np.zeros(0)
    fits = memberships(readings["elevation_m"], nowhere, nowhere, nowhere, None, DEFAULTS.zones)
    assert len(judged(readings, zone_shares(fits, None, DEFAULTS.zones)).table) == 0

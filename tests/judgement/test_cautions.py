"""Cautions: when each is raised, and how rules are checked."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.errors import ConfigError
from sitescreen.judgement.cautions import CautionRule, Condition, cautions, load_cautions

RULES = load_cautions()
Plots = Callable[..., pd.DataFrame]


def raised(readings: pd.DataFrame, zone: str = "upland") -> dict[str, str]:
    """Cautions of plot a: level by name."""
    found = cautions(readings, [zone] * len(readings), RULES).get("a", ())
    return {caution.name: caution.level for caution in found}


def test_good_ground_raises_none(plots: Plots) -> None:
    for zone in ("hot_humid_coast", "hot_arid", "savannah", "lake_basin", "upland", "high_upland"):
        assert raised(plots({}), zone) == {}


@pytest.mark.parametrize(
    ("zone", "change", "name", "level"),
    [
        ("upland", {"slope_deg": 16.8}, "too_steep", "stop"),
        ("upland", {"slope_deg": np.nan}, "too_steep", "stop"),
        ("upland", {"share_in_water": 0.6}, "in_water", "stop"),
        ("upland", {"share_in_water": 0.5}, "partly_in_water", "concern"),
        ("upland", {"share_in_water": 0.9, "water_disagrees": True}, "waters_disagree", "concern"),
        ("upland", {"share_flat_water": 1.0, "water_disagrees": True}, "level_as_water", "concern"),
        ("upland", {"buildable_share": 0.4}, "little_gentle_ground", "concern"),
        ("upland", {"cold_pool_kind": "closed", "cold_deficit_k": 0.5}, "cold_hollow", "concern"),
        ("high_upland", {"cold_pool_kind": "leaky", "cold_deficit_k": 0.6}, "cold_held_back", "concern"),
        ("upland", {"cold_pool_kind": "moving", "cold_deficit_k": 1.1}, "cold_stream", "concern"),
        ("hot_arid", {"may_be_trees": True}, "may_be_trees", "note"),
        ("hot_humid_coast", {"cold_pool_kind": "leaky", "still_air": 0.4}, "still_air", "note"),
        ("upland", {"cold_pool_kind": "none", "cold_pool_sure": "possible"}, "cold_possible", "note"),
        (
            "upland",
            {"cold_pool_kind": "leaky", "cold_deficit_k": 1.5, "cold_pool_sure": "none"},
            "cold_doubtful",
            "note",
        ),
        ("savannah", {"cold_deficit_k": 3.0}, "cold_hollow_mild", "note"),
        ("upland", {"cold_pool_kind": "unknown"}, "cold_pool_unknown", "concern"),
        ("hot_humid_coast", {"pond_depth_m": 1.5}, "ponding", "concern"),
        ("hot_arid", {"watercourse_km2": 1.5, "floor_height_m": 4.0}, "flash_flood", "concern"),
        ("savannah", {"watercourse_km2": 120.0, "floor_height_m": np.nan}, "flash_flood", "concern"),
        ("upland", {"watercourse_km2": 12.0, "floor_height_m": 0.0}, "watercourse", "concern"),
        ("high_upland", {"ridge_exposure": 1.4}, "exposed_ridge", "concern"),
        ("lake_basin", {"ridge_exposure": 1.4}, "windy_ground", "note"),
        ("high_upland", {"driving_rain": 1.4}, "driving_rain", "note"),
        ("upland", {"wind_outside_share": 0.6}, "steep_for_wind", "note"),
        ("hot_humid_coast", {"elevation_m": 2.0, "sea_km": 0.8}, "low_shore", "concern"),
        ("hot_humid_coast", {"sea_km": 0.2}, "salt_air", "note"),
        ("hot_arid", {"cells": 6.0}, "too_coarse", "note"),
        ("hot_arid", {"ventilation": np.nan}, "near_edge", "concern"),
        ("hot_arid", {"shore_distance_km": np.nan, "shore_kind": ""}, "no_shore", "note"),
        ("hot_arid", {"zone_provisional": True}, "zone_undecided", "concern"),
        ("hot_arid", {"known_weight_share": 0.5}, "thin_evidence", "concern"),
    ],
)
def test_each_caution_is_raised_alone(plots: Plots, zone: str, change: dict[str, Any], name: str, level: str) -> None:
    assert raised(plots(change), zone) == {name: level}


def test_every_rule_is_tried_above() -> None:
    marks = test_each_caution_is_raised_alone.pytestmark  # type: ignore[attr-defined]
    assert {case[2] for case in marks[0].args[1]} == {rule.name for rule in RULES}


@pytest.mark.parametrize(
    ("zone", "change"),
    [
        ("hot_humid_coast", {"cold_pool_kind": "closed"}),
        ("upland", {"cold_pool_kind": "leaky", "cold_deficit_k": 0.4}),
        ("upland", {"cold_pool_kind": "closed", "cold_deficit_k": 0.4, "cold_pool_sure": "none"}),
        ("upland", {"cold_pool_kind": "none", "cold_pool_sure": "none"}),
        ("upland", {"cold_pool_kind": "moving", "cold_deficit_k": 0.9}),
        ("upland", {"cold_pool_kind": "unknown", "cold_deficit_least_k": 0.0, "cold_deficit_most_k": 0.9}),
        ("hot_arid", {"cold_deficit_k": 3.0}),
        ("hot_humid_coast", {"elevation_m": 2.0, "shore_kind": "lake", "shore_distance_km": 0.5, "sea_km": np.nan}),
        ("hot_humid_coast", {"elevation_m": 2.0, "sea_km": 1.5}),
        ("hot_humid_coast", {"elevation_m": 4.0, "sea_km": 0.5}),
        ("upland", {"slope_deg": 16.6}),
        ("upland", {"pond_depth_m": 0.9}),
        ("upland", {"watercourse_km2": 9.0, "floor_height_m": 0.0}),
        ("hot_arid", {"watercourse_km2": 40.0, "floor_height_m": 12.0}),
        ("hot_arid", {"watercourse_km2": 0.0, "floor_height_m": 0.5}),
    ],
)
def test_what_is_no_cause_for_alarm(plots: Plots, zone: str, change: dict[str, Any]) -> None:
    assert raised(plots(change), zone) == {}


def test_disagreeing_waters_do_not_put_a_plot_in_water(plots: Plots) -> None:
    assert "in_water" not in raised(plots({"share_in_water": 1.0, "water_disagrees": True}))
    no_word = plots({"share_in_water": 1.0}).drop(columns="water_disagrees")
    assert raised(no_word) == {"in_water": "stop"}, "nobody compared the two waters"


def test_who_disagrees_is_said(plots: Plots) -> None:
    """Level ground without any map of water is not said to be mapped as water."""
    level = plots({"share_in_water": np.nan, "share_flat_water": 1.0, "water_disagrees": True})
    (found,) = cautions(level, ["upland"], RULES)["a"]
    assert "perfectly level" in found.text
    assert "map" not in found.text
    dry = plots({"share_in_water": 0.9, "share_flat_water": 0.1, "water_disagrees": True})
    (found,) = cautions(dry, ["upland"], RULES)["a"]
    assert found.text.startswith("the map shows water where the terrain shows dry ground")


def test_true_and_false_may_come_as_objects(plots: Plots) -> None:
    readings = plots({"share_in_water": 1.0}, {"share_in_water": 1.0})
    readings["water_disagrees"] = pd.Series([True, None], index=readings.index, dtype=object)
    found = cautions(readings, ["upland"] * 2, RULES)
    assert [caution.name for caution in found["a"]] == ["waters_disagree"]
    assert [caution.name for caution in found["b"]] == ["in_water"]


def test_the_gravest_comes_first_and_figures_are_said(plots: Plots) -> None:
    readings = plots({"cells": 4.0, "slope_deg": 20.0, "pond_depth_m": 2.25})
    found = cautions(readings, ["savannah"], RULES)["a"]
    assert [caution.level for caution in found] == ["stop", "concern", "note"]
    assert "36 %" in found[0].text
    assert "up to 2.2 m deep" in found[1].text
    assert "4.0 cells" in found[2].text


def test_a_sentence_without_its_figure_says_less(plots: Plots) -> None:
    found = cautions(plots({"cold_pool_kind": "closed", "cold_deficit_k": np.nan}), ["upland"], RULES)["a"]
    assert found[0].text == "lies in a hollow where cold air gathers on calm clear nights"


def test_plots_that_were_not_measured_are_left_alone(plots: Plots) -> None:
    readings = plots({"slope_deg": 30.0}, {"slope_deg": 30.0})
    assert list(cautions(readings, ["upland"] * 2, RULES, np.array([False, True]))) == ["b"]


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ('when = [{ reading = "rise_m" }]', "exactly one of above, below, at_most, one_of and unknown"),
        ('when = [{ reading = "rise_m", above = 1, below = 3 }]', "exactly one of above"),
        ('when = [{ reading = "rise_m", abov = 1 }]', r"caution\.1\.when\.1\.abov'.*'above' was meant"),
        ("when = []", r"caution\.1\.when"),
    ],
)
def test_wrong_rules_are_refused(tmp_path: Path, text: str, message: str) -> None:
    path = tmp_path / "mine.toml"
    rule = f'[[caution]]\nname = "x"\nlevel = "note"\n{text}\nsay = ["mind it"]\nsource = "no source"\n'
    path.write_text(rule, encoding="utf-8")
    with pytest.raises(ConfigError, match=message):
        load_cautions(path)


@pytest.mark.parametrize(
    "say", ['["up to {pond_depth_m:.1f} m"]', '["{x.__class__}", "mind it"]', '["{0}", "mind it"]']
)
def test_sentences_that_could_not_be_filled_in_are_refused(tmp_path: Path, say: str) -> None:
    path = tmp_path / "mine.toml"
    rule = '[[caution]]\nname = "x"\nlevel = "note"\nwhen = [{ reading = "rise_m", above = 1 }]\n'
    path.write_text(f'{rule}say = {say}\nsource = "no source"\n', encoding="utf-8")
    with pytest.raises(ConfigError, match=r"mine\.toml has caution\.1"):
        load_cautions(path)


def test_a_rule_is_undecided_only_where_nothing_rules_it_out() -> None:
    """Rows: both hold; one holds, the other unknown; one is ruled out, the other unknown."""
    rule = CautionRule(
        name="x",
        level="note",
        when=(Condition(reading="rise_m", above=3.0), Condition(reading="slope_deg", below=2.0)),
        say=("mind it",),
        source="test, no source",
    )
    table = pd.DataFrame({"rise_m": [5.0, 5.0, 1.0], "slope_deg": [1.0, np.nan, np.nan]})
    true, undecided = rule.raised(table, np.array(["upland"] * 3, dtype=object))
    assert (true.tolist(), undecided.tolist()) == ([True, False, False], [False, True, False])


def test_unknown_readings_leave_a_condition_open() -> None:
    table = pd.DataFrame({"rise_m": [1.0, 5.0, np.nan]})
    true, undecided = Condition(reading="rise_m", above=3.0).holds(table)
    assert (true.tolist(), undecided.tolist()) == ([False, True, False], [False, False, True])
    true, undecided = Condition(reading="rise_m", above=3.0, if_unknown=True).holds(table)
    assert (true.tolist(), undecided.tolist()) == ([False, True, True], [False, False, False])

"""Filling sentences with numbers."""

import numpy as np
import pytest

from sitescreen.judgement.sentences import check_template, compass_word, facts, fill, from_shore


@pytest.mark.parametrize(
    ("bearing", "word"), [(0, "north"), (44, "north-east"), (135, "south-east"), (337.6, "north"), (360, "north")]
)
def test_compass_words(bearing: float, word: str) -> None:
    assert compass_word(bearing) == word


def test_the_first_wording_whose_facts_are_known_is_used() -> None:
    told = facts({"rise_m": 42.3, "breeze_reach": np.nan, "shore_kind": ""})
    assert (
        fill(["{shore} at {breeze_pct:.0f} %", "{stands_high}.", "else"], told)
        == "Sits 42 m above the ground within 1 km."
    )
    assert fill(["{shore}"], told) == ""


def test_facts_in_a_clients_terms() -> None:
    told = facts({"slope_deg": 45.0, "ventilation": 1.25, "ridge_exposure": 0.8, "rise_m": -8.0, "aspect_deg": 91.0})
    assert told["slope_pct"] == pytest.approx(100.0)
    assert told["more_air_pct"] == pytest.approx(25.0)
    assert told["less_wind_pct"] == pytest.approx(20.0)
    assert told["stands_low"] == "Lies 8 m below the ground within 1 km"
    assert "stands_high" not in told
    assert told["aspect_word"] == "east"


def test_unknown_readings_are_no_facts() -> None:
    assert facts({"slope_deg": np.nan, "shore_kind": "", "rise_m": None}) == {}


def test_no_minus_nought() -> None:
    assert fill(["slopes {slope_pct:.0f} % here"], {"slope_pct": -0.2}) == "slopes 0 % here"


@pytest.mark.parametrize(
    "template",
    [
        "{}",
        "{0}",
        "{rise_m.real}",
        "{rise_m[0]}",
        "{rise_m!r}",
        "{rise_m:.1q}",
        "{rise",
        "{shore:.0f}",
        "{aspect_word:d}",
    ],
)
def test_templates_that_reach_too_far_are_refused(template: str) -> None:
    with pytest.raises(ValueError, match="fields such as"):
        check_template(template)


@pytest.mark.parametrize(
    ("distance_km", "said"),
    [
        (0.0, "at the shore"),
        (0.06, "100 m from the shore"),
        (0.94, "900 m from the shore"),
        (0.96, "1.0 km from the shore"),
        (9.94, "9.9 km from the shore"),
        (18.2, "18 km from the shore"),
    ],
)
def test_distances_from_the_shore_are_said_as_people_say_them(distance_km: float, said: str) -> None:
    assert from_shore(distance_km) == said


def test_a_narrow_lake_is_named_and_no_share_of_nothing() -> None:
    assert facts({"shore_kind": "lake", "lake_width_km": 11.0})["narrow_lake_km"] == 11.0
    assert "narrow_lake_km" not in facts({"shore_kind": "sea", "lake_width_km": 11.0})
    assert "narrow_lake_km" not in facts({"shore_kind": "lake", "lake_width_km": 60.0})
    assert "narrow_lake_km" not in facts({"shore_kind": "lake"})
    assert facts({"buildable_share": 0.2})["buildable_pct"] == pytest.approx(20.0)
    assert "buildable_pct" not in facts({"buildable_share": 0.002})


@pytest.mark.parametrize(
    ("readings", "told"),
    [
        (
            {"cold_nights": 22.0, "cold_nights_of": 25.0, "cold_depth_low_m": 30.2, "cold_depth_high_m": 44.6},
            {"cold_in_nights": "in 22 of 25 simulated nights 30–45 m of cold air"},
        ),
        (
            {"cold_nights": 3.0, "cold_nights_of": 100.0, "cold_depth_low_m": 4.1, "cold_depth_high_m": 4.3},
            {"cold_in_nights": "in 3 of 100 simulated nights 4 m of cold air"},
        ),
        ({"cold_nights": 0.0, "cold_nights_of": 25.0}, {"cold_in_none": "in none of 25 simulated nights"}),
        ({"cold_nights": float("nan"), "cold_nights_of": float("nan")}, {}),
    ],
)
def test_simulated_nights_are_counted_in_words(readings: dict[str, float], told: dict[str, str]) -> None:
    """With numbers and a range of depths; nothing where no night was simulated."""
    assert {name: text for name, text in facts(readings).items() if name.startswith("cold_in_")} == told

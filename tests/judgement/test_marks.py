"""Marks: fixed curves, and their limits where a reading is unknown."""

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sitescreen.judgement.marks import mark, mark_limits, mark_range, marks
from sitescreen.judgement.profiles import Criterion, load_profiles

PROFILES = load_profiles()


def criterion(*curve: tuple[float, float], reading: str = "rise_m") -> Criterion:
    return Criterion(
        name="one", reading=reading, question="ground", title="one", weight=1.0, curve=curve, source="test, no source"
    )


HILL = criterion((0.0, 20.0), (10.0, 100.0), (30.0, 0.0))


@pytest.mark.parametrize(
    ("value", "expected"), [(-5, 20), (0, 20), (5, 60), (10, 100), (20, 50), (30, 0), (1000, 0), (np.inf, 0)]
)
def test_marks_lie_on_the_curve_and_level_beyond_it(value: float, expected: float) -> None:
    assert mark([value], HILL)[0] == pytest.approx(expected)


def test_unknown_readings_have_no_mark() -> None:
    assert np.isnan(mark([np.nan], HILL)[0])
    table = marks(pd.DataFrame({"slope_deg": [2.0]}), PROFILES["upland"])
    assert table["mark_slope"].tolist() == [100.0]
    assert table.drop(columns="mark_slope").isna().all(axis=None)


@pytest.mark.parametrize(
    ("low", "high", "expected"),
    [(2, 4, (36, 52)), (5, 20, (50, 100)), (-np.inf, np.inf, (0, 100)), (20, np.inf, (0, 50)), (10, 10, (100, 100))],
)
def test_the_range_of_marks_over_a_range_of_readings(low: float, high: float, expected: tuple[float, float]) -> None:
    lowest, highest = mark_range(np.array([float(low)]), np.array([float(high)]), HILL)
    assert (lowest[0], highest[0]) == pytest.approx(expected)


@given(
    steps=st.lists(st.tuples(st.floats(0.1, 50), st.floats(0, 100)), min_size=2, max_size=6),
    ends=st.tuples(st.floats(-20, 320), st.floats(-20, 320)).map(sorted),
    part=st.floats(0, 1),
)
def test_no_reading_inside_a_range_leaves_the_range_of_marks(
    steps: list[tuple[float, float]], ends: list[float], part: float
) -> None:
    values = np.cumsum([step for step, _ in steps])
    one = criterion(*((float(value), points) for value, (_, points) in zip(values, steps, strict=True)))
    low, high = (np.array([end]) for end in ends)
    lowest, highest = mark_range(low, high, one)
    inside = mark(low + part * (high - low), one)
    assert lowest[0] - 1e-9 <= inside[0] <= highest[0] + 1e-9


def test_a_known_reading_leaves_no_range() -> None:
    lowest, highest = mark_limits(pd.DataFrame({"slope_deg": [5.0, np.nan]}), PROFILES["hot_arid"])
    known = marks(pd.DataFrame({"slope_deg": [5.0]}), PROFILES["hot_arid"])["mark_slope"][0]
    assert lowest["mark_slope"].tolist() == [known, 0.0]
    assert highest["mark_slope"].tolist() == [known, 100.0]


def test_level_ground_of_no_direction_is_nearly_certain() -> None:
    readings = pd.DataFrame({"slope_deg": [0.5, 10.0], "aspect_deg": [np.nan, np.nan], "facing_ns": [np.nan, np.nan]})
    lowest, highest = mark_limits(readings, PROFILES["upland"])
    assert lowest["mark_facing"].tolist() == pytest.approx([60 - 1.5, 30])
    assert highest["mark_facing"].tolist() == pytest.approx([60 + 2, 100])


@pytest.mark.parametrize(
    ("zone", "reading", "better", "worse"),
    [
        ("hot_humid_coast", "breeze_reach", 0.95, 0.4),
        ("hot_humid_coast", "ventilation", 1.3, 0.7),
        ("hot_humid_coast", "pond_depth_m", 0.0, 2.0),
        ("lake_basin", "breeze_reach", 0.8, 0.3),
        ("hot_arid", "rise_m", 20.0, -15.0),
        ("hot_arid", "cold_deficit_k", 3.0, 0.0),
        ("savannah", "rise_m", 20.0, -15.0),
        ("savannah", "cold_deficit_k", 1.0, 4.0),
        ("upland", "cold_deficit_k", 0.0, 2.0),
        ("upland", "ridge_exposure", 0.7, 1.3),
        ("high_upland", "ridge_exposure", 0.7, 1.3),
        ("upland", "morning_sun_share", 1.0, 0.8),
        ("high_upland", "morning_sun_share", 1.0, 0.8),
        ("hot_arid", "west_load_kwh_m2", 2.3, 3.0),
        ("savannah", "west_load_kwh_m2", 2.3, 3.0),
        ("upland", "facing_ns", 1.0, -1.0),
    ],
)
def test_each_zone_wants_what_its_climate_wants(zone: str, reading: str, better: float, worse: float) -> None:
    """Directions from design practice: Koenigsberger et al. 1974 and UN 1971 for air and night cold; else no source."""
    one = next(criterion for criterion in PROFILES[zone].criteria if criterion.reading == reading)
    good, bad = mark([better, worse], one)
    assert good > bad + 15


def test_high_uplands_take_cold_and_wind_harder_than_uplands() -> None:
    for name, values in (("cold", [0.5, 1.0, 2.0]), ("shelter", [1.1, 1.2, 1.4])):
        high = mark(values, PROFILES["high_upland"].by_name[name])
        assert (high < mark(values, PROFILES["upland"].by_name[name])).all()
        assert PROFILES["high_upland"].by_name[name].weight > PROFILES["upland"].by_name[name].weight

"""What is said of the wind's figures."""

import numpy as np
import pandas as pd

from sitescreen.inputs.wind import SLOTS, Rose, WindTable, assumed_wind
from sitescreen.judgement.wind_notes import method_note, place_notes
from sitescreen.settings import load_defaults

WIND = load_defaults().wind


def test_what_the_method_is_not_for_is_always_said_and_plots_on_steep_ground_named() -> None:
    plots = pd.DataFrame({"wind_outside_share": [0.0, 0.6, np.nan, 0.5]}, index=list("abcd"))
    found = method_note(plots, WIND)
    assert found.level == "warning"
    assert "1 of 3 plots lie mostly on such slopes (b)" in found.text
    for word in ("calm nights", "gusts", "0.3 (17°)", "level ground"):
        assert word in found.text
    level = method_note(plots.iloc[[0]], WIND)
    assert (level.level, "no plot lies mostly" in level.text) == ("info", True)


def table(*heights: float, blended: bool = False) -> WindTable:
    """Places at 39°, 40° … east on the equator."""
    rose = Rose(np.array([90.0]), np.array([1.0]), np.array([3.0]), 0.0, False)
    places = tuple((39.0 + k, 0.0) for k in range(len(heights)))
    roses = {(slot, k): rose for slot in SLOTS for k in range(len(heights))}
    return WindTable(places, roses, False, None, (), heights, blended)


LON, LAT, HEIGHT = np.array([39.1, 39.2, 39.9, 39.3]), np.zeros(4), np.array([120.0, 950.0, 880.0, np.nan])


def test_each_place_says_whom_it_serves_how_far_off_and_how_much_lower() -> None:
    """0.1° on the equator is 11.1 km."""
    low, high = place_notes(table(100.0, 900.0), LON, LAT, HEIGHT, WIND)
    assert "serves 2 plots, 11 to 22 km away, 20 m above to 850 m above it (it lies at 100 m)" in low.text
    assert "another wind blows" in low.text
    assert low.level == "warning"
    assert "serves 1 plot, 11 to 11 km away, 20 m below it (it lies at 900 m)" in high.text
    assert high.level == "info"


def test_an_unknown_height_is_said_to_be_unknown() -> None:
    (one,) = place_notes(table(np.nan), LON, LAT, HEIGHT, WIND)
    assert "its height is not given" in one.text


def test_blended_places_count_for_all_plots() -> None:
    first, second = place_notes(table(100.0, 900.0, blended=True), LON, LAT, HEIGHT, WIND)
    assert "counts, with the others, for 3 plots" in first.text
    assert "counts, with the others, for 3 plots" in second.text


def test_without_a_table_or_a_place_there_is_nothing_to_say() -> None:
    assert place_notes(assumed_wind(), LON, LAT, HEIGHT, WIND) == ()
    assert place_notes(table(100.0), LON, LAT, np.full(4, np.nan), WIND) == ()

"""The Mahoney indicators."""

from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.mahoney import asks_for, mahoney, second_opinion, zone_doubt
from sitescreen.climate.normals import plot_climate
from sitescreen.inputs.normals import Normals
from sitescreen.inputs.stamps import FileStamp
from sitescreen.settings import load_defaults

# Mahoney sheet of Kisumu (0°06' S, 34°48' E, 1146 m), as published; UN 1971 method
KISUMU_MAX = [30.8, 32.5, 32.8, 31.5, 28.7, 29.6, 29.4, 31.6, 31.4, 31.5, 30.4, 30.5]
KISUMU_MIN = [14.7, 14.8, 16.9, 16.9, 17.1, 15.1, 15.3, 15.0, 16.0, 15.7, 16.2, 15.2]
KISUMU_RANGE = [16.1, 17.7, 15.9, 14.6, 11.6, 14.5, 14.1, 16.6, 15.4, 15.8, 14.2, 15.3]
# the sheet's humidity groups are 2 in January and 3 in all other months, and one month has more than 200 mm; these
# figures only stand for that
KISUMU_RH = [45.0] + [60.0] * 11
KISUMU_RAIN = [100.0] * 3 + [210.0] + [100.0] * 8


def test_kisumu_is_as_its_published_sheet_but_for_one_printed_slip() -> None:
    """The sheet prints A1 11; its own ranges are above 10 K in groups 2 and 3 in all twelve months, so A1 is 12."""
    found = mahoney(KISUMU_MAX, KISUMU_MIN, KISUMU_RH, KISUMU_RAIN)
    assert np.subtract(KISUMU_MAX, KISUMU_MIN) == pytest.approx(KISUMU_RANGE, abs=1e-9)
    assert found.annual_mean_c == pytest.approx(23.75, abs=0.06)  # the sheet works in steps of 0.5 °C
    assert found.annual_range_k == pytest.approx(18.1, abs=1e-9)
    assert "".join("COH"[one + 1] for one in found.day[0]) == "OHHHOHHHHHHH"
    assert "".join("COH"[one + 1] for one in found.night[0]) == "CCCCOCCCCCCC"
    assert {name: int(months[0]) for name, months in found.months.items()} == {
        "H1": 0, "H2": 0, "H3": 1, "A1": 12, "A2": 0, "A3": 0,
    }  # fmt: skip
    # with 11 or with 12 the same row of the layout table
    for a1 in (11, 12):
        told = asks_for({"H1": 0, "H2": 0, "H3": 1, "A1": a1, "A2": 0, "A3": 0})
        assert told[:2] == ("compact layout round courtyards", "compact spacing")
        assert "very small openings (10–20 %)" in told


@pytest.mark.parametrize(
    ("high", "low", "humidity", "expected"),
    [
        # by the table of comfort limits; each figure just inside or outside one limit
        (27.0, 21.0, 80.0, {"H1": 0, "H2": 12, "A1": 0}),  # group 4, comfort to 27 by day
        (27.1, 21.0, 80.0, {"H1": 12, "H2": 0, "A1": 0}),
        (29.1, 20.0, 60.0, {"H1": 12, "H2": 0, "A1": 0}),  # group 3 counts if the range is under 10 K
        (30.5, 20.0, 60.0, {"H1": 0, "A1": 12, "A2": 0}),
        (31.5, 20.0, 40.0, {"H1": 0, "A1": 12, "A2": 12}),  # group 2: hot by day, comfortable by night
        (38.0, 26.0, 20.0, {"A1": 12, "A2": 12}),  # group 1, hot by night
        (20.9, 15.0, 60.0, {"A3": 12, "A1": 0}),  # mean 17.95: comfort from 21 by day in group 3
        (21.0, 15.0, 60.0, {"A3": 0}),
    ],
)
def test_indicators_turn_at_the_limits_of_the_tables(
    high: float, low: float, humidity: float, expected: dict[str, int]
) -> None:
    year = np.ones(12)
    found = mahoney(high * year, low * year, humidity * year, 0.0 * year)
    assert {name: int(found.months[name][0]) for name in expected} == expected


@pytest.mark.parametrize(("humidity", "group"), [(29.9, 1), (30.0, 2), (50.0, 2), (50.1, 3), (70.0, 3), (70.1, 4)])
def test_humidity_groups(humidity: float, group: int) -> None:
    year = np.ones(12)
    assert mahoney(25 * year, 18 * year, humidity * year, year).group[0, 0] == group


def test_the_zone_is_doubted_only_where_the_months_speak_against_it() -> None:
    dry = {"H1": 0, "H2": 0, "H3": 0, "A1": 12, "A2": 0, "A3": 0}
    humid = {"H1": 12, "H2": 0, "H3": 1, "A1": 0, "A2": 0, "A3": 0}
    assert "no humid month" in zone_doubt(dry, "lake_basin")
    assert "12 humid months" in zone_doubt(humid, "hot_arid")
    assert not zone_doubt(humid, "hot_humid_coast")
    assert not zone_doubt(dry, "savannah")
    assert not zone_doubt(dry, "upland")


def test_the_humid_coast_asks_for_breeze_and_the_desert_for_mass() -> None:
    coast = asks_for({"H1": 12, "H2": 0, "H3": 3, "A1": 0, "A2": 0, "A3": 0})
    assert {"open spacing for the breeze", "large openings (40–80 % of the wall)", "light walls"} <= set(coast)
    assert "protection from heavy rain" in coast
    arid = asks_for({"H1": 0, "H2": 0, "H3": 0, "A1": 8, "A2": 8, "A3": 0})
    assert {"heavy walls", "a heavy roof", "room to sleep outdoors", "medium openings (20–40 %)"} <= set(arid)


def test_plots_are_judged_at_their_own_height() -> None:
    """2,000 m above its station the days would be 13 K cooler: cold instead of hot."""
    stations = pd.DataFrame(
        {
            "station": "K", "lon": 34.8, "lat": -0.1, "elevation_m": 1146.0, "month": range(1, 13),
            "t_max_c": KISUMU_MAX, "t_min_c": KISUMU_MIN, "rh_mean": KISUMU_RH, "rain_mm": KISUMU_RAIN,
        }
    )  # fmt: skip
    normals = Normals(stations, FileStamp("n.csv", 1, "", ""), ())
    height = np.array([1146.0, 3146.0, np.nan])
    climate = plot_climate(normals, np.full(3, 34.8), np.full(3, -0.1), height, load_defaults().zones)
    told = second_opinion(normals, climate, pd.Series(["lake_basin", "upland", ""]))
    assert told["mahoney"][0] == "H1 0, H2 0, H3 1, A1 12, A2 0, A3 0"
    assert "no humid month" in told["mahoney_says"][0]
    assert told["mahoney"][1].startswith("H1 0, H2 0, H3 1, A1 12, A2 0, A3 ")
    cooler = mahoney(np.subtract(KISUMU_MAX, 13.0), np.subtract(KISUMU_MIN, 13.0), KISUMU_RH, KISUMU_RAIN)
    assert int(cooler.months["A3"][0]) > 0
    assert told["mahoney"][1].endswith(f"A3 {int(cooler.months['A3'][0])}")
    assert told["mahoney"][2] == ""
    assert told["mahoney_says"][2] == ""


def test_the_words_name_the_station(tmp_path: Path) -> None:
    year = pd.DataFrame({"station": "Some pier", "lon": 40.0, "lat": 0.0, "elevation_m": 0.0, "month": range(1, 13),
                         "t_max_c": 31.0, "t_min_c": 24.0, "rh_mean": 80.0, "rain_mm": 90.0})  # fmt: skip
    normals = Normals(year, FileStamp("n.csv", 1, "", ""), ())
    climate = plot_climate(normals, np.array([40.0]), np.array([0.0]), np.array([5.0]), load_defaults().zones)
    told = second_opinion(normals, climate, pd.Series(["hot_humid_coast"]))
    assert told["mahoney_says"][0].startswith("From the normals of Some pier, moved to the plot's height")

"""Questions, classes and the pictures that answer."""

from typing import Any

import numpy as np
import pytest

from sitescreen.deliverables.classes import RAMP, class_of, class_ranges, marks_by
from sitescreen.deliverables.columns import BY_NAME
from sitescreen.deliverables.questions import asked_here, field_picture, question_marks, views, zones_here
from sitescreen.deliverables.relief import water_on
from sitescreen.deliverables.sheet import by_quantity, on_sheet, sheet_for

SLOPE = ((2.0, 100.0), (6.0, 60.0), (10.0, 20.0), (12.0, 0.0))


def test_classes_are_steps_of_twenty_marks() -> None:
    got = class_of(np.array([0, 19.9, 20, 59, 80, 100, np.nan], np.float32))
    assert got[:6].tolist() == [0, 0, 1, 2, 4, 4]
    assert np.isnan(got[6])


def test_marks_follow_the_curve_and_are_level_beyond_it() -> None:
    got = marks_by(SLOPE, np.array([0, 4, 8, 30, np.nan], np.float32))
    assert got[:4].tolist() == [100, 80, 40, 0]
    assert np.isnan(got[4])


def test_legend_says_what_each_class_holds() -> None:
    """By hand: the curve falls 10 marks a degree, so 80, 60, 40, 20 lie at 4, 6, 8, 10°."""
    ranges = class_ranges(SLOPE, BY_NAME["slope_deg"])
    assert [one.number for one in ranges] == [4, 3, 2, 1, 0]
    assert [one.words for one in ranges] == ["under 4°", "4–6°", "6–8°", "8–10°", "over 10°"]


def test_legend_of_a_curve_that_rises_and_falls() -> None:
    ranges = class_ranges(((0.0, 0.0), (1.0, 100.0), (2.0, 0.0)), BY_NAME["breeze_reach"])
    assert ranges[0].words == "80–120 %"
    assert ranges[-1].words == "under 20 % or over 180 %"


def test_a_class_that_no_reading_reaches_is_left_out() -> None:
    assert class_ranges(((0.0, 70.0), (1.0, 100.0)), BY_NAME["rise_m"])[-1].words == ""


def test_question_marks_are_the_weighted_means_of_the_profile(screening: Any) -> None:
    """Worked out again here, plot by plot, from the table's own marks."""
    table = screening.table
    got = question_marks(table, screening.profiles, "ground")
    for i, row in table.iterrows():
        pairs = [
            (c.weight, row[f"mark_{c.name}"])
            for c in screening.profiles[row["zone"]].criteria
            if c.question == "ground" and not np.isnan(row.get(f"mark_{c.name}", np.nan))
        ]
        assert got[i] == pytest.approx(sum(w * m for w, m in pairs) / sum(w for w, _ in pairs), rel=1e-12)


def test_unknown_marks_stay_unknown(screening: Any) -> None:
    """Plot 2 lies on the coast, where only ventilation speaks for the wind, and has none."""
    coast = (screening.table["zone"] == "hot_humid_coast").to_numpy()
    unknown = np.isnan(question_marks(screening.table, screening.profiles, "wind"))
    assert screening.table["plot"][unknown & coast].tolist() == ["2"]
    assert np.isnan(question_marks(screening.table, screening.profiles, "nobody asks this")).all()


def test_questions_are_those_of_the_zones_at_hand(invent: Any) -> None:
    coast = invent(zones=("hot_humid_coast", "hot_humid_coast"))
    names = [one.name for one in asked_here(coast.table, coast.profiles)]
    assert "breeze" in names
    assert names == [n for n in ("breeze", "wind", "cold", "sun", "ground", "own") if n in names]
    assert zones_here(coast.table) == ["hot_humid_coast"]


def test_picture_colours_match_the_marks_of_the_ground(screening: Any) -> None:
    """Each colour in the picture is the ramp's for that pixel's mark; water and the unknown are clear."""
    groups = by_quantity(screening.fields)
    sheet = sheet_for(screening.table, groups["elevation_m"])
    water = water_on(groups["shore_distance_km"], sheet)
    assert water.any()
    part = on_sheet(groups["slope_deg"][0], sheet)
    picture = field_picture([part], SLOPE, sheet, water)
    drawn = picture[picture[..., 3] == 255][:, :3]
    colours = {tuple(int(c[i : i + 2], 16) for i in (1, 3, 5)) for c in RAMP}
    assert {tuple(int(v) for v in c) for c in np.unique(drawn, axis=0)} <= colours
    assert (picture[water][:, 3] == 0).all()


def test_zones_that_want_different_things_get_views_of_their_own(screening: Any) -> None:
    groups = by_quantity(screening.fields)
    sheet = sheet_for(screening.table, groups["elevation_m"])
    water = np.zeros((sheet.rows, sheet.cols), bool)
    wind = views("wind", screening.table, screening.profiles, screening.fields, sheet, water)
    assert {view.reading for view in wind} == {"ventilation", "ridge_exposure"}
    assert sorted(zone for view in wind for zone in view.zones) == ["hot_humid_coast", "upland"]


def test_a_question_without_its_field_falls_back_and_marks_nothing(screening: Any) -> None:
    fields = {key: field for key, field in screening.fields.items() if key != "breeze_reach"}
    sheet = sheet_for(screening.table, [fields["elevation_m"]])
    water = np.zeros((sheet.rows, sheet.cols), bool)
    (view,) = views("breeze", screening.table, screening.profiles, fields, sheet, water)
    assert view.reading == "shore_distance_km"
    assert view.zones == ()
    assert views("sun", screening.table, screening.profiles, {}, sheet, water) == ()

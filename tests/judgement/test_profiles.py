"""Zone profiles: what is shipped, and a planner's own."""

import json
from collections.abc import Callable
from itertools import combinations
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.zones import ZoneShares
from sitescreen.errors import ConfigError
from sitescreen.judgement.marks import mark_limits, marks
from sitescreen.judgement.overall import judge
from sitescreen.judgement.profiles import ZoneProfile, load_profiles, wind_slots
from sitescreen.judgement.reasons import load_words, reasons
from sitescreen.settings import config_folder, load_defaults

PROFILES = load_profiles()

MINE = """
zone = "{zone}"
title = "Mine"
wants = "Level ground."

[[criteria]]
name = "level"
reading = "{reading}"
question = "ground"
title = "slope"
unit = "°"
weight = {weight}
curve = {curve}
source = "common practice, no source"
"""


def own(folder: Path, **changes: object) -> Path:
    values = {"zone": "my_island", "reading": "slope_deg", "weight": 10, "curve": "[[0, 100], [10, 0]]", **changes}
    (folder / "mine.toml").write_text(MINE.format(**values), encoding="utf-8")
    return folder


def test_the_six_zones_come_in_their_order() -> None:
    assert list(PROFILES) == list(load_defaults().zones.with_normals)
    assert len(PROFILES) == 6


@pytest.mark.parametrize("profile", PROFILES.values(), ids=list(PROFILES))
def test_every_criterion_says_where_it_comes_from(profile: ZoneProfile) -> None:
    for criterion in profile.criteria:
        named = any(char.isdigit() for char in criterion.source)  # a year
        assert named or "no source" in criterion.source, criterion.name


@pytest.mark.parametrize("profile", PROFILES.values(), ids=list(PROFILES))
def test_no_two_criteria_measure_the_same_thing(profile: ZoneProfile) -> None:
    """Readings that follow closely from one another may not both be weighed; correlations are tested elsewhere."""
    families = [
        {"ventilation", "ridge_exposure", "rise_m"},
        {"cold_deficit_k", "cold_pool_depth_m", "pond_depth_m"},
        {"cold_deficit_k", "cold_pool_depth_m", "still_air"},
        {"slope_deg", "buildable_share"},
        {"breeze_reach", "shore_distance_km"},
        {"sky_view", "slope_deg"},
        {"cool_gain_kwh_m2", "slope_deg"},
        {"sun_cool_morning_h", "morning_sun_share"},
        {"sun_year_h", "sky_view"},
    ]
    for one, other in combinations([criterion.reading for criterion in profile.criteria], 2):
        assert one != other
        assert not any({one, other} <= family for family in families), (one, other)


@pytest.mark.parametrize("profile", PROFILES.values(), ids=list(PROFILES))
def test_curves_use_the_scale_and_an_ordinary_plot_lies_on_them(profile: ZoneProfile) -> None:
    for criterion in profile.criteria:
        assert criterion.best_mark == 100.0, criterion.name
        assert criterion.worst_mark <= 55.0, criterion.name
        assert criterion.worst_mark <= criterion.ordinary_mark <= criterion.best_mark


def test_weights_are_parts_of_a_hundred() -> None:
    for profile in PROFILES.values():
        assert sum(criterion.weight for criterion in profile.criteria) == 100.0


def test_every_criterion_has_its_sentences() -> None:
    names = {criterion.name for profile in PROFILES.values() for criterion in profile.criteria}
    assert names == set(load_words().criteria)


def test_a_name_means_one_reading_in_all_profiles() -> None:
    readings: dict[str, str] = {}
    for profile in PROFILES.values():
        for criterion in profile.criteria:
            assert readings.setdefault(criterion.name, criterion.reading) == criterion.reading


def test_the_coasts_breeze_band_ends_at_8_km() -> None:
    """Reach at 8 km is 1 − 8/(3 m/s × 3.6 × 8 h) = 0.907, so the band that designers use has the full mark."""
    curve = dict(PROFILES["hot_humid_coast"].by_name["breeze"].curve)
    assert max(value for value, mark in curve.items() if mark < 100) < 0.9 <= 1 - 8 / (3 * 3.6 * 8)
    assert curve[0.9] == 100


def test_curve_in_words() -> None:
    assert PROFILES["upland"].by_name["facing"].curve_in_words() == "-1 → 30, 0 → 60, 1 → 100"
    assert PROFILES["upland"].by_name["cold"].curve_in_words().endswith("4 → 0 (K)")


def test_a_folder_adds_and_replaces(tmp_path: Path) -> None:
    added = load_profiles(own(tmp_path))
    assert list(added) == [*PROFILES, "my_island"]
    replaced = load_profiles(own(tmp_path, zone="upland"))
    assert list(replaced) == list(PROFILES)
    assert replaced["upland"].title == "Mine"
    assert replaced["savannah"] == PROFILES["savannah"]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"weight": -1}, r"mine\.toml has criteria\.1\.weight = -1; a number above 0 to 1000 is needed"),
        ({"curve": "[[0, 100], [10, 120]]"}, r"criteria\.1\.curve\.2\.2 = 120; .*less than or equal to 100"),
        ({"curve": "[[5, 100], [5, 0]]"}, r"criteria\.1\.curve .*rise from point to point"),
        ({"curve": "[[5, 100]]"}, r"criteria\.1\.curve "),
        ({"reading": "slope"}, r"criterion 'level' look at 'slope'; one of the readings elevation_m, slope_deg"),
        ({"zone": "My Island"}, r"mine\.toml has zone = 'My Island'"),
    ],
)
def test_a_wrong_profile_is_refused(tmp_path: Path, change: dict[str, object], message: str) -> None:
    with pytest.raises(ConfigError, match=message):
        load_profiles(own(tmp_path, **change))


def test_an_unknown_key_is_refused_with_the_nearest(tmp_path: Path) -> None:
    path = own(tmp_path) / "mine.toml"
    path.write_text(path.read_text(encoding="utf-8").replace("question =", "questions ="), encoding="utf-8")
    with pytest.raises(ConfigError, match=r"unknown key 'criteria\.1\.questions'.*'question' was meant"):
        load_profiles(tmp_path)


def test_only_readings_of_the_wind_have_slots_and_only_those_there_are(tmp_path: Path) -> None:
    text = own(tmp_path).joinpath("mine.toml").read_text(encoding="utf-8")
    slope = text.replace('question = "ground"', 'slot = "year"\nquestion = "ground"')
    (tmp_path / "mine.toml").write_text(slope, encoding="utf-8")
    with pytest.raises(ConfigError, match="a slot only with one of the readings ventilation"):
        load_profiles(tmp_path)
    (tmp_path / "mine.toml").write_text(slope.replace("slope_deg", "ventilation"), encoding="utf-8")
    criterion = load_profiles(tmp_path)["my_island"].criteria[0]
    assert criterion.column == "ventilation_year"
    assert wind_slots(load_profiles(tmp_path)) == {("ventilation", "year")}
    wrong = slope.replace("slope_deg", "ventilation").replace('"year"', '"noon"')
    (tmp_path / "mine.toml").write_text(wrong, encoding="utf-8")
    with pytest.raises(ConfigError, match=r"criteria\.1\.slot.*'hot_afternoon', 'hot_night', 'cool_night' or 'year'"):
        load_profiles(tmp_path)


def test_the_shipped_profiles_name_the_slot_of_their_wind() -> None:
    winds = {one.reading: one.slot for profile in PROFILES.values() for one in profile.criteria if one.slot}
    assert winds == {"ventilation": "hot_afternoon", "ridge_exposure": "year"}
    assert wind_slots(PROFILES) == frozenset()


def test_a_name_twice_is_refused(tmp_path: Path) -> None:
    path = own(tmp_path) / "mine.toml"
    text = path.read_text(encoding="utf-8")
    path.write_text(text + text[text.index("[[criteria]]") :], encoding="utf-8")
    with pytest.raises(ConfigError, match=r"mine\.toml does not hold together; a name of its own for each criterion"):
        load_profiles(tmp_path)


def test_empty_and_missing_folders_are_refused(tmp_path: Path) -> None:
    with pytest.raises(ConfigError, match=r"holds no \.toml file"):
        load_profiles(tmp_path)
    with pytest.raises(ConfigError, match="there is no folder"):
        load_profiles(tmp_path / "none")


def test_two_profiles_for_one_zone_are_refused(tmp_path: Path) -> None:
    text = (own(tmp_path) / "mine.toml").read_text(encoding="utf-8")
    (tmp_path / "second.toml").write_text(text, encoding="utf-8")
    with pytest.raises(ConfigError, match=r"second\.toml is a second profile for the zone 'my_island'"):
        load_profiles(tmp_path)


def test_the_files_are_named_after_their_zones() -> None:
    assert sorted(path.stem for path in (config_folder() / "zones").glob("*.toml")) == sorted(PROFILES)


KINDS = """
zone = "mine"
title = "Mine"
wants = "Air that moves."
[[criteria]]
name = "air"
reading = "cold_pool_kind"
question = "cold"
title = "night air"
weight = 10
kinds = {none = 60, closed = 0, leaky = 20, moving = 100}
source = "x"
says = "At night the air there is {cold_pool_kind}."
"""


def test_words_earn_marks_by_their_kind(tmp_path: Path) -> None:
    (tmp_path / "mine.toml").write_text(KINDS, encoding="utf-8")
    profile = load_profiles(tmp_path)["mine"]
    readings = pd.DataFrame({"cold_pool_kind": ["moving", "none", "leaky", "closed", "unknown", ""]})
    assert marks(readings, profile)["mark_air"].tolist() == pytest.approx([100, 60, 20, 0, np.nan, np.nan], nan_ok=True)
    lowest, highest = mark_limits(readings, profile)
    assert lowest["mark_air"].tolist() == [100, 60, 20, 0, 0, 0]
    assert highest["mark_air"].tolist() == [100, 60, 20, 0, 100, 100]
    assert profile.by_name["air"].curve_in_words() == "none → 60, closed → 0, leaky → 20, moving → 100"
    # as the record keeps it
    assert ZoneProfile.model_validate(json.loads(profile.model_dump_json())) == profile


@pytest.mark.parametrize(
    ("change", "says"),
    [
        (("leaky = 20, ", ""), "a mark for each of none, closed, leaky, moving"),
        (("none = 60", "nothing = 60"), "a mark for each of none, closed, leaky, moving"),
        (("moving = 100", "moving = 101"), "101"),
        (('"cold_pool_kind"', '"slope_deg"'), "slope_deg is a number"),
        (("source", "curve = [[0, 0], [1, 100]]\nsource"), "either a curve or kinds"),
        ((KINDS.split("\n")[-4], "curve = [[0, 0], [1, 9]]"), "kinds with a mark"),
    ],
)  # fmt: skip
def test_kinds_are_checked(tmp_path: Path, change: tuple[str, str], says: str) -> None:
    (tmp_path / "mine.toml").write_text(KINDS.replace(*change), encoding="utf-8")
    with pytest.raises(ConfigError, match=says):
        load_profiles(tmp_path)


def test_a_kind_has_its_reason(
    plots: Callable[..., pd.DataFrame], in_zone: Callable[..., ZoneShares], tmp_path: Path
) -> None:
    (tmp_path / "mine.toml").write_text(KINDS.replace('"mine"', '"upland"'), encoding="utf-8")
    profiles = load_profiles(tmp_path)
    readings = plots({"cold_pool_kind": "moving"})
    judged = judge(readings, in_zone(readings, "upland"), profiles, (), load_defaults().judgement)
    told = reasons(judged, pd.DataFrame(index=readings.index), profiles, load_defaults().judgement)
    assert told["a"].for_ == ("At night the air there is moving.",)

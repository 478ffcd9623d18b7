"""A planner's own constraints and criteria."""

import re
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
from shapely.geometry import LineString, box

from sitescreen.brief import Brief, checked_brief
from sitescreen.errors import BriefError, InputError
from sitescreen.judgement.own import (
    check_names,
    own_readings,
    own_rules,
    short_name,
    still_unchecked,
    with_own_criteria,
)
from sitescreen.judgement.profiles import load_profiles

PROFILES = load_profiles()
CURVE = [[0, 100], [500, 80], [3000, 0]]


def brief_of(folder: Path, constraint: list[dict[str, Any]] = [], criterion: list[dict[str, Any]] = []) -> Brief:  # noqa: B006
    content = {"terrain": {"files": ["t.tif"]}, "plots": {"file": "plots.gpkg"}}
    return checked_brief(content | {"constraint": constraint, "criterion": criterion}, folder, "brief.toml")


@pytest.fixture
def plots() -> Any:
    """Three squares of 100 m, 1 km apart on a line to the east, with a price that is not always told."""
    squares = [box(500_000 + 1000 * k, 0, 500_100 + 1000 * k, 100) for k in range(3)]
    table = gpd.GeoDataFrame(
        {"plot": ["A", "B", "C"], "own:Price": ["35,5", "ask", None]}, geometry=squares, crs="EPSG:32637"
    ).to_crs("EPSG:4326")
    return table.assign(lon=table.geometry.representative_point().x)


@pytest.fixture
def roads(tmp_path: Path) -> Path:
    """One road that crosses the first plot and passes 200 m off the second."""
    line = LineString([(500_050, -5000), (500_050, 0), (501_300, 0), (501_300, 5000)])
    gpd.GeoDataFrame(geometry=[line], crs="EPSG:32637").to_file(tmp_path / "roads.gpkg")
    return tmp_path


def test_names_become_columns() -> None:
    assert [short_name(name) for name in ("Road, paved", "rivière", "2020 flood", "Straße")] == [
        "road_paved", "riviere", "own_2020_flood", "strasse",
    ]  # fmt: skip


def test_names_in_other_scripts_stay_apart() -> None:
    names = ("水", "道路", "дорога", "дорога 2", "मार्ग", "سڑک", "Road 道")
    short = [short_name(name) for name in names]
    assert len(set(short)) == len(names)
    assert all(re.fullmatch(r"[a-z][a-z0-9_]*", one) for one in short)
    assert short[-1].startswith("road_")
    assert short == [short_name(name) for name in names]


def test_a_constraint_speaks_within_its_buffer(roads: Path, plots: Any) -> None:
    brief = brief_of(roads, [{"name": "road", "file": "roads.gpkg", "buffer_m": 700, "level": "note"}])
    found = own_readings(brief, plots)
    # the road runs along the plots' southern edge up to 501,300 m east
    assert found.values["metres_to_constraint_road"].to_numpy() == pytest.approx([0, 0, 700 / 0.9996], abs=0.1)
    assert found.values["constraint_road"].tolist() == [1.0, 1.0, 0.0]
    assert [stamp.name for stamp in found.stamps] == ["roads.gpkg"]


def test_rules_carry_level_and_words(tmp_path: Path) -> None:
    brief = brief_of(
        tmp_path,
        [
            {"name": "river", "file": "r.gpkg", "buffer_m": 30, "level": "stop", "say": "inside the {old} reserve."},
            {"name": "flood", "file": "f.gpkg"},
            {"name": "mast", "file": "m.gpkg", "buffer_m": 250},
        ],
    )
    rules = own_rules(brief.constraint)
    assert [rule.level for rule in rules] == ["stop", "concern", "concern"]
    assert [rule.say[0] for rule in rules] == ["inside the (old) reserve", "in flood", "within 250 m of mast"]
    assert [rule.name for rule in rules] == ["constraint_river", "constraint_flood", "constraint_mast"]


def test_a_column_of_the_plots_with_gaps_that_say_why(roads: Path, plots: Any) -> None:
    brief = brief_of(roads, [], [{"name": "cost", "column": "price", "curve": [[10, 100], [60, 0]], "weight": 5}])
    found = own_readings(brief, plots)
    assert found.values["own_cost"].tolist() == pytest.approx([35.5, np.nan, np.nan], nan_ok=True)
    assert found.why_unknown["own_cost"].tolist() == ["", "its “Price” is no plain number", "its “Price” is empty"]


@pytest.mark.parametrize(
    ("given", "means"),
    [
        ("1,200", None),
        ("1,200,000", None),
        ("0,125", 0.125),
        ("12,5", 12.5),
        ("1200", 1200.0),
        ("1,20", 1.2),
        ("inf", None),
    ],
)
def test_a_comma_is_read_only_where_it_can_mean_one_thing(roads: Path, plots: Any, given: str, means: Any) -> None:
    plots["own:Price"] = [given, "1", "2"]
    brief = brief_of(roads, [], [{"name": "cost", "column": "Price", "curve": [[10, 100], [60, 0]], "weight": 5}])
    value = own_readings(brief, plots).values.at["A", "own_cost"]
    assert np.isnan(value) if means is None else value == means


def test_a_column_that_cannot_serve_is_refused(roads: Path, plots: Any) -> None:
    def read(column: str) -> None:
        own_readings(brief_of(roads, [], [{"name": "x", "column": column, "curve": CURVE, "weight": 1}]), plots)

    with pytest.raises(InputError, match="Did you mean “Price”"):
        read("Pryce")
    plots["own:Price"] = ["a", "b", "c"]
    with pytest.raises(InputError, match="holds no number"):
        read("Price")


def test_a_criterion_joins_every_zone(tmp_path: Path) -> None:
    brief = brief_of(tmp_path, [], [{"name": "Road", "file": "roads.gpkg", "curve": CURVE, "weight": 10}])
    profiles = with_own_criteria(PROFILES, brief.criterion, 30.0)
    assert list(profiles) == list(PROFILES)
    for zone, profile in profiles.items():
        one = profile.by_name["road"]
        assert profile.criteria[:-1] == PROFILES[zone].criteria
        assert (one.question, one.reading, one.weight, one.weight_spread_pct) == ("own", "own_road", 10.0, 30.0)
        assert one.curve == ((0.0, 100.0), (500.0, 80.0), (3000.0, 0.0))
        assert one.says == "{own_road:,.0f} m from the nearest Road, a mark of {mark:.0f} out of 100."


@pytest.mark.parametrize(
    ("constraint", "criterion", "says"),
    [
        (["river", "River!"], [], r"\[\[constraint\]\] 2, 'River!', is called as an earlier one"),
        ([], ["road", "ROAD"], r"\[\[criterion\]\] 2, 'ROAD', is called as an earlier one"),
        ([], ["slope"], "as a criterion of the climate zones"),
    ],
)
def test_names_that_clash_are_refused(tmp_path: Path, constraint: list[str], criterion: list[str], says: str) -> None:
    brief = brief_of(
        tmp_path,
        [{"name": name, "file": "x.gpkg"} for name in constraint],
        [{"name": name, "file": "x.gpkg", "curve": CURVE, "weight": 1} for name in criterion],
    )
    with pytest.raises(BriefError, match=says):
        check_names(brief, PROFILES)
    check_names(brief_of(tmp_path, [{"name": "road", "file": "x.gpkg"}]), PROFILES)


def test_a_hazard_is_checked_only_where_a_constraint_names_it(tmp_path: Path) -> None:
    hazards = ("flood levels", "landslides", "roads, water and power")
    constraints = [{"name": name, "file": "x.gpkg"} for name in ("Flood zone", "river reserve", "roads")]
    left, notes = still_unchecked(hazards, brief_of(tmp_path, constraints).constraint)
    assert left == ("landslides", "roads, water and power")
    assert [note.text for note in notes] == [
        "Of flood levels only what your own layer shows was checked: “Flood zone”."
    ]
    assert still_unchecked(hazards, []) == (hazards, ())


def test_the_distance_of_one_constraint_cannot_be_taken_for_another(roads: Path, plots: Any) -> None:
    """“flood 100” and “flood 100 m” are two constraints: neither's distance may land in the other's column."""
    brief = brief_of(
        roads,
        [
            {"name": "flood 100 m", "file": "roads.gpkg", "buffer_m": 10, "level": "note"},
            {"name": "flood 100", "file": "roads.gpkg", "level": "note"},
        ],
    )
    values = own_readings(brief, plots).values
    assert len(values.columns) == 4
    assert set(values["constraint_flood_100_m"]) <= {0.0, 1.0}

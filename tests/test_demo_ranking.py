"""The demo's ranking against what was planted in the demo region (demo_region/truth.toml)."""

import math
import tomllib
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

from sitescreen.brief import load_brief
from sitescreen.screening import screen

REGION = Path(__file__).parents[1] / "demo_region"
TRUTH = tomllib.loads((REGION / "truth.toml").read_text(encoding="utf-8"))
TOLD_NOW = set(TRUTH["told_now"])
CASES = [case for case in TRUTH["case"] if case["from"] in TOLD_NOW]
ZONES = [(zone["is"], plot) for zone in TRUTH["zone"] for plot in zone["plots"]]


@pytest.fixture(scope="module")
def table() -> Any:
    return screen(load_brief(REGION / "brief.toml")).table.set_index("plot")


def holds(want: dict[str, Any], row: Any, table: Any) -> bool:
    """Whether one expectation of truth.toml is met by a plot's row."""
    if "set_aside" in want:
        said = str(row["set_aside"] or "")
        told = not want["set_aside"] or any(word in said.lower() for word in want.get("says", [""]))
        return bool(said) == want["set_aside"] and told
    if "caution" in want:
        said = str(row["cautions"] or "").lower()
        return any(word.lower() in said for word in want["caution"])
    if "ahead_of" in want:
        # a plot that was set aside or has no rank in the zone is behind every ranked one
        mine = row["rank_in_zone"]
        theirs = [table.loc[other, "rank_in_zone"] for other in want["ahead_of"]]
        return not pd.isna(mine) and all(pd.isna(rank) or mine < rank for rank in theirs)
    value = row[want["reading"]]
    if want.get("unknown") or pd.isna(value):
        return bool(want.get("unknown", False)) and bool(pd.isna(value))
    if "is" in want:
        return bool(value == want["is"])
    if "is_not" in want:
        return bool(value != want["is_not"] and value not in ("", "unknown"))
    met = [value > want["above"]] if "above" in want else []
    met += [value < want["below"]] if "below" in want else []
    met += [value > table.loc[want["more_than"], want["reading"]]] if "more_than" in want else []
    met += [value < table.loc[want["less_than"], want["reading"]]] if "less_than" in want else []
    return bool(met) and all(met)


@pytest.mark.parametrize("case", CASES, ids=lambda case: f"{case['plot']}: {case['planted'][:50]}")
def test_planted_case_is_told(table: Any, case: dict[str, Any]) -> None:
    row = table.loc[case["plot"]]
    missed = [
        (want, {key: row[key] for key in (want.get("reading"), "set_aside", "cautions", "rank_in_zone") if key})
        for want in case["expect"]
        if not holds(want, row, table)
    ]
    assert not missed


@pytest.mark.parametrize(("zone", "plot"), ZONES, ids=lambda value: value)
def test_zone_is_told_from_ground_and_normals(table: Any, zone: str, plot: str) -> None:
    assert table.loc[plot, "zone"] == zone


def test_every_plot_comes_out_ranked_or_set_aside(table: Any) -> None:
    assert sorted(table.index, key=int) == [str(number) for number in range(1, 41)]
    ranked = table["rank"].notna()
    aside = table["set_aside"].fillna("").astype(str) != ""
    assert (ranked ^ aside).all()
    assert sorted(table.loc[ranked, "rank"]) == list(range(1, int(ranked.sum()) + 1))


def test_ranked_plots_come_from_all_six_zones(table: Any) -> None:
    assert set(table.loc[table["rank"].notna(), "zone"]) == {
        "hot_humid_coast",
        "hot_arid",
        "savannah",
        "lake_basin",
        "upland",
        "high_upland",
    }


@pytest.mark.parametrize(
    "want",
    [
        {"set_aside": True},
        {"caution": ["steep"]},
        {"ahead_of": ["b"]},
        {"reading": "slope_deg", "above": 3.0},
        {"reading": "slope_deg", "below": 1.0},
        {"reading": "slope_deg", "more_than": "b"},
        {"reading": "aspect_deg", "above": 0.0},
        {"reading": "aspect_deg", "below": 0.0},
        {"reading": "kind", "is": "closed"},
        {"reading": "kind", "is_not": "none"},
        {"reading": "slope_deg", "unknown": True},
        {"reading": "slope_deg"},
        {"reading": "missing", "above": 0.0},
    ],
    ids=str,
)
def test_expectations_can_fail(want: dict[str, Any]) -> None:
    """The reader of truth.toml itself: each kind of expectation is refused by a row that breaks it."""
    rows = pd.DataFrame(
        {
            "set_aside": ["", ""],
            "cautions": ["", ""],
            "rank_in_zone": pd.array([2, 1], dtype="Int64"),
            "slope_deg": [2.0, 5.0],
            "aspect_deg": [math.nan, 90.0],
            "kind": ["none", "closed"],
            "missing": [pd.NA, 1],
        },
        index=["a", "b"],
    )
    assert not holds(want, rows.loc["a"], rows)

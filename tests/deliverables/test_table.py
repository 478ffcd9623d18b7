"""The ranking as CSV."""

import csv
import io
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.deliverables.columns import BY_NAME, CONTRACT, Column, columns_of
from sitescreen.deliverables.table import cell, safe_text, value_of, write_csv

# typed in from the design of the table, not read from the code
ORDER = """rank, plot, name, overall_mark, mark_low, mark_high, zone, zone_share, rank_in_zone, cautions, set_aside,
rank_low, rank_high, chance_first, chance_top_quarter, weakest, elevation_m, slope_deg, aspect_deg,
buildable_share, rise_m, shore_kind, shore_distance_km, onshore_from_deg, breeze_reach, shore_skyline_deg,
ventilation, ridge_exposure, sheltered_fraction, cold_pool_kind, cold_pool_depth_m, cold_pool_chance,
cold_deficit_k, smallest_pool_seen_m, night_minimum_c, floor_height_m, sky_view, sun_cool_morning_h,
sun_year_h, west_load_kwh_m2, pond_depth_m, long_axis_deg, wind_incidence_deg, area_ha, lon, lat,
offshore_from_deg, breeze_arrival_h, night_flow_m2_s, night_flow_speed_m_s, clear_calm_nights, driving_rain,
cool_gain_kwh_m2, sun_first_cool_h, sun_last_cool_h"""


def written(screening: Any, path: Path) -> bytes:
    write_csv(screening.table, columns_of(screening.table, screening.profiles), path)
    return path.read_bytes()


def rows(content: bytes) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(content.decode("utf-8"), newline="")))


def test_columns_stand_in_the_order_of_the_contract(screening: Any, tmp_path: Path) -> None:
    head = written(screening, tmp_path / "a.csv").decode("utf-8").split("\n")[0].split(",")
    contract = [name.strip() for name in ORDER.split(",")]
    assert head[: len(contract)] == contract
    rest = head[len(contract) :]
    kinds = [name.split("_")[0] for name in rest]
    assert set(kinds) == {"membership", "mark"}
    assert kinds == sorted(kinds, key=["membership", "mark"].index)


def test_every_column_is_explained() -> None:
    assert all(column.title and column.says.endswith(".") for column in CONTRACT)
    assert len(BY_NAME) == len(CONTRACT)


def test_same_run_gives_the_same_bytes(invent: Any, tmp_path: Path) -> None:
    one, two = (written(invent(), tmp_path / name) for name in ("a.csv", "b.csv"))
    assert one == two
    assert b"\r" not in one
    assert one.endswith(b"\n")


def test_one_row_a_plot_and_set_aside_plots_have_no_rank(screening: Any, tmp_path: Path) -> None:
    got = rows(written(screening, tmp_path / "a.csv"))
    assert [row["plot"] for row in got] == screening.table["plot"].tolist()
    aside = [row for row in got if row["set_aside"]]
    assert len(aside) == 2
    assert {row["rank"] for row in aside} == {""}


def test_unknown_is_empty_and_decimals_are_fixed(screening: Any, tmp_path: Path) -> None:
    got = {row["plot"]: row for row in rows(written(screening, tmp_path / "a.csv"))}
    assert got["2"]["ventilation"] == ""
    assert got["2"]["sun_year_h"] == ""  # a column this version does not fill
    assert all(len(row["lon"].split(".")[1]) == 6 for row in got.values())
    assert all(row["rank"].isdigit() or row["rank"] == "" for row in got.values())


@pytest.mark.parametrize("text", ["=1+1", "+41", "-2", "@SUM(A1)", "\tx", "\rx", "\n=x"])
def test_text_that_looks_like_a_formula_is_disarmed(invent: Any, text: str, tmp_path: Path) -> None:
    got = rows(written(invent(names=(text, "b", "c", "d", "e")), tmp_path / "a.csv"))
    assert f"'{text}".replace("\r", "\n") in [row["name"] for row in got]


def test_a_plot_whose_id_looks_like_a_formula_is_disarmed(invent: Any, tmp_path: Path) -> None:
    got = rows(written(invent(names=("a", "b"), ids=("-7", "=cmd")), tmp_path / "a.csv"))
    assert sorted(row["plot"] for row in got) == ["'-7", "'=cmd"]


def test_numbers_stay_numbers() -> None:
    """A negative rise is no formula."""
    assert cell(BY_NAME["rise_m"], -12.34) == "-12.3"
    assert cell(BY_NAME["rise_m"], -0.04) == "0.0"
    assert cell(BY_NAME["rank"], 3.0) == "3"
    assert cell(BY_NAME["overall_mark"], float("inf")) == ""
    assert cell(BY_NAME["rank"], pd.NA) == ""


def test_ordinary_text_is_left_alone() -> None:
    assert safe_text("Plot 7, =north") == "Plot 7, =north"
    assert safe_text("") == ""


def test_commas_quotes_and_line_ends_survive(invent: Any, tmp_path: Path) -> None:
    name = 'The "old", field\nby the well; \u202e\u00e9\U0001f33f'
    assert name in [row["name"] for row in rows(written(invent(names=(name, "b")), tmp_path / "a.csv"))]


def test_a_column_nobody_planned_comes_last(screening: Any) -> None:
    table = screening.table.assign(odd_thing=1.5, cells=9.0)
    names = [column.name for column in columns_of(table, screening.profiles)]
    assert names[-2:] == ["odd_thing", "cells"]


def test_explanations_say_what_a_planner_needs(screening: Any) -> None:
    table = screening.table.assign(mark_in_zone=50.0)
    says = {column.name: column.says for column in columns_of(table, screening.profiles)}
    assert says["mark_in_zone"] == "The overall mark by the profile of its zone alone."
    assert says["rank_low"].startswith("The best rank of the range")
    assert BY_NAME["cold_deficit_k"].unit == "°C"
    assert BY_NAME["rise_m"].title == "height above surroundings within 1 km"


def test_a_bearing_just_short_of_north_is_north() -> None:
    assert value_of(BY_NAME["onshore_from_deg"], 359.7) == 0.0
    assert value_of(BY_NAME["onshore_from_deg"], 359.4) == 359.0
    assert value_of(BY_NAME["slope_deg"], 360.0) == 360.0, "only bearings go round"


def test_a_truth_is_a_number_in_a_column_of_whole_numbers() -> None:
    assert value_of(Column("a", "whole", 0, "", "a", ""), np.bool_(True)) == 1
    assert value_of(Column("a", "text", 0, "", "a", ""), False) == "no"

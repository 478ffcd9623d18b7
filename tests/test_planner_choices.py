"""A planner's own weights, constraints and criteria, from the brief to the results."""

import csv
import json
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import rasterio
from affine import Affine
from click.testing import CliRunner
from shapely.geometry import LineString, box

from sitescreen.cli.main import run

WEST, NORTH, CELL, N = 500_000.0, 500_000.0, 90.0, 60

BRIEF = """
[terrain]
files = ["terrain.tif"]
[plots]
file = "plots.gpkg"
id = "plot"
[zones]
force = "upland"
[judge]
shortlist = 2
pairs = ["cold over slope = 3", "road over slope = 2"]
[[constraint]]
name = "flood zone"
file = "flood.gpkg"
level = "stop"
say = "in the flood zone of the river"
[[constraint]]
name = "mast"
file = "road.gpkg"
buffer_m = 1500
level = "note"
[[criterion]]
name = "road"
file = "road.gpkg"
curve = [[0, 100], [2000, 50], [6000, 0]]
weight = 20
[[criterion]]
name = "price"
column = "price"
curve = [[10, 100], [60, 0]]
weight = 10
"""


@pytest.fixture(scope="module")
def job(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Four plots on rolling ground, a road west of them, a flood zone over the third; one price is not known."""
    folder = tmp_path_factory.mktemp("job")
    y, x = np.indices((N, N))
    heights = (1800.0 + 30.0 * np.sin(x / 7.0) + 20.0 * np.cos(y / 5.0)).astype(np.float32)
    how = {"driver": "GTiff", "width": N, "height": N, "count": 1, "crs": "EPSG:32637", "dtype": "float32"}
    with rasterio.open(folder / "terrain.tif", "w", transform=Affine(CELL, 0, WEST, 0, -CELL, NORTH), **how) as out:
        out.write(heights, 1)
    at = [(WEST + 1600.0 + 700.0 * k, NORTH - CELL * 30) for k in range(4)]
    plots = [box(x - 200, y - 200, x + 200, y + 200) for x, y in at]
    table = {"plot": ["A", "B", "C", "D"], "price": [20.0, 25.0, 10.0, np.nan]}
    gpd.GeoDataFrame(table, geometry=plots, crs="EPSG:32637").to_file(folder / "plots.gpkg")
    road = LineString([(WEST + 400, NORTH), (WEST + 400, NORTH - N * CELL)])
    gpd.GeoDataFrame(geometry=[road], crs="EPSG:32637").to_file(folder / "road.gpkg")
    gpd.GeoDataFrame(geometry=[plots[2].buffer(20)], crs="EPSG:32637").to_file(folder / "flood.gpkg")
    (folder / "brief.toml").write_text(BRIEF, encoding="utf-8")
    done = CliRunner().invoke(run, ["rank", str(folder / "brief.toml")], catch_exceptions=False)
    assert done.exit_code == 0, done.output
    return folder


@pytest.fixture(scope="module")
def rows(job: Path) -> dict[str, dict[str, str]]:
    with (job / "out" / "ranking.csv").open(encoding="utf-8", newline="") as file:
        return {row["plot"]: row for row in csv.DictReader(file)}


@pytest.fixture(scope="module")
def record(job: Path) -> Any:
    return json.loads((job / "out" / "record.json").read_text(encoding="utf-8"))


def test_a_constraint_sets_aside_with_the_planners_words(rows: dict[str, dict[str, str]]) -> None:
    assert rows["C"]["set_aside"] == "in the flood zone of the river"
    assert [rows[plot]["constraint_flood_zone"] for plot in "ABCD"] == ["0", "0", "1", "0"]
    assert rows["C"]["rank"] == rows["C"]["chance_first"] == ""
    # 1,000 and 1,700 m on the map from the plots' edges
    assert [rows[plot]["metres_to_constraint_mast"] for plot in "AB"] == ["1000", "1701"]
    assert "note: within 1500 m of mast" in rows["A"]["cautions"]
    assert "mast" not in rows["B"]["cautions"]


def test_criteria_earn_marks_and_gaps_stand_at_their_worst(rows: dict[str, dict[str, str]]) -> None:
    assert [rows[plot]["mark_price"] for plot in "ABD"] == ["80.0", "70.0", ""]
    assert [rows[plot]["mark_road"] for plot in "AB"] == ["75.0", "57.5"]
    d = rows["D"]
    assert float(d["mark_low"]) < float(d["overall_mark"]) < float(d["mark_high"])


def test_hazards_named_by_a_constraint_are_no_longer_unchecked(record: Any) -> None:
    assert "flood levels" not in record["not_checked"]
    assert "landslides" in record["not_checked"]
    said = " ".join(note["text"] for note in record["notes"])
    assert "Of flood levels only what your own layer shows was checked: “flood zone”." in said
    assert "not used by this version" not in said
    assert {"road.gpkg", "flood.gpkg"} <= {one["name"] for one in record["inputs"]}


def test_weights_follow_the_comparisons(record: Any) -> None:
    """A chain cold = 3 slope, road = 2 slope: 3/6, 2/6, 1/6; criteria, since road is no question."""
    assert record["pairs"]["compared"] == "criterion"
    assert record["pairs"]["weights"] == pytest.approx({"cold": 1 / 2, "slope": 1 / 6, "road": 1 / 3})
    assert record["certainty"]["plots_in_trials"] == 3
    assert record["what_would_change"][0]["among"] == "all"


def test_check_reads_the_planners_layers_too(job: Path) -> None:
    good = CliRunner().invoke(run, ["check", str(job / "brief.toml")])
    assert good.exit_code == 0, good.output
    assert "Weights come from the comparisons" in good.output
    spoilt = job / "spoilt.toml"
    spoilt.write_text(BRIEF.replace("flood.gpkg", "nowhere.gpkg"), encoding="utf-8")
    bad = CliRunner().invoke(run, ["check", str(spoilt)])
    assert bad.exit_code == 2
    assert "nowhere.gpkg does not exist" in bad.output


# --- sitescreen why --------------------------------------------------------------------------------------------------


def why(folder: Path, plot: str) -> tuple[int, str]:
    done = CliRunner().invoke(run, ["why", str(folder), plot])
    return done.exit_code, done.output


def test_why_tells_place_marks_and_reasons(job: Path, rows: dict[str, dict[str, str]], record: Any) -> None:
    code, said = why(job / "out", "A")
    assert code == 0, said
    lines = said.splitlines()
    assert lines[0] == "Plot A"
    assert f"Rank {rows['A']['rank']} of 3; {rows['A']['rank_in_zone']} in upland." in lines
    assert any(
        line.startswith("In 2,000 trials, which vary the weights") and "nine in ten give it" in line for line in lines
    )
    assert "     80.0  price (8 % of the mark)" in lines, "10 of 100 + 20 + 10"
    assert "  - 1,000 m from the nearest road, a mark of 75 out of 100." in lines
    for kind in ("for", "against", "cautions"):
        assert all(f"  - {sentence}" in lines for sentence in record["reasons"]["A"][kind])
    begins = lines.index("How to place a house here:")
    assert lines[begins + 1 :] == [f"  - {sentence}" for sentence in record["siting"]["A"]]
    assert lines[begins + 1].startswith("  - Long walls facing ")


def test_why_tells_what_is_unknown_and_what_was_set_aside(job: Path) -> None:
    _, unknown = why(job / "out", "D")
    assert "with what is unknown at its worst and best" in unknown
    assert "  unknown  price" in unknown
    assert "because its “price” is empty" in unknown
    _, aside = why(job / "out", "C")
    assert "Set aside: in the flood zone of the river." in aside
    assert "Rank" not in aside


def test_why_refuses_what_it_cannot_find(job: Path, tmp_path: Path) -> None:
    for folder, plot, says in (
        (job / "out", "AA", "Perhaps 'A' was meant"),
        (job, "A", "a folder that “sitescreen rank” wrote is needed"),
        (tmp_path, "A", "record.json cannot be read"),
    ):
        code, said = why(folder, plot)
        assert code == 2
        assert says in said
        assert said.count("\n") == 1
    (tmp_path / "record.json").write_text("{}", encoding="utf-8")
    (tmp_path / "ranking.csv").write_text("plot,name\nA,\n", encoding="utf-8")
    code, said = why(tmp_path, "A")
    assert code == 2
    assert "do not hold together" in said


def test_why_finds_a_plot_by_a_name_that_is_its_own(tmp_path: Path, job: Path) -> None:
    """Cells that look like formulas carry an apostrophe in the table, and none in the plot's name."""
    for name in ("record.json", "ranking.csv"):
        (tmp_path / name).write_bytes((job / "out" / name).read_bytes())
    with (tmp_path / "ranking.csv").open(encoding="utf-8", newline="") as file:
        table = list(csv.DictReader(file))
    for row in table:
        row["name"] = {"A": "'=Hill", "B": "Brook", "C": "brook", "D": ""}[row["plot"]]
    with (tmp_path / "ranking.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, list(table[0]))
        writer.writeheader()
        writer.writerows(table)
    assert why(tmp_path, "=hill")[1].startswith("Plot A, =Hill\n")
    code, said = why(tmp_path, "brook")
    assert code == 2
    assert "2 plots are called 'brook': " in said

"""Repeating a run from its record, leaving plots out, and comparing two runs."""

import json
import shutil
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from sitescreen.brief import Brief
from sitescreen.cli.main import run
from sitescreen.inputs.results import read_result
from sitescreen.swapping import SECTIONS
from tests.test_cli import BRIEF, METRIC, rolling, three_plots, write_terrain


def call(*words: str | Path) -> Result:
    return CliRunner().invoke(run, [str(word) for word in words])


ZONE = '[zones]\nforce = "upland"\n'
WIND = "season,part,direction_deg,share,speed_m_s\nyear,all,{},1.0,4\n"


@pytest.fixture(scope="module")
def runs(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Four runs on one ground: as it is, with one input changed, with two changed, without a plot."""
    folder = tmp_path_factory.mktemp("runs")
    write_terrain(folder / "terrain.tif", rolling(400), "EPSG:32637", METRIC)
    write_terrain(folder / "steeper.tif", 3.0 * rolling(400), "EPSG:32637", METRIC)
    plots = three_plots()
    plots.geometry = plots.geometry.translate(13_000, -13_000)
    plots.to_file(folder / "plots.gpkg")
    for side in ("east", "north"):
        (folder / f"{side}.csv").write_text(WIND.format({"east": 90, "north": 0}[side]), encoding="utf-8")
    wind = '[wind]\nfile = "east.csv"\n'
    briefs = {
        "first": BRIEF + ZONE + wind,
        "steep": BRIEF.replace("terrain.tif", "steeper.tif") + ZONE + wind,
        "both": BRIEF.replace("terrain.tif", "steeper.tif") + ZONE + wind.replace("east", "north"),
    }
    for name, text in briefs.items():
        (folder / f"{name}.toml").write_text(text, encoding="utf-8")
        told = call("rank", folder / f"{name}.toml", "--out", folder / name)
        assert told.exit_code == 0, told.output
    told = call("rank", folder / "first.toml", "--out", folder / "without", "--without", "B", "--seed", "7")
    assert told.exit_code == 0, told.output
    return folder


def test_a_plot_left_out_stays_listed_and_the_others_keep_their_marks(runs: Path) -> None:
    first, what_if = read_result(runs / "first"), read_result(runs / "without")
    marks = {row["plot"]: row["mark_low"] for row in first.rows}
    left = {row["plot"]: row for row in what_if.rows}
    assert left["B"]["set_aside"] == "left out of this run, as asked"
    assert not left["B"]["rank"]
    assert {plot: left[plot]["mark_low"] for plot in "AC"} == {plot: marks[plot] for plot in "AC"}
    assert what_if.record["brief"]["content"]["judge"]["seed"] == 7


def test_leaving_out_a_plot_that_is_not_there_is_refused(runs: Path) -> None:
    told = call("rank", runs / "first.toml", "--out", runs / "never", "--without", "Z")
    assert told.exit_code == 2
    assert "'Z'" in told.output
    assert not (runs / "never").exists()


def test_the_record_keeps_the_brief_with_paths_seen_from_the_results(runs: Path) -> None:
    kept = read_result(runs / "first").record["brief"]
    assert kept["content"]["terrain"]["files"] == ["../terrain.tif"]
    assert kept["content"]["plots"]["file"] == "../plots.gpkg"
    assert set(kept["files"]) == {"../terrain.tif", "../plots.gpkg", "../east.csv"}
    assert str(runs) not in json.dumps(kept)


def test_one_input_that_differs_has_all_of_the_change(runs: Path) -> None:
    told = call("compare", runs / "first", runs / "steep")
    assert told.exit_code == 0, told.output
    assert "Inputs that differ: terrain." in told.output
    assert "all of the change is that of the terrain" in told.output


def test_two_inputs_are_swapped_one_at_a_time(runs: Path) -> None:
    told = call("compare", runs / "first", runs / "both")
    assert told.exit_code == 0, told.output
    assert "Inputs that differ: terrain, wind." in told.output
    alone = {line.split(":")[0].strip(): line for line in told.output.splitlines() if line.startswith("  ")}
    # the steep ground alone does what the run with the steep ground alone did
    steep = call("compare", runs / "first", runs / "steep", "--no-split").output
    first, second = (
        {row["plot"]: float(row["mark_low"]) for row in read_result(runs / name).rows} for name in ("first", "steep")
    )
    mean = sum(abs(second[plot] - first[plot]) for plot in "ABC") / 3
    assert mean > 1.0
    assert float(alone["terrain"].split("marks move by ")[1].split()[0]) == pytest.approx(mean, abs=0.11)
    assert "marks move" in alone["wind"]
    assert "the program" not in told.output
    assert "swapped" not in steep


def test_a_run_compared_with_itself_has_not_moved(runs: Path) -> None:
    told = call("compare", runs / "first", runs / "first")
    assert "No rank moved." in told.output
    assert "No input that moves a rank differs." in told.output


@pytest.mark.parametrize(
    ("spoil", "says"), [("changed", "has changed since"), ("gone", "is not there any more"), ("no brief", "brief")]
)
def test_inputs_that_are_not_as_they_were_are_not_swapped(runs: Path, tmp_path: Path, spoil: str, says: str) -> None:
    there = tmp_path / "copy"
    shutil.copytree(runs, there)
    if spoil == "changed":
        (there / "east.csv").write_text(WIND.format(180), encoding="utf-8")
    elif spoil == "gone":
        (there / "terrain.tif").unlink()
    else:
        path = there / "first" / "record.json"
        record = json.loads(path.read_text(encoding="utf-8"))
        del record["brief"]
        path.write_text(json.dumps(record), encoding="utf-8")
    told = call("compare", there / "first", there / "both")
    assert says in told.output
    assert (told.exit_code == 2) == (spoil == "no brief")
    assert spoil == "no brief" or "Plots ranked: 3" in told.output


def test_results_that_moved_with_their_inputs_can_still_be_split(runs: Path, tmp_path: Path) -> None:
    there = tmp_path / "elsewhere"
    shutil.copytree(runs, there)
    told = call("compare", there / "first", there / "both")
    assert "  wind: " in told.output


def test_a_folder_without_results_is_refused(runs: Path, tmp_path: Path) -> None:
    told = call("compare", runs / "first", tmp_path)
    assert told.exit_code == 2
    assert "record.json" in told.output


def test_every_section_of_a_brief_belongs_to_a_part_or_moves_no_rank() -> None:
    told = {name for names in SECTIONS.values() for name in names}
    # judge: the profiles that it amounts to are kept whole, seed and shortlist move no rank
    assert told | {"title", "judge", "context", "output"} == set(Brief.model_fields)
